"""A fitted branch with everything its features are read from."""

from __future__ import annotations

import math
from dataclasses import dataclass

from isotherm.condense import Nodes
from isotherm.knee_model import KneeModel
from isotherm.modulus import LocalFit
from isotherm.phases import Reading
from isotherm.quantity import Quantity

__all__ = ["BranchView"]


@dataclass(frozen=True)
class BranchView:
    """Everything the features are read from.

    zero : offset to subtract (mN/m). relative_u : of the area scale. pressure_u : of the pressure scale.
    """

    nodes: Nodes
    model: KneeModel
    reading: Reading
    local: LocalFit
    zero: Quantity
    relative_u: float | None
    pressure_u: float | None

    @property
    def offset(self) -> float:
        return self.zero.value

    def area(self, x: float, u_x: float, u_systematic_x: float = 0.0) -> Quantity:
        """Area per molecule at x = -ln A, nm^2, from the random and systematic u of x."""
        value = math.exp(-x)
        systematic = value * math.hypot(self.relative_u or 0.0, u_systematic_x)
        return Quantity.combine(value, "nm^2", u_random=value * u_x, u_systematic=systematic)

    def pressure(self, value: float, u_random: float) -> Quantity:
        """A recorded pressure less the zero, mN/m, with the zero's and the scale's uncertainty."""
        return Quantity.combine(
            value - self.offset,
            "mN/m",
            u_random=math.hypot(u_random, self.zero.u_random or 0.0),
            u_systematic=math.hypot(self.zero.u_systematic or 0.0, self.pressure_u or 0.0),
        )
