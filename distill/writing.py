"""Writing a set of files into a folder so that a stopped run leaves no half-written file.

All files are first written, whole, into a hidden folder inside the target folder (so on the
same disk), and only then put in place one by one with an atomic rename. Whatever stops the
run before that, nothing in the folder has changed; stopped in between, each file is either
the old one or the new one, whole. What was left over is removed either way.
"""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Mapping
from pathlib import Path


def write_files(folder: Path, files: Mapping[str, str | bytes]) -> tuple[Path, ...]:
    """Write ``files`` (name to content) into ``folder``, which is made where it is missing.

    Text is written as UTF-8 with the line ends it has; other files of the folder stay.

    Parameters
    ----------
    folder : Path
        Where the files go. Folders that had to be made are removed again on failure.
    files : mapping of str to str or bytes
        File name, without any folder, to content.

    Returns
    -------
    tuple of Path
        The files written, in the order of ``files``.

    Raises
    ------
    ValueError
        If a name is empty or names another folder; nothing is written.
    OSError
        If the folder or a file cannot be written, or a folder stands where a file should go.
    """
    contents = {_checked(name): _as_bytes(content) for name, content in files.items()}
    made = _make(folder)
    done = False
    try:
        for name in contents:
            if (folder / name).is_dir():
                raise IsADirectoryError(21, "is a folder, not a file", str(folder / name))
        hidden = Path(tempfile.mkdtemp(prefix=".unfinished-", dir=folder))
        try:
            for name, content in contents.items():
                _write(hidden / name, content)
            for name in contents:
                (hidden / name).replace(folder / name)
            done = True
        finally:
            shutil.rmtree(hidden, ignore_errors=True)
    finally:
        if not done:
            _unmake(made)
    return tuple(folder / name for name in contents)


def write_file(path: Path, content: str | bytes) -> Path:
    """Write one file in the same way as :func:`write_files`; return ``path``."""
    write_files(path.parent, {path.name: content})
    return path


def write_new_file(path: Path, content: str | bytes) -> Path:
    """Write one file that must not exist yet, whole or not at all; return ``path``.

    Raises
    ------
    FileExistsError
        If something of that name exists; it is left alone.
    OSError
        If the file cannot be written.
    """
    made = _make(path.parent)
    done = False
    try:
        with path.open("xb") as handle:
            try:
                handle.write(_as_bytes(content))
                handle.flush()
                done = True
            finally:
                if not done:
                    path.unlink()
    finally:
        if not done:
            _unmake(made)
    return path


def _checked(name: str) -> str:
    if name in {"", ".", ".."} or "/" in name or "\\" in name or "\0" in name:
        raise ValueError(f"{name!r} is not a plain file name")
    return name


def _as_bytes(content: str | bytes) -> bytes:
    return content.encode("utf-8") if isinstance(content, str) else content


def _write(path: Path, content: bytes) -> None:
    with path.open("xb") as handle:
        handle.write(content)
        handle.flush()
        os.fsync(handle.fileno())


def _make(folder: Path) -> list[Path]:
    """Make ``folder`` and its parents; return those that were missing, innermost first."""
    missing = []
    for place in (folder, *folder.parents):
        if place.exists():
            break
        missing.append(place)
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except BaseException:
        _unmake(missing)
        raise
    return missing


def _unmake(folders: list[Path]) -> None:
    for folder in folders:
        try:
            folder.rmdir()
        except FileNotFoundError:  # the failure came before this one was made
            continue
        except OSError:  # not empty: somebody else's files are in it by now
            return
