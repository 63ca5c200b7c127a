"""What the fluid branch of an isotherm says, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number
from isotherm.series import Row, quantity_cells

__all__ = ["FluidResult", "GaseousLimit", "VolmerFit"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class VolmerFit:
    """Π = kT/(A - ω) - Π_coh over a stretch of pressure.

    pressure : mN/m, from and to. co_area : ω, nm^2. cohesion : Π_coh, mN/m.
    thermal_factor : q of q kT/(A - ω) when it is left free, 1 where the model is right.
    misfit : rms of the points about the model beyond their noise, mN/m.
    p_smooth : probability of a smooth misfit by chance (F test); p_runs : of so few or many changes of
    sign (Wald-Wolfowitz); both with the factor free, since an error of the area scale changes it.
    holds : both compatible with chance, and the factor with 1.
    """

    pressure: tuple[float, float]
    points: int
    co_area: Quantity
    cohesion: Quantity
    thermal_factor: Quantity
    misfit: float
    p_smooth: float
    p_runs: float
    holds: bool

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "pressure": list(self.pressure),
            "points": self.points,
            "co_area": self.co_area.to_json(),
            "cohesion": self.cohesion.to_json(),
            "thermal_factor": self.thermal_factor.to_json(),
            "misfit": json_number(self.misfit),
            "p_smooth": json_number(self.p_smooth),
            "p_runs": json_number(self.p_runs),
            "holds": self.holds,
        }


@dataclass(frozen=True)
class GaseousLimit:
    """Π A / kT extended to zero pressure: 1 for a gas of single molecules, below it when they hold on.

    reading : "gaseous", "associated" or "cannot tell".
    """

    ratio: Quantity
    area: tuple[float, float]
    reading: str

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {"ratio": self.ratio.to_json(), "area": list(self.area), "reading": self.reading}


@dataclass(frozen=True)
class FluidResult:
    """The fluid branch of one run.

    whole : fit over the whole branch. lower : fit over the longest lower part where the model holds,
    None where `whole` holds or no part does.
    area, pressure, u_pressure : (m,) the points fitted, nm^2 and mN/m.
    """

    name: str
    path: str
    kelvin: float
    whole: VolmerFit
    lower: VolmerFit | None
    gaseous: GaseousLimit | None
    area: FloatArray
    pressure: FloatArray
    u_pressure: FloatArray
    statement: str
    warnings: tuple[str, ...] = ()

    @property
    def best(self) -> VolmerFit:
        """The fit to quote: the whole branch where the model holds, else the lower part, else the whole."""
        return self.whole if self.whole.holds or self.lower is None else self.lower

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.fluid/1."""
        return {
            "schema": "upstroke.fluid/1",
            "name": self.name,
            "path": self.path,
            "kelvin": self.kelvin,
            "warnings": list(self.warnings),
            "statement": self.statement,
            "whole_branch": self.whole.to_json(),
            "lower_part": None if self.lower is None else self.lower.to_json(),
            "gaseous_limit": None if self.gaseous is None else self.gaseous.to_json(),
        }

    def rows(self) -> list[Row]:
        """One row: the fit to quote."""
        fit = self.best
        row: Row = {"name": self.name, "path": self.path, "kelvin": self.kelvin}
        row.update({"from": fit.pressure[0], "to": fit.pressure[1], "holds": int(fit.holds)})
        row.update(quantity_cells("co_area", fit.co_area))
        row.update(quantity_cells("cohesion", fit.cohesion))
        row.update(quantity_cells("thermal_factor", fit.thermal_factor))
        row.update({"misfit": fit.misfit, "p_smooth": fit.p_smooth, "p_runs": fit.p_runs})
        row.update(quantity_cells("gaseous_ratio", self.gaseous.ratio if self.gaseous else None))
        return [row]
