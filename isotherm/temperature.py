"""Isotherms at several temperatures: slope and heat of the transition, critical point, trends."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import AVOGADRO, ZERO_CELSIUS
from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.replicates_features import match_features
from isotherm.result import IsothermResult, Transition
from isotherm.series import format_p, random_part, run_names
from isotherm.sheet import RunSheet
from isotherm.temperature_critical import critical_points
from isotherm.temperature_line import StraightLine, fit_straight_line
from isotherm.temperature_result import (
    TemperatureResult,
    TemperatureRun,
    TransitionHeat,
)
from isotherm.temperature_trends import expansivities, feature_trends, own_scale_u
from isotherm.water import surface_tension_slope

__all__ = ["analyse_temperature"]

FloatArray = NDArray[np.float64]

# 1 nm^2 mN/m = 1e-21 J, times N_A: J/mol.
_JOULE_PER_MOLE: Final = AVOGADRO * 1e-21
_SIGNIFICANCE: Final = 0.05  # customary


def analyse_temperature(
    results: Sequence[IsothermResult],
    sheets: Sequence[RunSheet],
    *,
    pressures: Sequence[float] | None = None,
) -> TemperatureResult:
    """Follow the transition and every feature over temperature.

    Parameters
    ----------
    results : sequence of IsothermResult
        One a run; its first compression is used.
    sheets : sequence of RunSheet
        One a run; `subphase.temperature` with its u, `subphase.tension` where measured.
    pressures : sequence of float, optional
        mN/m, for the expansivity; by default every 5 mN/m up to 40.

    Returns
    -------
    TemperatureResult

    Raises
    ------
    UpstrokeError
        Where a run has no temperature, or all have the same.

    Notes
    -----
    Two-dimensional Clapeyron relation, ΔH = T ΔA dΠ_t/dT; the full form, with the entropy of the
    subphase's own surface, ΔH = T ΔA (dΠ_t/dT - dγ0/dT) (Motomura, J. Colloid Interface Sci. 1974, 48, 307;
    from memory). ΔA is onset minus end, so heat is that taken up by the change from condensed to
    expanded, and compression gives it back.
    """
    if len(results) != len(sheets):
        raise UpstrokeError(
            f"{len(results)} runs but {len(sheets)} run sheets",
            remedy="give one sheet for each run",
        )
    warnings: list[str] = []
    runs = _runs(results, sheets, warnings)
    order = sorted(range(len(runs)), key=lambda i: runs[i].kelvin.value)
    runs, results, sheets = (
        [runs[i] for i in order],
        [results[i] for i in order],
        [sheets[i] for i in order],
    )
    kelvin = np.array([r.kelvin.value for r in runs])
    if not np.ptp(kelvin) > 0:
        raise UpstrokeError(
            "all runs have one temperature", remedy="give runs at two temperatures or more"
        )
    line = _pressure_line(runs, warnings)
    tension, tension_from = _tension_slope(runs, sheets, warnings)
    widths = _widths(runs, results, sheets)
    area_line = (
        fit_straight_line(widths.kelvin, widths.width, widths.u_width, widths.u_kelvin)
        if len(widths.kelvin) >= 2 and np.ptp(widths.kelvin) > 0
        else None
    )
    slope = None if line is None else Quantity(line.slope, _finite(line.u_slope), "mN/m/K")
    if slope is not None:
        runs = [replace(r, heat=_heat(r, slope, tension)) for r in runs]
    begins = None if line is None or not math.isfinite(line.u_slope) else line.crossing()
    half = 0.0 if line is None else line.factor * line.u_slope
    return TemperatureResult(
        runs=tuple(runs),
        pressure_line=line,
        slope=slope,
        slope_interval=None
        if line is None or not math.isfinite(half)
        else (line.slope - half, line.slope + half),
        tension_slope=tension,
        tension_from=tension_from,
        delta_area_line=area_line,
        begins_at=begins,
        critical=critical_points(
            widths.kelvin, widths.width, widths.u_width, widths.u_kelvin, line, warnings
        ),
        trends=feature_trends(runs, results, sheets),
        expansivity=expansivities(runs, results, sheets, pressures),
        warnings=tuple(warnings),
    )


def _finite(u: float) -> float | None:
    return u if math.isfinite(u) else None


def _widest(transitions: Sequence[Transition]) -> Transition | None:
    """The coexistence with the largest ΔA; one without an end counts last."""

    def width(t: Transition) -> float:
        return t.onset.area.value - t.end.area.value if t.onset and t.end else 0.0

    found = [t for t in transitions if t.kind == "coexistence" and t.onset is not None]
    return max(found, key=width, default=None)


def _runs(
    results: Sequence[IsothermResult], sheets: Sequence[RunSheet], warnings: list[str]
) -> list[TemperatureRun]:
    names = run_names(results)
    values = match_features([r.headline for r in results]).values
    runs = []
    several = []
    for i, (result, sheet) in enumerate(zip(results, sheets, strict=True)):
        celsius = sheet.subphase.temperature
        if celsius is not None:
            kelvin = Quantity(celsius.value + ZERO_CELSIUS, celsius.u, "K")
        elif result.kelvin is not None:
            kelvin = Quantity(result.kelvin, None, "K")
        else:
            raise UpstrokeError(
                "the temperature of this run is not known",
                where=result.source.path,
                remedy='add [subphase] temperature = "20.0 ± 0.2 degC" to its sheet',
            )
        branch = result.headline
        if sum(t.kind == "coexistence" for t in branch.transitions) > 1:
            several.append(names[i])
        transition = _widest(branch.transitions)
        onset = transition.onset if transition else None
        end = transition.end if transition else None
        plain = {n: q for n, q in values[i].items() if not n.startswith(("coexistence", "kink"))}
        runs.append(
            TemperatureRun(
                name=names[i],
                path=result.source.path,
                kelvin=kelvin,
                pressure=None if onset is None else onset.pressure,
                onset_area=None if onset is None else onset.area,
                end_area=None if end is None else end.area,
                delta_area=None
                if onset is None or end is None
                else _difference(onset.area, end.area, result.area_relative_u or 0.0),
                values=plain,
            )
        )
    if several:
        warnings.append(f"more than one coexistence: the widest is followed ({', '.join(several)})")
    if any(r.kelvin.u is None for r in runs):
        warnings.append("some temperatures have no uncertainty: taken as exact")
    return runs


def _difference(onset: Quantity, end: Quantity, relative: float) -> Quantity:
    """ΔA; a scale error multiplies it, so it does not add the two areas' own."""
    value = onset.value - end.value
    random = math.hypot(random_part(onset), random_part(end))
    return Quantity.combine(
        value, "nm^2", u_random=random, u_systematic=relative * value if relative else None
    )


def _pressure_line(runs: Sequence[TemperatureRun], warnings: list[str]) -> StraightLine | None:
    """Π_t against T through the runs that have a coexistence."""
    places = [i for i, r in enumerate(runs) if r.pressure is not None]
    without = [runs[i].name for i in range(len(runs)) if i not in places]
    kelvin = np.array([runs[i].kelvin.value for i in places])
    if without:
        warnings.append(f"no coexistence in {', '.join(without)}: not used for the transition")
    if len(places) < 2 or not np.ptp(kelvin) > 0:
        warnings.append("fewer than two temperatures show a coexistence: no slope, no heat")
        return None
    found = [q for i in places if (q := runs[i].pressure) is not None]
    # each run has its own zero and its own placing of the probe: all of u is between runs
    u = np.array([q.u or 0.0 for q in found])
    u_kelvin = np.array([runs[i].kelvin.u or 0.0 for i in places])
    line = fit_straight_line(kelvin, np.array([q.value for q in found]), u, u_kelvin)
    if len(places) == 2:
        warnings.append(
            "two temperatures only: nothing tells whether the transition pressure is straight"
        )
    p = line.lack_of_fit_p
    if p is not None and p < _SIGNIFICANCE:
        warnings.append(
            f"transition pressures leave the straight line by more than their u ({format_p(p)}): u of the "
            f"slope enlarged {line.inflated:.1f}-fold"
        )
    return line


def _tension_slope(
    runs: Sequence[TemperatureRun], sheets: Sequence[RunSheet], warnings: list[str]
) -> tuple[Quantity, str]:
    """dγ0/dT: measured where every sheet gives the tension, else water's at the mean temperature."""
    mean = float(np.mean([r.kelvin.value for r in runs]))
    measured = [s.subphase.tension for s in sheets]
    given = [q for q in measured if q is not None]
    if len(given) == len(runs):
        kelvin = np.array([r.kelvin.value for r in runs])
        u = np.array([q.u or 0.0 for q in given])
        line = fit_straight_line(kelvin, np.array([q.value for q in given]), u)
        return Quantity(line.slope, _finite(line.u_slope), "mN/m/K"), "measured tensions"
    liquids = {s.subphase.liquid for s in sheets}
    if liquids - {"water", ""}:
        warnings.append(
            f"dγ0/dT of pure water is used for {', '.join(sorted(liquids - {'water', ''}))}"
        )
    return Quantity(surface_tension_slope(mean), 0.0, "mN/m/K"), "water, IAPWS R1-76(2014)"


def _heat(run: TemperatureRun, slope: Quantity, tension: Quantity) -> TransitionHeat | None:
    width = run.delta_area
    if width is None or slope.u is None:
        return None

    def pair(rate: float, u_rate: float) -> tuple[Quantity, Quantity]:
        entropy = _JOULE_PER_MOLE * width.value * rate
        u = _JOULE_PER_MOLE * math.hypot(width.value * u_rate, (width.u or 0.0) * rate)
        kelvin = run.kelvin.value
        u_heat = math.hypot(kelvin * u, entropy * (run.kelvin.u or 0.0))
        return Quantity(entropy, u, "J/mol/K"), Quantity(kelvin * entropy, u_heat, "J/mol")

    entropy, enthalpy = pair(slope.value, slope.u)
    full = (
        pair(slope.value - tension.value, math.hypot(slope.u, tension.u))
        if tension.u is not None
        else (None, None)
    )
    return TransitionHeat(entropy, enthalpy, full[0], full[1])


@dataclass(frozen=True)
class _Widths:
    """T (K), ΔA (nm^2) and their uncertainties between runs, (n,)."""

    kelvin: FloatArray
    width: FloatArray
    u_width: FloatArray
    u_kelvin: FloatArray


def _widths(
    runs: Sequence[TemperatureRun],
    results: Sequence[IsothermResult],
    sheets: Sequence[RunSheet],
) -> _Widths:
    """ΔA of the runs whose coexistence has both ends."""
    kept = [(i, q) for i, r in enumerate(runs) if (q := r.delta_area) is not None]
    own = [
        math.hypot(random_part(q), own_scale_u(results[i], sheets[i]) * q.value) for i, q in kept
    ]
    return _Widths(
        np.array([runs[i].kelvin.value for i, _ in kept]),
        np.array([q.value for _, q in kept]),
        np.array(own),
        np.array([runs[i].kelvin.u or 0.0 for i, _ in kept]),
    )
