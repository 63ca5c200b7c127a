"""One cell of an export: number, missing, clock time, or text."""

from __future__ import annotations

import math
import re
from functools import lru_cache
from typing import Final

__all__ = ["MISSING", "cell_kind", "to_number"]

# What instruments and spreadsheets write where there is no reading (compared in lower case).
MISSING: Final = frozenset(
    {
        "", "-", "--", "---", "—", "–", "nan", "-nan", "+nan", "na", "n/a", "n.a.",
        "null", "none", "nil", "?", "*", ".",
        "#n/a", "#na", "#num!", "#div/0!", "#value!", "#ref!", "1.#qnan", "-1.#qnan", "1.#ind", "-1.#ind",
        "nan()", "missing", "void",
    }
)  # fmt: skip
_INFINITE: Final = {
    "inf": math.inf, "+inf": math.inf, "-inf": -math.inf, "infinity": math.inf, "+infinity": math.inf,
    "-infinity": -math.inf, "∞": math.inf, "+∞": math.inf, "-∞": -math.inf, "1.#inf": math.inf,
    "-1.#inf": -math.inf, "ol": math.inf, "overload": math.inf, "overflow": math.inf,
    "over": math.inf, "ovr": math.inf, "ovl": math.inf,
    "ovrflw": math.inf,
}  # fmt: skip
_LONGEST: Final = 48  # characters of one number
_POINT: Final = re.compile(r"[-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eEdD][-+]?\d{1,3})?", re.ASCII)
_COMMA: Final = re.compile(r"[-+]?(?:\d+(?:,\d+)?|,\d+)(?:[eEdD][-+]?\d{1,3})?", re.ASCII)
# Grouped thousands count only where nothing else can be meant: with decimals, or two groups and more.
_GROUPED_POINT: Final = re.compile(
    r"[-+]?\d{1,3}(?:(?:,\d{3})+\.\d+|(?:,\d{3}){2,}|(?:[ '\u00a0\u202f]\d{3})+(?:\.\d+)?)",
    re.ASCII,
)
_GROUPED_COMMA: Final = re.compile(
    r"[-+]?\d{1,3}(?:(?:\.\d{3})+,\d+|(?:\.\d{3}){2,}|(?:[ '\u00a0\u202f]\d{3})+(?:,\d+)?)",
    re.ASCII,
)
_CLOCK: Final = re.compile(
    r"(?:\d{1,4}[-./]\d{1,2}[-./]\d{1,4}[T ,]{0,2})?\d{1,3}:\d{1,2}(?::\d{1,2}(?:[.,]\d{1,9})?|[.,]\d{1,9})?"
    r"(?: ?[AaPp]\.?[Mm]\.?)?(?:Z|[-+]\d\d:?\d\d)?"
    r"|\d{4}[-./]\d{1,2}[-./]\d{1,2}|\d{1,2}[-./]\d{1,2}[-./]\d{4}",
    re.ASCII,
)


def to_number(cell: str, decimal: str) -> float | None:
    """Read one stripped cell; NaN where it is missing, infinite where it says so, None where it is text."""
    if len(cell) > _LONGEST:
        return None
    if cell[:1].isalpha():  # words are the commonest cells that are no numbers
        low = cell.lower()
        return math.nan if low in MISSING else _INFINITE.get(low)
    if "−" in cell:
        cell = cell.replace("−", "-")
    plain, grouped = (_POINT, _GROUPED_POINT) if decimal == "." else (_COMMA, _GROUPED_COMMA)
    if plain.fullmatch(cell):
        number = cell if decimal == "." else cell.replace(",", ".")
        return float(number.replace("d", "e").replace("D", "e"))
    low = cell.lower()
    if low in MISSING:
        return math.nan
    if low in _INFINITE:
        return _INFINITE[low]
    if grouped.fullmatch(cell):
        bare = re.sub(r"[ '\u00a0\u202f]", "", cell)
        if decimal == ".":
            return float(bare.replace(",", ""))
        return float(bare.replace(".", "").replace(",", "."))
    return None


@lru_cache(maxsize=4096)  # several layouts look at the same cells
def cell_kind(cell: str, decimal: str) -> str:
    """Tell a stripped cell's kind: N number (infinite too), E missing, C clock or date, T text."""
    number = to_number(cell, decimal)
    if number is not None:
        return "E" if math.isnan(number) else "N"
    if cell[:1].isdigit() and len(cell) <= _LONGEST and _CLOCK.fullmatch(cell):
        return "C"
    return "T"
