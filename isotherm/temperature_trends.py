"""Features and areas against temperature: straight lines with their significance."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.mixture_areas import scale_parts
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.series import area_against_pressure, pressure_range, random_part, two_sided_p
from isotherm.sheet import RunSheet
from isotherm.temperature_line import StraightLine, fit_straight_line
from isotherm.temperature_result import Expansivity, TemperatureRun, TemperatureTrend

__all__ = ["expansivities", "feature_trends", "own_scale_u"]

FloatArray = NDArray[np.float64]

_USUAL_PRESSURES: Final = (5.0, 10.0, 15.0, 20.0, 25.0, 30.0, 35.0, 40.0)  # mN/m
# Kept clear of either end of a coexistence: knees are rounded over about this.
_CLEAR_OF_KNEE: Final = 0.5  # mN/m
# Ends of a trace and places of extremes say nothing of the film at a temperature.
_NO_TREND: Final = ("highest_pressure", "modulus_max_pressure")


def own_scale_u(result: IsothermResult, sheet: RunSheet) -> float:
    """Relative u of the area scale that differs from run to run: the drawn volume.

    One solution and one trough serve a series of temperatures; where the sheet does not say what the
    uncertainty is made of, all of it is taken as the run's own.
    """
    parts = scale_parts(result, sheet)
    if sheet.film.concentration is None and sheet.film.volume is None:
        return parts.solution
    return parts.volume


def _interval(line: StraightLine) -> tuple[float, float]:
    half = line.factor * line.u_slope
    return line.slope - half, line.slope + half


def _line_p(line: StraightLine) -> float:
    # the freedom behind the factor is not kept: compare with it at the normal 1.96
    return two_sided_p(line.slope, line.u_slope * line.factor / 1.959963984540054)


def feature_trends(
    runs: Sequence[TemperatureRun],
    results: Sequence[IsothermResult],
    sheets: Sequence[RunSheet],
) -> tuple[TemperatureTrend, ...]:
    """A straight line through every feature that three runs or more show."""
    names = list(dict.fromkeys(n for run in runs for n in run.values if n not in _NO_TREND))
    trends = []
    for name in names:
        places = [i for i, run in enumerate(runs) if name in run.values]
        kelvin = np.array([runs[i].kelvin.value for i in places])
        if len(places) < 3 or not np.ptp(kelvin) > 0:
            continue
        found = [runs[i].values[name] for i in places]
        unit = found[0].unit
        own = np.zeros(len(places))
        if unit == "nm^2":
            own = np.array([own_scale_u(results[i], sheets[i]) for i in places])
        elif name.endswith("pressure"):
            own = np.array([results[i].pressure_u or 0.0 for i in places])
        value = np.array([q.value for q in found])
        random = np.array([random_part(q) for q in found])
        u = np.hypot(random, own * (value if unit == "nm^2" else 1.0))
        line = fit_straight_line(kelvin, value, u, _u_kelvin(runs, places))
        if not math.isfinite(line.u_slope):
            continue
        trends.append(
            TemperatureTrend(
                name,
                len(places),
                Quantity(line.slope, line.u_slope, f"{unit}/K"),
                _interval(line),
                line.at(float(kelvin.mean()), unit),
                float(kelvin.mean()),
                _line_p(line),
            )
        )
    return tuple(trends)


def _u_kelvin(runs: Sequence[TemperatureRun], places: Sequence[int]) -> FloatArray:
    return np.array([runs[i].kelvin.u or 0.0 for i in places])


def _side(run: TemperatureRun, pressure: float, result: IsothermResult) -> str | None:
    """On which side of the run's coexistence `pressure` lies; None inside it."""
    if run.pressure is None:
        return "no transition"
    if pressure < run.pressure.value - _CLEAR_OF_KNEE:
        return "expanded"
    ends = [
        t.end.pressure.value
        for t in result.headline.transitions
        if t.kind == "coexistence" and t.onset is not None and t.end is not None
        if t.onset.pressure.value == run.pressure.value
    ]
    if ends and pressure > ends[0] + _CLEAR_OF_KNEE:
        return "condensed"
    return None


def expansivities(
    runs: Sequence[TemperatureRun],
    results: Sequence[IsothermResult],
    sheets: Sequence[RunSheet],
    pressures: Sequence[float] | None,
) -> tuple[Expansivity, ...]:
    """(1/A) dA/dT at each pressure, separately on either side of the transition.

    A line of ln A against T; runs whose coexistence holds the pressure are left out, because their area
    there is a mixture of two phases.
    """
    wanted = np.array(sorted(set(_USUAL_PRESSURES if pressures is None else pressures)))
    tops = [pressure_range(r.headline, where=r.source.path)[1] for r in results]
    samples = [area_against_pressure(r.headline, wanted) for r in results]
    found = []
    for column, pressure in enumerate(wanted):
        sides: dict[str, list[int]] = {}
        for i, run in enumerate(runs):
            side = _side(run, float(pressure), results[i])
            if side and math.isfinite(samples[i].area[column]) and pressure <= tops[i]:
                sides.setdefault(side, []).append(i)
        for side, places in sides.items():
            kelvin = np.array([runs[i].kelvin.value for i in places])
            if len(places) < 2 or not np.ptp(kelvin) > 0:
                continue
            area = np.array([samples[i].area[column] for i in places])
            zero = np.array(
                [
                    math.hypot(
                        results[i].pressure_u or 0.0, results[i].headline.zero_offset.u or 0.0
                    )
                    for i in places
                ]
            )
            soft = np.array([samples[i].softness[column] for i in places])
            random = np.array([samples[i].u_random[column] for i in places])
            own = np.array([own_scale_u(results[i], sheets[i]) for i in places])
            u = np.sqrt(own**2 + (random / area) ** 2 + (soft * zero / area) ** 2)
            line = fit_straight_line(kelvin, np.log(area), u, _u_kelvin(runs, places))
            if math.isfinite(line.u_slope):
                value = Quantity(line.slope, line.u_slope, "1/K")
                found.append(
                    Expansivity(float(pressure), side, len(places), value, _interval(line))
                )
    return tuple(found)
