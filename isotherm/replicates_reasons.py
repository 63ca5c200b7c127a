"""Why a run of a series is outlying: its area scale, its shape, the pressures of its features."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from isotherm.replicates_outliers import outlying_values
from isotherm.series import spoken

__all__ = ["AreaScales", "area_scales", "outlying_reasons"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class AreaScales:
    """factors: (runs,) area over that of the median run. shapes: (runs,) rms relative rest. Unit 1."""

    factors: FloatArray
    shapes: FloatArray


def area_scales(curves: FloatArray, kept: NDArray[np.bool_]) -> AreaScales:
    """Each run's area factor against the median run, and what is left of it.

    Parameters
    ----------
    curves : (runs, p) area at common pressures, nm^2, NaN where a run lacks the pressure
    kept : (runs,) which runs make the median

    Returns
    -------
    AreaScales
        NaN where a run has less than a quarter of the pressures.
    """
    median = np.median(curves[kept], axis=0)
    ratio = np.log(curves / median)
    known = np.isfinite(ratio)
    factors = np.full(len(curves), math.nan)
    shapes = np.full(len(curves), math.nan)
    for i in range(len(curves)):  # over runs, not rows
        if known[i].sum() >= 0.25 * curves.shape[1]:
            level = float(np.median(ratio[i, known[i]]))
            factors[i] = math.exp(level)
            shapes[i] = float(np.sqrt(np.mean((ratio[i, known[i]] - level) ** 2)))
    return AreaScales(factors, shapes)


def outlying_reasons(
    scales: AreaScales,
    relative: FloatArray,
    values: Sequence[dict[str, Quantity]],
    kept: NDArray[np.bool_],
    alpha: float,
) -> list[list[str]]:
    """Why each kept run is outlying; an empty list for a run that is not.

    Parameters
    ----------
    scales : AreaScales
    relative : (runs,) stated relative uncertainty of each area scale, 0 where unknown
    values : features of each run
    kept : (runs,) the runs judged
    alpha : float
        Chance of naming any run when nothing is wrong; shared among the tests (Bonferroni).
    """
    from scipy.special import ndtri

    factors, shapes = scales.factors, scales.shapes
    reasons: list[list[str]] = [[] for _ in factors]
    tested: dict[str, dict[int, float]] = {"area scale": {}, "shape": {}}
    for i in map(int, np.flatnonzero(kept)):
        if math.isfinite(factors[i]):
            tested["area scale"][i] = math.log(factors[i])
        if math.isfinite(shapes[i]) and shapes[i] > 0:
            tested["shape"][i] = math.log(shapes[i])
        for name, value in values[i].items():
            # areas and moduli repeat what scale and shape already say
            if name.endswith("_pressure") and name not in (
                "highest_pressure",
                "modulus_max_pressure",
            ):
                tested.setdefault(name, {})[i] = value.value
    level = alpha / max(sum(len(t) >= 3 for t in tested.values()), 1)
    for name, sample in tested.items():
        places = list(sample)
        data = np.array([sample[i] for i in places])
        for hit in outlying_values(data, level):
            run = places[hit.index]
            others = float(np.median(np.delete(data, hit.index)))
            # a run closer to the median curve than the rest is no fault
            if name == "shape" and data[hit.index] < others:
                continue
            reasons[run].append(
                _words(name, float(data[hit.index]), others, hit.deviate, hit.critical)
            )
    runs = int(kept.sum())
    if runs >= 3:
        limit = float(-ndtri(level / (2.0 * runs)))
        for i in map(int, np.flatnonzero(kept)):
            off = abs(math.log(factors[i])) if math.isfinite(factors[i]) else 0.0
            allowed = limit * math.sqrt(2.0) * float(relative[i])
            if relative[i] > 0 and off > allowed:
                reasons[i].append(
                    f"areas {100 * (factors[i] - 1):+.1f} % from the median run; the uncertainty its "
                    f"sheet states allows {100 * allowed:.1f} %"
                )
    return reasons


def _words(name: str, value: float, others: float, deviate: float, critical: float) -> str:
    test = f"(Grubbs {deviate:.2f} > {critical:.2f})"
    if name == "area scale":
        return f"areas {100 * (math.exp(value - others) - 1):+.1f} % from the other runs {test}"
    if name == "shape":
        return (
            f"shape {100 * math.exp(value):.2f} % rms off the median curve, the others "
            f"{100 * math.exp(others):.2f} % {test}"
        )
    return f"{spoken(name)} {value:.2f} mN/m, the others {others:.2f} mN/m {test}"
