"""A value that never travels without its uncertainty and its unit."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

__all__ = ["COVERAGE_FACTOR", "Quantity", "format_quantity", "json_number"]

# Expanded uncertainty U = k u; k = 2 covers about 95 % for a normal distribution (GUM, JCGM 100:2008, 6.2).
COVERAGE_FACTOR = 2.0
# Digits a printed value has at most.
MOST_DIGITS = 7


def json_number(value: float | None) -> float | None:
    """Return `value` as a float JSON can hold; None where it is missing, NaN or infinite."""
    if value is None or not math.isfinite(value):
        return None
    return float(value)


@dataclass(frozen=True)
class Quantity:
    """A measured or derived value.

    Parameters
    ----------
    value : float
        In `unit`.
    u : float or None
        Combined standard uncertainty, in `unit`; None where it cannot be had.
    unit : str
        One of the fixed units (nm^2, mN/m, cm^2, s, mm, degC, ...) or "1".
    u_random, u_systematic : float or None
        The two parts of `u` (GUM: combined in quadrature), in `unit`. The random part scatters from
        point to point or run to run; the systematic part is common to every point of one run.
    """

    value: float
    u: float | None
    unit: str
    u_random: float | None = None
    u_systematic: float | None = None

    @classmethod
    def combine(
        cls, value: float, unit: str, *, u_random: float | None, u_systematic: float | None
    ) -> Quantity:
        """Build a quantity from the two parts; `u` is None only when both parts are."""
        parts = [p for p in (u_random, u_systematic) if p is not None]
        u = math.hypot(*parts) if parts else None
        return cls(float(value), u, unit, u_random, u_systematic)

    @property
    def expanded(self) -> float | None:
        """Expanded uncertainty U = 2 u, in `unit`."""
        return None if self.u is None else COVERAGE_FACTOR * self.u

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form: value, u, unit, and the two parts where they are known."""
        out: dict[str, Any] = {
            "value": json_number(self.value),
            "u": json_number(self.u),
            "unit": self.unit,
        }
        if self.u_random is not None:
            out["u_random"] = json_number(self.u_random)
        if self.u_systematic is not None:
            out["u_systematic"] = json_number(self.u_systematic)
        return out

    def __str__(self) -> str:
        unit = "" if self.unit in ("", "1") else f" {self.unit}"
        return f"{format_quantity(self)}{unit}"


def format_quantity(quantity: Quantity, *, factor: float = COVERAGE_FACTOR) -> str:
    """Write `value ± U` with U = factor × u rounded up to honest digits, without the unit.

    U keeps two significant digits when its first is 1 or 2, else one (GUM 7.2.6: at most two), and the
    value is rounded to the same place. Without u, four significant digits and no ±.
    """
    value = quantity.value
    if not math.isfinite(value):
        return "n/a"
    if quantity.u is None or not math.isfinite(quantity.u) or quantity.u <= 0:
        return f"{value:.4g}"
    expanded = factor * quantity.u
    exponent = math.floor(math.log10(expanded))
    leading = expanded / 10.0**exponent
    places = 1 - exponent if leading < 2.95 else -exponent
    # rounding may carry into the next decade (9.6 -> 10): one digit fewer is then enough
    if leading >= 9.5:
        places = -exponent
    if places <= 0:
        step = 10.0**-places
        return f"{round(value / step) * step:.0f} ± {math.ceil(expanded / step - 0.05) * step:.0f}"
    spread = f"{expanded:.{places}f}"
    if value:
        most = MOST_DIGITS - 1 - math.floor(math.log10(abs(value)))
        if places > most:  # nothing in this trade is known to more digits, whatever a formula says
            places, spread = max(most, 0), f"{expanded:.1g}"
    text = f"{value:.{places}f}"
    return f"{text.lstrip('-') if float(text) == 0 else text} ± {spread}"
