"""One header cell: name, unit, and the roles they allow."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

from isotherm.table_words import plain_words, roles_of
from isotherm.units import is_unit

__all__ = ["HeaderCell", "is_clock_format", "parse_cell"]

_BRACKETS: Final = re.compile(r"[(\[{<]([^()\[\]{}<>]{0,40})[)\]}>]")
_SUPERSCRIPT_TAG: Final = re.compile(r"</?su[pb]>")
_CLOCK_FORMAT: Final = re.compile(
    r"[hHmMsSdDyYjJtT]{1,4}(?:[:.\-/ ][hHmMsSfFdDyYjJtT]{1,4})+", re.ASCII
)
# What stands in brackets beside a name without being a unit.
_NOTE_WORDS: Final = (
    "raw filtered smoothed corrected mean average avg left right front back rear top bottom measured "
    "calculated calc absolute abs pi gamma a t p v x y sensor probe channel ch kanal links rechts "
    "total actual ist signal optional plate paper side l r"
)
_NOTES: Final = frozenset(_NOTE_WORDS.split())


@dataclass(frozen=True)
class HeaderCell:
    """What the header says of one column.

    unknown : text in the place of a unit that is none. clock : form of a clock time, such as hh:mm:ss.
    """

    text: str
    name: str
    unit: str | None = None
    unknown: str | None = None
    clock: str = ""

    @property
    def roles(self) -> tuple[str, ...]:
        """Roles the column may play by its name and unit."""
        return roles_of(self.name, self.unit)


def parse_cell(text: str) -> HeaderCell:
    """Tell name and unit apart in one header cell.

    Units stand in brackets, after a slash, a comma, `in`, a colon or an underscore, or simply at the end.
    """
    text = " ".join(text.strip().strip("\"'").split())
    plain = _SUPERSCRIPT_TAG.sub("", text[:200])
    groups = list(_BRACKETS.finditer(plain))
    outer = re.search(r"[(\[](.{1,40})[)\]]\s*$", plain)
    for match in [*reversed(groups), *([outer] if outer else [])]:
        inside = match.group(1).strip()
        name = " ".join((plain[: match.start()] + " " + plain[match.end() :]).split())
        if is_clock_format(inside):
            return HeaderCell(text, name, clock=inside)
        # one letter in brackets after a name is as often its symbol: then the unit must suit the name
        if is_unit(inside) and (len(inside) > 1 or _suits(name, inside)):
            return HeaderCell(text, name.rstrip(" /,:;"), inside)
    found = _bare_unit(plain)
    if found is not None:
        return HeaderCell(text, found[0].rstrip(" /,:;-_"), found[1])
    unknown = None
    if groups:
        inside = groups[-1].group(1).strip()
        words = plain_words(inside).split()
        if inside and words and not _NOTES.intersection(words) and len(inside) <= 20:
            unknown = inside
    elif "/" in plain:
        name, _, right = plain.partition("/")
        right = right.strip()
        if (
            roles_of(name, None)
            and 0 < len(right) <= 20
            and not plain_words(right).startswith("molec")
        ):
            unknown = right
    name = plain if unknown is None else plain.replace(unknown, " ").strip(" ()[]{}<>/")
    return HeaderCell(text, name, unknown=unknown)


def is_clock_format(text: str) -> bool:
    return ":" in text and _CLOCK_FORMAT.fullmatch(text) is not None


def _suits(name: str, unit: str) -> bool:
    return bool(roles_of(name, unit))


def _bare_unit(text: str) -> tuple[str, str] | None:
    """A unit without brackets; of several ways to cut, the first that gives a known column."""
    ways = list(_bare_ways(text))
    known = (way for way in ways if _suits(*way))
    return next(known, ways[0] if ways else None)


def _bare_ways(text: str) -> Iterator[tuple[str, str]]:
    """The whole cell, or what follows a slash, comma, colon, `in`, the last blanks or underscores."""
    if (len(text) > 1 or text == "s") and is_unit(text) and not roles_of(text, None):
        yield "", text
    for match in re.finditer(r"/", text):
        name, right = text[: match.start()].strip(), text[match.end() :].strip()
        if name and is_unit(right):
            yield name, right
    for sign in (", ", ",", " in ", ": ", ":", ";"):
        name, found, right = text.rpartition(sign)
        if found and name.strip() and is_unit(right):
            yield name.strip(), right.strip()
    words = text.split()
    for count in (3, 2, 1):
        name, right = " ".join(words[:-count]), " ".join(words[-count:])
        if name and is_unit(right) and (len(right) > 1 or (right != "A" and _suits(name, right))):
            yield name, right
    parts = [part for part in re.split(r"[_.]+", text) if part]
    for count in (3, 2, 1):
        name = " ".join(parts[:-count])
        for joiner in ("/", " ", ""):
            right = joiner.join(parts[-count:])
            if name and is_unit(right) and _suits(name, right):
                yield name, right
