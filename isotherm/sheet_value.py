"""Check and read one value of a run sheet."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.quantity_text import parse_quantity
from isotherm.sheet_schema import Key
from isotherm.unit_symbols import DIMENSIONS

__all__ = ["Place", "allowed", "read_value", "suggestion"]


@dataclass(frozen=True)
class Place:
    """The sheet, to name the line an error is about."""

    where: str
    text: str

    def of(self, path: str) -> str:
        """Name file, line and key of the dotted `path` (the line only when it is found)."""
        path = re.sub(r"\[\d+\]", "", path)
        table, _, key = path.rpartition(".")
        inside = ""
        table_line = 0
        for number, line in enumerate(self.text.splitlines(), 1):
            start = line.strip()
            if start.startswith("["):
                inside = start.partition("]")[0].strip("[ ]\t")
                if inside in (path, table) and not table_line:
                    table_line = number
            elif inside == table and "=" in start:
                name = start.partition("=")[0].strip().strip("\"'")
                if name == key:
                    return f"{self.where}, line {number}"
        return f"{self.where}, line {table_line}" if table_line else self.where


def suggestion(name: str, known: Sequence[str], elsewhere: Sequence[str] = ()) -> str:
    """What to write instead of the unknown key `name`."""
    from difflib import get_close_matches

    if elsewhere:
        return f"it belongs elsewhere: {' or '.join(elsewhere[:3])}"
    close = get_close_matches(name.lower()[:60], known, n=1, cutoff=0.6)
    if close:
        return f"did you mean '{close[0]}'?"
    return f"known here: {', '.join(known)}"


def _number(value: float) -> str:
    return f"{value:g}"


def allowed(key: Key) -> str:
    """Say what a key may hold."""
    if key.kind == "choice":
        return "one of " + ", ".join(f'"{choice}"' for choice in key.choices)
    if key.kind == "flag":
        return "true or false"
    if key.kind == "text":
        return "text in double quotes"
    if key.kind == "texts":
        return "a list of texts"
    labels = DIMENSIONS.get(key.dimension, ("",))
    unit = "" if labels[0] in ("", "1") else f" {labels[0]}"
    low = f"{'above' if key.above else 'at least'} {_number(key.low)}{unit}"
    high = f"at most {_number(key.high)}{unit}"
    parts = [low if math.isfinite(key.low) else "", high if math.isfinite(key.high) else ""]
    bounds = " and ".join(part for part in parts if part)
    if key.kind == "integer":
        return f"a whole number {bounds}".strip()
    if key.kind == "range":
        return "two numbers, the lower first"
    return bounds


def read_value(key: Key, given: Any, path: str, place: Place) -> Any:
    """Read one value: a Quantity, text, number, pair or tuple, as the key's kind says.

    Raises
    ------
    UpstrokeError
        Naming the key, what was found and what is allowed.
    """
    found = repr(given) if not isinstance(given, str) else f'"{given}"'
    found = found if len(found) <= 60 else found[:57] + "..."

    def wrong(found: str = found) -> UpstrokeError:
        return UpstrokeError(
            f"'{path}' is {found}",
            where=place.of(path),
            remedy=f"allowed: {allowed(key)}, for example {key.name} = {key.example}",
        )

    if key.kind == "quantity":
        return _quantity(key, given, path, place, wrong)
    if key.kind == "flag":
        if not isinstance(given, bool):
            raise wrong()
        return given
    if key.kind in ("text", "choice"):
        if not isinstance(given, str):
            raise wrong()
        if key.kind == "text":
            return given.strip()
        if given not in key.choices:
            raise wrong()
        return given
    if key.kind == "texts":
        if isinstance(given, str):
            given = [given]
        if not isinstance(given, list) or not all(isinstance(one, str) for one in given):
            raise wrong()
        return tuple(given)
    if key.kind == "range":
        if not isinstance(given, list) or len(given) != 2:
            raise wrong()
        low, high = (_bounded(key, one, wrong) for one in given)
        if not low < high:
            raise wrong()
        return (low, high)
    number = _bounded(key, given, wrong)
    if key.kind == "integer":
        if not isinstance(given, int):
            raise wrong()
        return int(number)
    return number


def _bounded(key: Key, given: Any, wrong: Any) -> float:
    if isinstance(given, bool) or not isinstance(given, int | float):
        raise wrong()
    try:
        number = float(given)
    except OverflowError:
        raise wrong() from None
    if not math.isfinite(number) or not key.low <= number <= key.high:
        raise wrong()
    if key.above and number == key.low:
        raise wrong()
    return number


def _quantity(key: Key, given: Any, path: str, place: Place, wrong: Any) -> Quantity:
    if isinstance(given, int | float) and not isinstance(given, bool):
        if key.dimension != "fraction":
            raise UpstrokeError(
                f"'{path}' is {given!r:.40} without a unit",
                where=place.of(path),
                remedy=f"write {key.name} = {key.example}",
            )
        quantity = Quantity(_bounded(key, given, wrong), None, "1")
    elif isinstance(given, str):
        quantity = parse_quantity(given, key.dimension, where=f"{place.of(path)}, {path}")
    else:
        raise wrong()
    if not key.low <= quantity.value <= key.high or (key.above and quantity.value == key.low):
        unit = "" if quantity.unit == "1" else f" {quantity.unit}"
        raise wrong(f"{quantity.value:g}{unit}")
    return quantity
