"""What a browser would make of a report page: its elements, text, addresses, handlers and scripts."""

from __future__ import annotations

from html.parser import HTMLParser

__all__ = ["Outline", "outline"]

VOID = {"meta", "link", "br", "img", "input", "hr", "use", "path"}


class Outline(HTMLParser):
    """Checks that every element is closed, and collects text, addresses and handlers."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: set[str] = set()
        self.text: list[str] = []
        self.addresses: list[str] = []
        self.handlers: list[str] = []
        self.scripts: list[dict[str, str | None]] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note an element and what it could do."""
        self.tags.add(tag)
        if tag not in VOID:
            self.open.append(tag)
        if tag == "script":
            self.scripts.append(dict(attrs))
        for name, value in attrs:
            if name in ("href", "src", "action", "data", "poster", "srcset"):
                self.addresses.append(value or "")
            if name.startswith("on"):
                self.handlers.append(name)

    def handle_endtag(self, tag: str) -> None:
        """Close it."""
        if tag in VOID:
            return
        assert self.open[-1:] == [tag], (tag, self.open[-3:])
        self.open.pop()

    def handle_data(self, data: str) -> None:
        """Note text."""
        self.text.append(data)


def outline(page: bytes) -> Outline:
    """Read a page, all of whose elements must be closed."""
    seen = Outline()
    seen.feed(page.decode("utf-8"))
    assert seen.open == []
    return seen
