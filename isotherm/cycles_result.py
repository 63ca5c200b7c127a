"""What repeated compression and expansion say, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import AVOGADRO
from isotherm.quantity import Quantity, json_number
from isotherm.source import Source

__all__ = [
    "ENERGY_UNIT",
    "AreaShift",
    "BranchCurve",
    "BranchWork",
    "Cycle",
    "CyclesResult",
    "molar",
]

FloatArray = NDArray[np.float64]

ENERGY_UNIT = "mN/m nm^2"
# 1 mN/m nm^2 = 10^-3 N/m 10^-18 m^2 = 10^-21 J per molecule; kJ/mol = 10^-3 J/mol.
_KILOJOULE_PER_MOLE = 1e-21 * AVOGADRO * 1e-3


def molar(energy: Quantity) -> Quantity:
    """Energy per molecule (mN/m nm^2) as energy per mole (kJ/mol)."""

    def scaled(part: float | None) -> float | None:
        return None if part is None else part * _KILOJOULE_PER_MOLE

    return Quantity(
        energy.value * _KILOJOULE_PER_MOLE,
        scaled(energy.u),
        "kJ/mol",
        scaled(energy.u_random),
        scaled(energy.u_systematic),
    )


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


def _energy_json(energy: Quantity | None) -> dict[str, Any] | None:
    return (
        None
        if energy is None
        else {"per_molecule": energy.to_json(), "molar": molar(energy).to_json()}
    )


@dataclass(frozen=True)
class BranchCurve:
    """A branch in compact form, from its largest area to its smallest; zero subtracted.

    area : (m,) nm^2.  pressure : (m,) mN/m.  noise : of one block, mN/m.
    """

    area: FloatArray
    pressure: FloatArray
    noise: float


@dataclass(frozen=True)
class BranchWork:
    """Integral of pressure over area along one branch, its whole range.

    Done on the film by a compression, given back by an expansion; both counted positive.
    """

    direction: str
    cycle: int
    work: Quantity  # mN/m nm^2 per molecule
    area: tuple[float, float]  # nm^2, from, to in the order of travel
    highest_pressure: float  # mN/m
    curve: BranchCurve

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "direction": self.direction,
            "cycle": self.cycle,
            "work": _energy_json(self.work),
            "area": [json_number(a) for a in self.area],
            "highest_pressure": json_number(self.highest_pressure),
        }


@dataclass(frozen=True)
class Cycle:
    """A compression and the expansion after it.

    hysteresis : compression's work less the expansion's over the areas both cover, per molecule; None
    without expansion.  lost_part : hysteresis over the compression's work there.  area : those areas.
    """

    number: int
    compression: BranchWork
    expansion: BranchWork | None
    hysteresis: Quantity | None
    lost_part: Quantity | None
    area: tuple[float, float] | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "number": self.number,
            "compression": self.compression.to_json(),
            "expansion": self.expansion.to_json() if self.expansion else None,
            "hysteresis": _energy_json(self.hysteresis),
            "lost_part": _json(self.lost_part),
            "area": None if self.area is None else [json_number(a) for a in self.area],
        }


@dataclass(frozen=True)
class AreaShift:
    """Area of one branch at a fixed pressure, and how it moved since the first and the previous cycle.

    area, from_previous, from_first : nm^2; the shifts None for the first cycle.
    part : shift since the first cycle over the first cycle's area.
    """

    pressure: float
    direction: str
    cycle: int
    area: Quantity
    from_previous: Quantity | None
    from_first: Quantity | None
    part: Quantity | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "pressure": self.pressure,
            "direction": self.direction,
            "cycle": self.cycle,
            "area": self.area.to_json(),
            "from_previous": _json(self.from_previous),
            "from_first": _json(self.from_first),
            "part": _json(self.part),
        }


@dataclass(frozen=True)
class CyclesResult:
    """Every cycle of one run."""

    source: Source
    cycles: tuple[Cycle, ...]
    shifts: tuple[AreaShift, ...]
    zero_offset: Quantity
    title: str = ""
    settings: dict[str, Any] = field(default_factory=dict)
    warnings: tuple[str, ...] = field(default=())

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.cycles/1."""
        return {
            "schema": "upstroke.cycles/1",
            "title": self.title,
            "source": self.source.to_json(),
            "settings": self.settings,
            "zero_offset": self.zero_offset.to_json(),
            "warnings": list(self.warnings),
            "cycles": [cycle.to_json() for cycle in self.cycles],
            "area_shifts": [shift.to_json() for shift in self.shifts],
        }
