"""The temperature at which the two phases of a coexistence become one."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from isotherm.temperature_line import StraightLine, fit_straight_line
from isotherm.temperature_result import CriticalPoint

__all__ = ["critical_points"]

FloatArray = NDArray[np.float64]


def critical_points(
    kelvin: FloatArray,
    width: FloatArray,
    u_width: FloatArray,
    u_kelvin: FloatArray,
    pressure_line: StraightLine | None,
    warnings: list[str],
) -> tuple[CriticalPoint, ...]:
    """Extend ΔA to zero, by the customary straight line and by a square root beside it.

    Parameters
    ----------
    kelvin, u_kelvin : (n,) K
    width, u_width : (n,) ΔA and its uncertainty between runs, nm^2
    pressure_line : Π_t against T, for the critical pressure
    warnings : list
        Remarks are appended.

    Returns
    -------
    tuple of CriticalPoint
        Linear first; empty where ΔA does not fall with temperature.
    """
    if len(kelvin) < 2 or not float(np.ptp(kelvin)) > 0:
        return ()
    found = []
    for law, values, u in (
        ("linear", width, u_width),
        ("square root", width**2, 2.0 * width * u_width),
    ):
        line = fit_straight_line(kelvin, values, u, u_kelvin)
        crossing = line.crossing()
        if crossing is None or line.slope >= 0 or not math.isfinite(line.u_slope):
            continue
        pressure = None
        if pressure_line is not None and math.isfinite(pressure_line.u_slope):
            there = pressure_line.at(crossing.value, "mN/m")
            pressure = Quantity(
                there.value, math.hypot(there.u or 0.0, pressure_line.slope * crossing.u), "mN/m"
            )
        found.append(
            CriticalPoint(
                law,
                Quantity(crossing.value, crossing.u, "K"),
                (crossing.low, crossing.high),
                pressure,
                line.lack_of_fit_p,
            )
        )
    if not found or found[0].law != "linear":
        warnings.append("ΔA does not fall with temperature: no critical temperature")
        return ()
    if len(found) == 2:
        away = found[0].kelvin.value - float(kelvin.max())
        warnings.append(
            f"the critical temperature is extrapolated by {away:.0f} K; with ΔA closing as a square root "
            f"it would be {found[1].kelvin.value:.1f} K instead of {found[0].kelvin.value:.1f} K"
        )
    if found[0].interval[1] is None:
        warnings.append(
            "the fall of ΔA is not significant: the critical temperature has no upper bound"
        )
    return tuple(found)
