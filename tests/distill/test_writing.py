from __future__ import annotations

import os
from pathlib import Path

import pytest

from thumbwright.distill import writing
from thumbwright.distill.writing import write_file, write_files, write_new_file


def listing(folder: Path) -> dict[str, bytes]:
    return {str(p.relative_to(folder)): p.read_bytes() for p in folder.rglob("*") if p.is_file()}


def test_writes_all_and_keeps_what_else_is_there(tmp_path: Path) -> None:
    (tmp_path / "mine.txt").write_text("mine")
    (tmp_path / "b.json").write_text("old")
    written = write_files(tmp_path, {"a.csv": "é\n−1\r\n", "b.json": b"\x00new"})
    assert written == (tmp_path / "a.csv", tmp_path / "b.json")
    assert listing(tmp_path) == {
        "mine.txt": b"mine",
        "a.csv": "é\n−1\r\n".encode(),
        "b.json": b"\x00new",
    }
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.csv", "b.json", "mine.txt"]


def test_makes_missing_folders_and_readable_files(tmp_path: Path) -> None:
    mask = os.umask(0o022)
    try:
        (path,) = write_files(tmp_path / "x" / "y", {"a": "1"})
    finally:
        os.umask(mask)
    assert path.stat().st_mode & 0o777 == 0o644


@pytest.mark.parametrize("stop", [KeyboardInterrupt(), SystemExit(143), OSError(28, "no room")])
@pytest.mark.parametrize("when", ["a", "b"])
def test_stopped_while_writing_changes_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, stop: BaseException, when: str
) -> None:
    real = writing._write

    def stopping(path: Path, content: bytes) -> None:
        if path.name == when:
            path.write_bytes(content[:1])
            raise stop
        real(path, content)

    monkeypatch.setattr(writing, "_write", stopping)
    (tmp_path / "old").mkdir()
    write_file(tmp_path / "old" / "other", "kept")
    before = listing(tmp_path)
    for folder in (tmp_path / "old", tmp_path / "new" / "deep"):
        with pytest.raises(type(stop)):
            write_files(folder, {"a": "one", "b": "two"})
    assert listing(tmp_path) == before
    assert [p.name for p in tmp_path.iterdir()] == ["old"]


def test_stopped_between_renames_leaves_whole_files_only(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    write_files(tmp_path, {"a": "old a", "b": "old b"})
    real = Path.replace

    def stopping(self: Path, target: Path) -> Path:
        if self.name == "b":
            raise KeyboardInterrupt
        return real(self, target)

    monkeypatch.setattr(Path, "replace", stopping)
    with pytest.raises(KeyboardInterrupt):
        write_files(tmp_path, {"a": "new a", "b": "new b"})
    assert listing(tmp_path) == {"a": b"new a", "b": b"old b"}


@pytest.mark.parametrize("name", ["", ".", "..", "x/y", "..\\y", "x\0"])
def test_refuses_names_that_lead_elsewhere(tmp_path: Path, name: str) -> None:
    with pytest.raises(ValueError, match="plain file name"):
        write_files(tmp_path / "new", {"good": "1", name: "2"})
    assert not (tmp_path / "new").exists()


def test_a_folder_in_the_way_is_found_before_anything_is_written(tmp_path: Path) -> None:
    (tmp_path / "b").mkdir()
    with pytest.raises(IsADirectoryError):
        write_files(tmp_path, {"a": "1", "b": "2"})
    assert not (tmp_path / "a").exists()


def test_a_file_in_place_of_the_folder(tmp_path: Path) -> None:
    (tmp_path / "f").write_text("file")
    with pytest.raises(OSError, match=r"f"):
        write_files(tmp_path / "f" / "g" / "h", {"a": "1"})
    assert listing(tmp_path) == {"f": b"file"}


def test_text_that_is_no_utf8_writes_nothing(tmp_path: Path) -> None:
    with pytest.raises(UnicodeEncodeError):
        write_files(tmp_path / "new", {"a": "1", "b": "\ud800"})
    assert not (tmp_path / "new").exists()


def test_new_file_never_overwrites(tmp_path: Path) -> None:
    path = tmp_path / "deep" / "case.toml"
    assert write_new_file(path, "one\n") == path
    with pytest.raises(FileExistsError):
        write_new_file(path, "two")
    assert path.read_bytes() == b"one\n"


def test_new_file_that_fails_leaves_nothing(tmp_path: Path) -> None:
    with pytest.raises(UnicodeEncodeError):
        write_new_file(tmp_path / "deep" / "case.toml", "\ud800")
    assert list(tmp_path.iterdir()) == []
