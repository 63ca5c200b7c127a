"""Surface pressure of every row, from pressure or tension, and what bounds it."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import ZERO_CELSIUS
from isotherm.errors import UpstrokeError
from isotherm.sheet import RunSheet, Subphase
from isotherm.table import Table
from isotherm.water import surface_tension, surface_tension_slope

__all__ = ["Pressures", "pressures_of"]

FloatArray = NDArray[np.float64]

_ROOM: Final = 20.0  # degC, where only an upper bound for pressure hangs on it
_AQUEOUS: Final = (
    "water",
    "wasser",
    "buffer",
    "aqueous",
    "saline",
    "pbs",
    "h2o",
    "eau",
    "agua",
    "brine",
)


@dataclass(frozen=True)
class Pressures:
    """values : (n,) surface pressure, mN/m. u : standard uncertainty common to all rows, mN/m, or None.

    gamma : tension of the clean subphase, mN/m, or None. kelvin : temperature of the run, K, or None.
    """

    values: FloatArray
    u: float | None
    gamma: float | None
    kelvin: float | None
    warnings: tuple[str, ...] = field(default=())


def pressures_of(table: Table, sheet: RunSheet) -> Pressures:
    """Surface pressure as recorded, or from tension; with the tension of the clean subphase.

    γ0 is the sheet's where it gives one, else that of pure water at the recorded temperature or the sheet's.

    Raises
    ------
    UpstrokeError
        When the export gives tension and γ0 cannot be had.
    """
    warnings: list[str] = []
    celsius = _celsius(table, sheet)
    kelvin = None if celsius is None else celsius + ZERO_CELSIUS
    given = sheet.subphase.tension
    scale = sheet.trough.pressure_uncertainty
    u = None if scale is None else scale.value
    recorded = table.values.get("pressure")
    aqueous = _is_aqueous(sheet.subphase)
    if recorded is not None:
        gamma = given.value if given is not None else None
        if gamma is None and aqueous:
            gamma = surface_tension((_ROOM if celsius is None else celsius) + ZERO_CELSIUS)
        return Pressures(recorded, u, gamma, kelvin, tuple(warnings))
    tension = table.values["tension"]
    if given is not None:
        clean, clean_u = given.value, given.u
    else:
        if not aqueous or kelvin is None:
            what = "its temperature" if aqueous else f"the tension of '{sheet.subphase.liquid}'"
            raise UpstrokeError(
                f"the export gives tension, and {what} is not known",
                where=table.source.path,
                remedy='add to the run sheet under [subphase]: tension = "72.7 ± 0.1 mN/m" as measured on '
                'the clean surface, or for water temperature = "20.0 ± 0.2 degC"',
            )
        clean = surface_tension(kelvin)
        known = sheet.subphase.temperature
        clean_u = None
        if known is not None and known.u is not None:
            clean_u = abs(surface_tension_slope(kelvin)) * known.u
        warnings.append(
            f"pressure is {clean:.2f} mN/m (pure water at {kelvin - ZERO_CELSIUS:.1f} degC) less the "
            "tension; the clean subphase's own tension is not in the run sheet"
        )
    if clean_u is not None:
        u = clean_u if u is None else math.hypot(u, clean_u)
    return Pressures(clean - tension, u, clean, kelvin, tuple(warnings))


def _is_aqueous(subphase: Subphase) -> bool:
    liquid = subphase.liquid.casefold()
    return not liquid or any(word in liquid for word in _AQUEOUS)


def _celsius(table: Table, sheet: RunSheet) -> float | None:
    """Temperature of the run, degC: the mean of the recorded, else the sheet's."""
    recorded = table.values.get("temperature")
    if recorded is not None:
        finite = recorded[np.isfinite(recorded)]
        if len(finite):
            middle = float(np.median(finite))
            if -25.0 < middle < 150.0:
                return middle
    given = sheet.subphase.temperature
    return None if given is None else given.value
