"""Repeated runs of one film: mean curve, spread of every feature, outlying runs."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.replicates_features import match_features
from isotherm.replicates_reasons import area_scales, outlying_reasons
from isotherm.replicates_result import FeatureSpread, MeanCurve, ReplicateRun, ReplicatesResult
from isotherm.result import IsothermResult
from isotherm.series import (
    COVERAGE,
    area_against_pressure,
    effective_freedom,
    pressure_range,
    run_names,
    spoken,
    student_factor,
)

__all__ = ["OUTLIER_ALPHA", "REPEATABILITY_FACTOR", "analyse_replicates"]

FloatArray = NDArray[np.float64]

# Chance of naming any run of a sound series, shared among the tests made. Practice: 5 %.
OUTLIER_ALPHA: Final = 0.05
# r = 2.8 s_r, 2.8 = 1.96 √2 rounded: the difference two results exceed in 5 % of cases
# (ISO 5725-6:1994, 4.1.4; from memory).
REPEATABILITY_FACTOR: Final = 2.8
_GRID: Final = 200  # pressures of the mean curve
# Runs further apart than this are not at one temperature (practice: troughs hold 0.5 K or better).
_SAME_TEMPERATURE: Final = 0.5  # K


def analyse_replicates(
    results: Sequence[IsothermResult],
    *,
    drop: Sequence[str] = (),
    alpha: float = OUTLIER_ALPHA,
) -> ReplicatesResult:
    """Compare repeated runs of one film.

    The mean curve averages area at each pressure, so that transitions and collapse stay sharp although
    spreading errors move whole isotherms sideways. The systematic uncertainty that every run shares
    (solution, trough) is carried beside the scatter and never divided by √n.

    Parameters
    ----------
    results : sequence of IsothermResult
        One a run; the first compression of each is used.
    drop : sequence of str
        Names or paths of runs the user leaves out; they are still listed.
    alpha : float
        Chance of naming any run when nothing is wrong.

    Returns
    -------
    ReplicatesResult

    Raises
    ------
    UpstrokeError
        For fewer than two kept runs, an unknown name in `drop`, or runs without a common pressure.
    """
    names = run_names(results)
    kept = _kept(results, names, drop)
    branches = [r.headline for r in results]
    matched = match_features(branches)
    warnings: list[str] = list(_conditions(results, names))
    grid = _grid(results, names, kept, warnings)
    curves = np.vstack([area_against_pressure(b, grid).area for b in branches])
    relative = np.array([r.area_relative_u or 0.0 for r in results])
    scales = area_scales(curves, kept)
    reasons = outlying_reasons(scales, relative, matched.values, kept, alpha)
    runs = tuple(
        ReplicateRun(
            name=names[i],
            path=results[i].source.path,
            kept=bool(kept[i]),
            area_factor=_factor(float(scales.factors[i]), float(relative[i])),
            shape=float(scales.shapes[i]) if math.isfinite(scales.shapes[i]) else None,
            reasons=(*reasons[i], *matched.odd[i]) if kept[i] else (),
            values=matched.values[i],
        )
        for i in range(len(results))
    )
    features = _features(runs, warnings)
    if not relative[kept].any():
        warnings.append(
            "no uncertainty of the area scale is known (run sheet): the shared part of u is missing"
        )
    elif kept.sum() > 1:
        warnings.append(
            "the whole area-scale uncertainty of the sheets is taken as shared by every run; "
            "whatever part of it differs between runs is in s as well"
        )
    curve = _mean_curve(grid, curves[kept], relative[kept])
    return ReplicatesResult(runs, curve, features, curves, alpha, tuple(warnings))


def _kept(
    results: Sequence[IsothermResult], names: Sequence[str], drop: Sequence[str]
) -> NDArray[np.bool_]:
    kept = np.ones(len(results), dtype=bool)
    for wanted in drop:
        hits = [i for i, r in enumerate(results) if wanted in (names[i], r.source.path)]
        if not hits:
            raise UpstrokeError(
                f"no run is called {wanted!r}", remedy=f"the runs are: {', '.join(names)}"
            )
        kept[hits] = False
    if kept.sum() < 2:
        raise UpstrokeError(
            f"{int(kept.sum())} run{'' if kept.sum() == 1 else 's'} left to compare",
            remedy="give at least two runs of the same film",
        )
    return kept


def _conditions(results: Sequence[IsothermResult], names: Sequence[str]) -> list[str]:
    """Say where the runs are not repeats of one another."""
    said: list[str] = []
    seen: dict[str, int] = {}
    for i, result in enumerate(results):
        digest = result.source.sha256
        if digest and digest in seen:
            said.append(
                f"{names[i]} and {names[seen[digest]]} are the same file: n counts it twice"
            )
        seen.setdefault(digest, i)
    kelvin = [r.kelvin for r in results if r.kelvin is not None]
    if kelvin and max(kelvin) - min(kelvin) > _SAME_TEMPERATURE:
        said.append(
            f"temperatures differ by {max(kelvin) - min(kelvin):.1f} K: these are not replicates of one "
            "condition"
        )
    return said


def _grid(
    results: Sequence[IsothermResult],
    names: Sequence[str],
    kept: NDArray[np.bool_],
    warnings: list[str],
) -> FloatArray:
    """Pressures every kept run has, evenly spaced."""
    ranges = [pressure_range(r.headline, where=r.source.path) for r in results]
    low = max(ranges[i][0] for i in np.flatnonzero(kept))
    highs = np.array([ranges[i][1] for i in np.flatnonzero(kept)])
    high = float(highs.min())
    if not high > low:
        raise UpstrokeError(
            "the runs have no surface pressure in common",
            where=names[int(np.flatnonzero(kept)[int(np.argmin(highs))])],
            remedy="drop the run that never rises",
        )
    usual = float(np.median(highs))
    if high < 0.8 * usual:
        short = names[int(np.flatnonzero(kept)[int(np.argmin(highs))])]
        warnings.append(
            f"the mean curve ends at {high:.1f} mN/m because {short} does; half of the runs pass "
            f"{usual:.1f} mN/m"
        )
    return np.linspace(low, high, _GRID)


def _factor(value: float, relative: float) -> Quantity | None:
    if not math.isfinite(value):
        return None
    return Quantity(value, value * relative if relative > 0 else None, "1")


def _features(runs: Sequence[ReplicateRun], warnings: list[str]) -> tuple[FeatureSpread, ...]:
    kept = [r for r in runs if r.kept]
    names = list(dict.fromkeys(name for run in kept for name in run.values))
    features = []
    for name in names:
        found = [r.values[name] for r in kept if name in r.values]
        features.append(_spread(name, found))
        if len(found) < len(kept) and not name.endswith("_area"):
            warnings.append(f"{spoken(name)}: found in {len(found)} of {len(kept)} runs")
    return tuple(features)


def _spread(name: str, found: Sequence[Quantity]) -> FeatureSpread:
    """Mean, scatter and repeatability of one feature (ISO 5725-2:1994, one laboratory)."""
    from scipy.special import chdtri

    unit = found[0].unit
    values = np.array([q.value for q in found])
    n = len(values)
    mean = float(values.mean())
    # the same error in every run: parts add, they do not combine in quadrature
    shared = float(np.mean([q.u_systematic or 0.0 for q in found])) or None
    if n < 2:
        return FeatureSpread(name, n, found[0], None, None, None, None, None, None)
    s = float(values.std(ddof=1))
    random = s / math.sqrt(n)
    freedom = n - 1
    half = student_factor(freedom) * random
    both = math.hypot(random, shared or 0.0)
    parts = [(random, float(freedom)), (shared or 0.0, math.inf)]
    wide = student_factor(effective_freedom(parts)) * both if both > 0 else 0.0
    tail = 0.5 * (1.0 - COVERAGE)
    s_low = s * math.sqrt(freedom / float(chdtri(freedom, tail)))
    s_high = s * math.sqrt(freedom / float(chdtri(freedom, 1.0 - tail)))
    return FeatureSpread(
        name=name,
        n=n,
        mean=Quantity.combine(mean, unit, u_random=random, u_systematic=shared),
        s=s,
        interval=(mean - half, mean + half),
        interval_combined=(mean - wide, mean + wide),
        repeatability_s=s,
        repeatability_s_interval=(s_low, s_high),
        repeatability_limit=REPEATABILITY_FACTOR * s,
    )


def _mean_curve(grid: FloatArray, curves: FloatArray, relative: FloatArray) -> MeanCurve:
    n = len(curves)
    mean = curves.mean(axis=0)
    s = curves.std(axis=0, ddof=1)
    half = student_factor(n - 1) * s / math.sqrt(n)
    return MeanCurve(grid, mean, s, n, mean * float(relative.mean()), mean - half, mean + half)
