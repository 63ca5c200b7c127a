"""What the surface potential of a film says, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number
from isotherm.series import Row, quantity_cells

__all__ = ["MomentAt", "PotentialOnset", "PotentialResult"]

FloatArray = NDArray[np.float64]


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


@dataclass(frozen=True)
class MomentAt:
    """Potential (mV) and effective dipole moment (mD) at a named place of the isotherm."""

    name: str
    area: float
    pressure: float
    potential: Quantity
    moment: Quantity

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "name": self.name,
            "area": self.area,
            "pressure": json_number(self.pressure),
            "potential": self.potential.to_json(),
            "moment": self.moment.to_json(),
        }


@dataclass(frozen=True)
class PotentialOnset:
    """Where the potential leaves its level at large area, against lift-off.

    area nm^2; level mV, before it. difference : onset minus lift-off area, nm^2, without the scale
    error both share; None without a lift-off. p : of that difference by chance.
    reading : "before lift-off", "with lift-off", "after lift-off" or "no lift-off".
    """

    area: Quantity
    level: Quantity
    difference: Quantity | None
    p: float | None
    reading: str

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "area": self.area.to_json(),
            "level": self.level.to_json(),
            "minus_lift_off": _json(self.difference),
            "p": json_number(self.p),
            "reading": self.reading,
        }


@dataclass(frozen=True)
class PotentialResult:
    """Potential and effective dipole moment along one compression. Arrays (m,), largest area first.

    area nm^2, pressure mN/m, potential mV (baseline subtracted), moment mD, u_moment mD (random).
    noise : mV, of one point.
    """

    name: str
    path: str
    area: FloatArray
    pressure: FloatArray
    potential: FloatArray
    moment: FloatArray
    u_moment: FloatArray
    noise: float
    onset: PotentialOnset | None
    lift_off: Quantity | None
    at: tuple[MomentAt, ...]
    statement: str
    warnings: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.potential/1."""
        return {
            "schema": "upstroke.potential/1",
            "name": self.name,
            "path": self.path,
            "warnings": list(self.warnings),
            "statement": self.statement,
            "noise": json_number(self.noise),
            "onset": None if self.onset is None else self.onset.to_json(),
            "lift_off": _json(self.lift_off),
            "at": [a.to_json() for a in self.at],
        }

    def rows(self) -> list[Row]:
        """One row a point of the condensed curve."""
        return [
            {
                "area": float(self.area[i]),
                "pressure": float(self.pressure[i]),
                "potential": float(self.potential[i]),
                "moment": float(self.moment[i]),
                "u_moment": float(self.u_moment[i]),
            }
            for i in range(len(self.area))
        ]

    def summary_rows(self) -> list[Row]:
        """One row a named place."""
        rows: list[Row] = []
        for place in self.at:
            row: Row = {"name": place.name, "area": place.area, "pressure": place.pressure}
            row.update(quantity_cells("potential", place.potential))
            row.update(quantity_cells("moment", place.moment))
            rows.append(row)
        return rows
