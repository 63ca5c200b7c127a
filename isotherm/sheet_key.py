"""What a key of a run sheet is, and the common kinds of it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final, Literal

__all__ = [
    "MOLAR_MASS",
    "Key",
    "Section",
    "allowed_key",
    "choice_key",
    "positive_key",
    "reading_key",
    "text_key",
]

Kind = Literal["quantity", "text", "texts", "number", "integer", "choice", "range", "flag"]


@dataclass(frozen=True)
class Key:
    """One key. `low` and `high` bound the value in the fixed unit; `above` excludes `low` itself."""

    name: str
    kind: Kind
    meaning: str
    example: str
    dimension: str = ""
    low: float = -math.inf
    high: float = math.inf
    above: bool = False
    choices: tuple[str, ...] = ()
    required: bool = False


@dataclass(frozen=True)
class Section:
    """One table of the sheet; `many` for an array of tables. `path` is dotted, as TOML has it."""

    path: str
    meaning: str
    keys: tuple[Key, ...]
    many: bool = False
    cautions: tuple[str, ...] = ()


def positive_key(
    name: str,
    dimension: str,
    meaning: str,
    example: str,
    *,
    high: float = math.inf,
    required: bool = False,
) -> Key:
    """A quantity above zero, with its standard uncertainty where it is known."""
    return Key(
        name,
        "quantity",
        meaning,
        f'"{example}"',
        dimension,
        0.0,
        high,
        above=True,
        required=required,
    )


def allowed_key(name: str, meaning: str, example: str) -> Key:
    """The largest surface pressure allowed of something."""
    return positive_key(name, "pressure", f"largest allowed, {meaning}", example, high=100.0)


def reading_key(name: str, meaning: str, example: str) -> Key:
    """A pressure as read, of either sign."""
    return Key(name, "quantity", meaning, f'"{example}"', "pressure", -1000.0, 1000.0)


def text_key(name: str, meaning: str, example: str, *, required: bool = False) -> Key:
    """A text."""
    return Key(name, "text", meaning, f'"{example}"', required=required)


def choice_key(name: str, meaning: str, choices: tuple[str, ...]) -> Key:
    """One of a few words, the first as example."""
    return Key(name, "choice", meaning, f'"{choices[0]}"', choices=choices)


MOLAR_MASS: Final = positive_key("molar_mass", "molar_mass", "molar mass", "284.48 g/mol", high=1e8)
