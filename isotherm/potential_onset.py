"""Find where the potential leaves its level at large area."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = ["Onset", "find_onset"]

FloatArray = NDArray[np.float64]

_FEWEST_BEFORE: Final = 4  # points that show the level
_FEWEST_AFTER: Final = 5  # points that show the rise
_CANDIDATES: Final = 200  # onsets tried before the fine search
_PART_OF_RISE: Final = 0.5  # of the whole change of potential: further up the film condenses
_SIGNIFICANCE: Final = 1e-3  # an onset invented on a smooth curve is worse than one not found


@dataclass(frozen=True)
class Onset:
    """area (nm^2) and level (mV) with their standard uncertainties."""

    area: float
    u_area: float
    level: float
    u_level: float


def _design(area: FloatArray, onset: float) -> FloatArray:
    """Level, and a straight and a bent rise from `onset` on."""
    inside = np.maximum(onset - area, 0.0)
    return np.column_stack([np.ones(len(area)), inside, inside**2])


def _rest(area: FloatArray, potential: FloatArray, onset: float) -> float:
    design = _design(area, onset)
    scale = np.maximum(np.abs(design).max(axis=0), 1e-300)
    fit = np.linalg.lstsq(design / scale, potential, rcond=None)[0]
    return float(np.sum((potential - design / scale @ fit) ** 2))


def find_onset(area: FloatArray, potential: FloatArray, noise: float) -> Onset | None:
    """Fit a level and a rise that begins at one area; None where a smooth bend does as well.

    Parameters
    ----------
    area : (m,) nm^2, largest first
    potential : (m,) mV
    noise : float
        Standard deviation of one point, mV; used where the fit has no freedom to tell.

    Returns
    -------
    Onset or None
    """
    from scipy.optimize import minimize_scalar
    from scipy.special import fdtrc

    start = float(np.median(potential[: max(_FEWEST_BEFORE, len(potential) // 50)]))
    change = potential - start
    furthest = float(change[int(np.argmax(np.abs(change)))])
    if abs(furthest) < 6.0 * noise:
        return None
    reached = np.flatnonzero(change * math.copysign(1.0, furthest) >= _PART_OF_RISE * abs(furthest))
    last = int(reached[0]) + 1
    a, v = area[:last], potential[:last]
    n = len(a)
    if n < _FEWEST_BEFORE + _FEWEST_AFTER:
        return None
    inner = a[_FEWEST_BEFORE - 1 : n - _FEWEST_AFTER + 1]
    grid = np.linspace(float(inner[0]), float(inner[-1]), min(_CANDIDATES, 4 * len(inner)))
    rests = np.array([_rest(a, v, g) for g in grid])
    best = int(np.argmin(rests))
    low, high = sorted((float(grid[max(best - 1, 0)]), float(grid[min(best + 1, len(grid) - 1)])))
    fine = minimize_scalar(
        lambda g: _rest(a, v, g), bounds=(low, high), method="bounded", options={"xatol": 1e-9}
    )
    onset = float(fine.x) if fine.fun <= rests[best] else float(grid[best])
    rest = min(float(fine.fun), float(rests[best]))
    freedom = n - 4
    # the rival: one cubic without any beginning, as many parameters
    powers = np.polynomial.legendre.legvander((a - a.mean()) / max(float(np.ptp(a)), 1e-300), 3)
    smooth = powers @ np.linalg.lstsq(powers, v, rcond=None)[0]
    rival = float(np.sum((v - smooth) ** 2))
    flat = float(np.sum((v - v.mean()) ** 2))
    if rest <= 0:
        rest = max(rest, (1e-9 * max(abs(furthest), 1e-9)) ** 2 * n)
    better_than_flat = float(fdtrc(3, freedom, (flat - rest) / 3 / (rest / freedom)))
    # two fits of equal size: the ratio of their scatters must itself be beyond chance
    ratio_p = float(fdtrc(freedom, freedom, rival / rest)) if rest > 0 else 0.0
    if better_than_flat > _SIGNIFICANCE or ratio_p > 0.05 or rival <= rest:
        return None
    design = _design(a, onset)
    coefficients = np.linalg.lstsq(design, v, rcond=None)[0]
    inside = np.maximum(onset - a, 0.0)
    by_onset = np.where(a < onset, coefficients[1] + 2.0 * coefficients[2] * inside, 0.0)
    jacobian = np.column_stack([design, by_onset])
    scale = np.maximum(np.abs(jacobian).max(axis=0), 1e-300)
    inverse = np.linalg.pinv((jacobian / scale).T @ (jacobian / scale)) / np.outer(scale, scale)
    variance = max(rest / freedom, noise**2)
    return Onset(
        onset,
        math.sqrt(variance * float(inverse[3, 3])),
        float(coefficients[0]),
        math.sqrt(variance * float(inverse[0, 0])),
    )
