"""One run as arrays in fixed units: what every isotherm analysis starts from."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from isotherm.source import Source

__all__ = ["Trace"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Trace:
    """A run: rows in time order, missing cells dropped.

    area : (n,) area per molecule, nm^2.
    pressure : (n,) surface pressure, mN/m, as recorded (zero not yet subtracted).
    time : (n,) s, or None where the export has none.
    trough_area : (n,) cm^2, or None where the export gives area per molecule only.
    temperature, potential : (n,) degC and mV, or None.
    area_relative_u : standard relative uncertainty of the area scale, common to the whole run.
    pressure_u : standard uncertainty of the pressure scale, mN/m, common to the whole run.
    subphase_tension : mN/m, of the clean subphase (an upper bound for any pressure).
    kelvin : temperature of the run, K, or None.
    """

    area: FloatArray
    pressure: FloatArray
    source: Source
    time: FloatArray | None = None
    trough_area: FloatArray | None = None
    temperature: FloatArray | None = None
    potential: FloatArray | None = None
    area_relative_u: float | None = None
    pressure_u: float | None = None
    subphase_tension: float | None = None
    kelvin: float | None = None
    title: str = ""
    warnings: tuple[str, ...] = field(default=())
