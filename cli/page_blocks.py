"""What a report page is made of, before it is HTML: facts, tables, and how JSON becomes words."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from isotherm.quantity import Quantity, format_quantity

__all__ = [
    "Fact",
    "Table",
    "generic_tables",
    "is_quantity",
    "label_of",
    "pair_text",
    "quantity_text",
    "told",
    "unit_text",
]

MISSING = "–"
MOST_ROWS = 200  # of a table nobody wrote for this page
SKIPPED = {"schema", "settings", "versions", "source", "sources", "warnings", "title", "notes"}
UNITS = {
    "degC": "°C",
    "1": "",
    "uL": "µL",
    "s^-0.5": "s⁻⁰·⁵",
}
ENDINGS = {"_s": ", s", "_mm": ", mm", "_95": ", 95 %", "_mm_per_s": ", mm/s"}


@dataclass(frozen=True)
class Fact:
    """One line of an answer: what, how much, and a remark."""

    label: str
    value: str
    remark: str = ""


@dataclass(frozen=True)
class Table:
    """A table: caption, column titles, rows of text."""

    caption: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


def is_quantity(value: Any) -> bool:
    """Whether a JSON value is a quantity."""
    return isinstance(value, dict) and {"value", "u", "unit"} <= set(value)


def quantity_text(value: Any, *, factor: float = 1.0, unit: str | None = None) -> str:
    """Write a JSON quantity as `value ± U unit`; a dash where there is none.

    Parameters
    ----------
    value : dict or None
        As `Quantity.to_json` gives it.
    factor, unit : float, str
        To write it in another unit, `factor` of which make one of its own.
    """
    if not is_quantity(value) or value["value"] is None:
        return MISSING
    u = value["u"]
    known = Quantity(
        factor * float(value["value"]), None if u is None else abs(factor) * float(u), "1"
    )
    name = value["unit"] if unit is None else unit
    return f"{format_quantity(known)} {unit_text(name)}".rstrip()


def unit_text(unit: str) -> str:
    """Write a fixed unit the way print does."""
    return UNITS.get(unit, unit.replace("^2", "²").replace("^3", "³"))


def pair_text(pair: Any, unit: str = "", digits: int = 1) -> str:
    """Write an interval; an end without bound is open."""
    if not isinstance(pair, (list, tuple)) or len(pair) != 2:
        return MISSING
    ends = ["open" if end is None else f"{end:.{digits}f}" for end in pair]
    return f"{ends[0]} to {ends[1]} {unit}".rstrip()


def label_of(key: str) -> str:
    """Write a JSON key as words: `collapse_pressure` is collapse pressure, `from_s` is from, s."""
    for ending, words in sorted(ENDINGS.items(), key=lambda item: -len(item[0])):
        if key.endswith(ending) and len(key) > len(ending):
            return label_of(key[: -len(ending)]) + words
    return key.replace("_", " ")


def told(value: Any) -> str:
    """Write a JSON scalar, quantity or short list as text."""
    if value is None or value == "":
        return MISSING
    if is_quantity(value):
        return quantity_text(value)
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.4g}" if math.isfinite(value) else MISSING
    if isinstance(value, list):
        return ", ".join(told(item) for item in value) or MISSING
    return str(value)


def generic_tables(payload: dict[str, Any], skipped: Iterable[str] = ()) -> list[Table]:
    """Lay out any result: one table of its single numbers, one of each list in it.

    Parameters
    ----------
    payload : dict
        A result's JSON form.
    skipped : iterable of str
        Keys shown elsewhere.
    """
    left_out = SKIPPED | set(skipped)
    singles: list[tuple[str, str]] = []
    tables: list[Table] = []
    for key, value in payload.items():
        if key in left_out:
            continue
        if isinstance(value, dict) and not is_quantity(value):
            if any(_long(item) for item in value.values()):
                continue  # arrays are drawn, not printed
            singles += [(f"{label_of(key)}: {label_of(k)}", told(v)) for k, v in _flat(value)]
        elif isinstance(value, list) and value and isinstance(value[0], dict):
            tables.append(_list_table(label_of(key), value))
        elif not _long(value):
            singles.append((label_of(key), told(value)))
    shown = tuple(row for row in singles if row[1] != MISSING)
    first = [Table("Numbers", ("quantity", "value"), shown)] if shown else []
    return [*first, *tables]


def _long(value: Any) -> bool:
    return isinstance(value, list) and len(value) > 12


def _flat(item: dict[str, Any]) -> list[tuple[str, Any]]:
    """Name every scalar, quantity and short list of one entry, nested ones by path."""
    found: list[tuple[str, Any]] = []
    for key, value in item.items():
        if isinstance(value, dict) and not is_quantity(value):
            found += [(f"{key} {inner}", deep) for inner, deep in _flat(value)]
        elif not _long(value) and not (
            isinstance(value, list) and value and isinstance(value[0], dict)
        ):
            found.append((key, value))
    return found


def _list_table(caption: str, items: list[dict[str, Any]]) -> Table:
    flat = [dict(_flat(item)) for item in items[:MOST_ROWS]]
    keys = list(dict.fromkeys(k for row in flat for k in row))
    keys = [key for key in keys if any(told(row.get(key)) != MISSING for row in flat)]
    rows = tuple(tuple(told(row.get(key)) for key in keys) for row in flat)
    more = f" (first {MOST_ROWS} of {len(items)})" if len(items) > MOST_ROWS else ""
    return Table(caption + more, tuple(label_of(key) for key in keys), rows)
