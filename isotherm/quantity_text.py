"""Quantities as people type them: value, optional standard uncertainty, unit."""

from __future__ import annotations

import math
import re
from typing import Final

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.unit_symbols import DIMENSIONS
from isotherm.units import conversion

__all__ = ["parse_quantity"]

_LONGEST: Final = 120  # characters
_NUMBER: Final = r"[-+−]?(?:\d{1,30}(?:[.,]\d{0,30})?|[.,]\d{1,30})(?:[eE][-+−]?\d{1,3})?"
_HEAD: Final = re.compile(rf"\s*(\(?)\s*({_NUMBER})(?:\((\d{{1,4}})\))?\s*(.*)", re.DOTALL)
_SIGN: Final = re.compile(r"±|\+/-|\+/−|\+-|\bpm\b")
_TAIL: Final = re.compile(rf"\s*({_NUMBER})\s*(.*)", re.DOTALL)


def _number(text: str) -> float:
    return float(text.replace("−", "-").replace(",", "."))


def _concise(value: str, digits: str) -> float:
    """Uncertainty in the last digits: 1.234(5) is 1.234 ± 0.005."""
    mantissa = re.split(r"[eE]", value)
    exponent = int(mantissa[1].replace("−", "-")) if len(mantissa) > 1 else 0
    _, _, decimals = mantissa[0].replace(",", ".").partition(".")
    return float(int(digits)) * 10.0 ** (exponent - len(decimals))


def parse_quantity(text: str, dimension: str, *, where: str = "") -> Quantity:
    """Read `"1.00 ± 0.01 mg/mL"`: a value, optionally its standard uncertainty, and a unit.

    Parameters
    ----------
    text : str
        Value and uncertainty with decimal point or comma; `±`, `+/-`, `+-` or concise `1.234(5)`; the
        uncertainty may be relative (`50 µL ± 1 %`), and a bracket round value and uncertainty is allowed.
    dimension : str
        Kind of quantity, key of `unit_symbols.DIMENSIONS`, or any unit to convert to.
    where : str
        Named in the error.

    Returns
    -------
    Quantity
        In the fixed unit of the dimension; `u` and `u_systematic` are the uncertainty given, or None.

    Raises
    ------
    UpstrokeError
        When the text is no quantity of this kind, or not finite, or the uncertainty is not above zero.
    """
    labels = DIMENSIONS.get(dimension, (dimension,))
    example = f'"1.00 ± 0.01 {labels[0]}"' if labels[0] != "1" else '"0.98 ± 0.01"'
    remedy = f"write it as in {example}"
    shown = text if len(text) <= 40 else text[:37] + "..."
    bad = UpstrokeError(f"'{shown}' is not a quantity", where=where, remedy=remedy)
    match = _HEAD.match(text) if len(text) <= _LONGEST else None
    if match is None:
        raise bad
    bracket, first, concise, rest = match.groups()
    value = _number(first)
    u: float | None = _concise(first, concise) if concise else None
    parts = _SIGN.split(rest)
    if len(parts) > 2 or (len(parts) == 2 and concise):
        raise bad
    unit = parts[0].strip()
    u_unit = ""
    if len(parts) == 2:
        tail = _TAIL.match(parts[1])
        if tail is None:
            raise bad
        u = _number(tail.group(1))
        u_unit = tail.group(2).strip()
        if bracket:
            if not u_unit.startswith(")"):
                raise bad
            u_unit = u_unit[1:].strip()
        if not unit:
            unit, u_unit = u_unit, ""
    elif bracket:
        raise bad
    if unit and unit[0] in "0123456789.,+-":
        raise bad
    if not unit:
        if labels != ("1",):
            raise UpstrokeError(f"'{shown}' has no unit", where=where, remedy=remedy)
        unit = "1"
    convert = conversion(unit, dimension, where=where)
    converted = convert(value)
    if u is not None:
        if not u > 0:
            raise UpstrokeError(
                f"the uncertainty in '{shown}' is not above zero", where=where, remedy=remedy
            )
        if u_unit == "%" and unit != "%":
            u = abs(converted) * u / 100.0
        elif u_unit:
            u = conversion(u_unit, convert.unit, where=where).scale(u)
        else:
            u = convert.scale(u)
    if not math.isfinite(converted) or (u is not None and not math.isfinite(u)):
        raise UpstrokeError(f"'{shown}' is not finite", where=where, remedy=remedy)
    return Quantity(converted, u, convert.unit, None, u)
