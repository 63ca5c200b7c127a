"""How each number was obtained: the sections of methods.md that concern a kind of result."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

__all__ = ["Method", "all_methods", "methods_for"]


@dataclass(frozen=True)
class Method:
    """One section: its name, the kinds of result it concerns, its text and its source."""

    name: str
    pages: tuple[str, ...]
    text: str
    source: str


@cache
def all_methods() -> tuple[Method, ...]:
    """Read every section of methods.md, in its order."""
    page = files("cli").joinpath("methods.md").read_text(encoding="utf-8")
    found = re.findall(
        r"^### ([^\n]+)\n<!-- pages: ([^\n]+) -->\n(.+?)\nSource: (.+?)(?=\n\n|\n*\Z)",
        page,
        re.M | re.S,
    )
    return tuple(
        Method(name, tuple(pages.split()), _joined(text), _joined(source))
        for name, pages, text, source in found
    )


def methods_for(kind: str) -> tuple[Method, ...]:
    """Return the sections that concern a kind of result; those common to all come last."""
    own = [m for m in all_methods() if kind in m.pages]
    common = [m for m in all_methods() if m.pages == ("all",)]
    return (*own, *common)


def _joined(text: str) -> str:
    return " ".join(text.split())
