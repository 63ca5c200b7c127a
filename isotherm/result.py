"""What an isotherm analysis found, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number
from isotherm.source import Source

__all__ = [
    "AreaAt",
    "Branch",
    "Collapse",
    "Curve",
    "IsothermResult",
    "MaxModulus",
    "Phase",
    "Point",
    "Tangent",
    "Transition",
]

FloatArray = NDArray[np.float64]


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


@dataclass(frozen=True)
class Point:
    """A place on the isotherm: area per molecule (nm^2) and surface pressure (mN/m)."""

    area: Quantity
    pressure: Quantity

    def to_json(self) -> dict[str, Any]:
        return {"area": self.area.to_json(), "pressure": self.pressure.to_json()}


@dataclass(frozen=True)
class Phase:
    """One stretch between knees, named after its modulus. area and pressure run in compression order."""

    name: str
    area: tuple[float, float]
    pressure: tuple[float, float]
    modulus: Quantity

    def to_json(self) -> dict[str, Any]:
        return {
            "name": self.name,
            "area": [json_number(a) for a in self.area],
            "pressure": [json_number(p) for p in self.pressure],
            "modulus": self.modulus.to_json(),
        }


@dataclass(frozen=True)
class Transition:
    """A coexistence (onset and end) or a kink (at)."""

    kind: str  # "coexistence" | "kink"
    onset: Point | None = None
    end: Point | None = None  # None where the trace stops inside the coexistence
    at: Point | None = None

    def to_json(self) -> dict[str, Any]:
        if self.kind == "kink":
            return {"kind": self.kind, "at": self.at.to_json() if self.at else None}
        return {
            "kind": self.kind,
            "onset": self.onset.to_json() if self.onset else None,
            "end": self.end.to_json() if self.end else None,
        }


@dataclass(frozen=True)
class Collapse:
    """The end of the last rising stretch."""

    kind: str  # "constant-area" | "constant-pressure"
    area: Quantity
    pressure: Quantity

    def to_json(self) -> dict[str, Any]:
        return {"kind": self.kind, "area": self.area.to_json(), "pressure": self.pressure.to_json()}


@dataclass(frozen=True)
class MaxModulus:
    """Largest compression modulus and where it is."""

    modulus: Quantity
    pressure: Quantity
    area: Quantity

    def to_json(self) -> dict[str, Any]:
        return {
            "modulus": self.modulus.to_json(),
            "pressure": self.pressure.to_json(),
            "area": self.area.to_json(),
        }


@dataclass(frozen=True)
class AreaAt:
    """Area and modulus at a pressure the user asked for; both None where the branch never has it."""

    pressure: float
    area: Quantity | None
    modulus: Quantity | None

    def to_json(self) -> dict[str, Any]:
        return {"pressure": self.pressure, "area": _json(self.area), "modulus": _json(self.modulus)}


@dataclass(frozen=True)
class Curve:
    """The condensed branch, compression order (largest area first), zero subtracted. All (m,).

    area nm^2, pressure mN/m, u_pressure mN/m (random), modulus mN/m, u_modulus mN/m,
    trough_area cm^2 (None where unknown), potential mV (None where not recorded).
    """

    area: FloatArray
    pressure: FloatArray
    u_pressure: FloatArray
    modulus: FloatArray
    u_modulus: FloatArray
    trough_area: FloatArray | None = None
    potential: FloatArray | None = None


@dataclass(frozen=True)
class Tangent:
    """The straight line behind the limiting area: pressure = slope × area + intercept over a range."""

    slope: float  # mN/m per nm^2
    intercept: float  # mN/m
    area: tuple[float, float]  # nm^2, the stretch the regression used


@dataclass(frozen=True)
class Branch:
    """One compression or expansion of the film."""

    direction: str  # "compression" | "expansion"
    cycle: int
    rows: int
    zero_offset: Quantity
    noise: float
    lift_off: Quantity | None
    phases: tuple[Phase, ...]
    transitions: tuple[Transition, ...]
    collapse: Collapse | None
    highest_pressure: Quantity
    limiting_area: Quantity | None
    modulus_max: MaxModulus | None
    area_at: tuple[AreaAt, ...]
    curve: Curve
    tangent: Tangent | None = None
    time: tuple[float, float] | None = None  # s, first and last row
    warnings: tuple[str, ...] = field(default=())

    def to_json(self) -> dict[str, Any]:
        return {
            "direction": self.direction,
            "cycle": self.cycle,
            "rows": self.rows,
            "time": None if self.time is None else list(self.time),
            "zero_offset": self.zero_offset.to_json(),
            "noise": json_number(self.noise),
            "lift_off": _json(self.lift_off),
            "phases": [p.to_json() for p in self.phases],
            "transitions": [t.to_json() for t in self.transitions],
            "collapse": self.collapse.to_json() if self.collapse else None,
            "highest_pressure": self.highest_pressure.to_json(),
            "limiting_area": _json(self.limiting_area),
            "modulus_max": self.modulus_max.to_json() if self.modulus_max else None,
            "area_at": [a.to_json() for a in self.area_at],
            "warnings": list(self.warnings),
        }


@dataclass(frozen=True)
class IsothermResult:
    """Everything one trace gave."""

    source: Source
    branches: tuple[Branch, ...]
    warnings: tuple[str, ...] = field(default=())
    title: str = ""
    settings: dict[str, Any] = field(default_factory=dict)
    area_relative_u: float | None = None
    pressure_u: float | None = None
    molecules: float | None = None  # molecules spread; area = trough area / molecules
    kelvin: float | None = None

    @property
    def headline(self) -> Branch:
        """The first compression (the first branch where there is none)."""
        for branch in self.branches:
            if branch.direction == "compression":
                return branch
        return self.branches[0]

    def to_json(self) -> dict[str, Any]:
        return {
            "schema": "upstroke.isotherm/1",
            "title": self.title,
            "source": self.source.to_json(),
            "settings": self.settings,
            "area_relative_u": json_number(self.area_relative_u),
            "pressure_u": json_number(self.pressure_u),
            "warnings": list(self.warnings),
            "branches": [b.to_json() for b in self.branches],
        }
