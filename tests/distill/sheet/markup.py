"""A strict little reader of HTML for tests: nesting, ids, headings, text by section."""

from __future__ import annotations

from html.parser import HTMLParser

VOID = frozenset({"meta", "br", "hr", "img", "input", "link", "col"})


class Page(HTMLParser):
    """Reads a page and fails on wrong nesting, doubled ids or doubled attributes."""

    def __init__(self, html: str) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[tuple[str, dict[str, str | None]]] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.headings: list[int] = []
        self.ids: list[str] = []
        self.texts: list[tuple[tuple[str, ...], str]] = []
        self.style = ""
        self.feed(html)
        self.close()
        assert not self.open, f"left open: {self.open}"

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        names = [name for name, _ in attrs]
        assert len(names) == len(set(names)), f"doubled attribute in {tag}"
        self._note(tag, dict(attrs))
        if tag not in VOID:
            self.open.append((tag, dict(attrs)))

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self._note(tag, dict(attrs))

    def _note(self, tag: str, attrs: dict[str, str | None]) -> None:
        self.tags.append((tag, attrs))
        if attrs.get("id"):
            assert attrs["id"] not in self.ids, f"doubled id {attrs['id']}"
            self.ids.append(str(attrs["id"]))
        if len(tag) == 2 and tag[0] == "h" and tag[1].isdigit():
            self.headings.append(int(tag[1]))

    def handle_endtag(self, tag: str) -> None:
        assert self.open, f"</{tag}> closes nothing"
        assert self.open[-1][0] == tag, f"</{tag}> closes {self.open[-1][0]}"
        self.open.pop()

    def handle_data(self, data: str) -> None:
        if self.open and self.open[-1][0] == "style":
            self.style += data
        elif data.strip():
            path = tuple(str(a["id"]) for _, a in self.open if a.get("id"))
            self.texts.append((path, " ".join(data.split())))

    def text(self, section: str) -> str:
        """Return the text inside the element with that id."""
        return " ".join(text for path, text in self.texts if section in path)
