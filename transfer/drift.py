"""Trend of the transfer ratio along a build: Theil-Sen slope, up and down strokes about their own levels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from transfer.drift_changes import change_points
from transfer.result import Drift

__all__ = ["SlopeEstimate", "ratio_drift", "theil_sen"]

FloatArray = NDArray[np.float64]

# 97.5 % point of the normal distribution (95 % limits).
_NORMAL_975 = 1.959964
# Directions that take less than this say nothing of a drift.
_TAKES = 0.15
_LEAST = 3


@dataclass(frozen=True)
class SlopeEstimate:
    """Theil-Sen slope and its 95 % limits, per unit of x."""

    slope: float
    low: float
    high: float


def theil_sen(x: FloatArray, y: FloatArray, group: NDArray[np.intp]) -> SlopeEstimate | None:
    """Median of the slopes of all pairs within a group, with the limits Sen gives.

    Parameters
    ----------
    x, y : (n,) abscissa and ordinate.
    group : (n,) pairs are formed within equal values only (up and down strokes have their own levels).

    Returns
    -------
    SlopeEstimate or None
        None when no group holds two points of different x.

    Notes
    -----
    Sen, J. Am. Stat. Assoc. 1968, 63, 1379. The variance of Kendall's score is summed over the groups;
    for one group this is Sen's own interval.
    """
    slopes: list[FloatArray] = []
    variance = 0.0
    for value in np.unique(group):
        mine = group == value
        dx = x[mine][None, :] - x[mine][:, None]
        dy = y[mine][None, :] - y[mine][:, None]
        use = dx > 0
        slopes.append(dy[use] / dx[use])
        n = int(mine.sum())
        variance += n * (n - 1) * (2 * n + 5) / 18.0
    ordered = np.sort(np.concatenate(slopes)) if slopes else np.empty(0)
    if ordered.size == 0:
        return None
    half = _NORMAL_975 * np.sqrt(variance)
    low = round((ordered.size - half) / 2.0) - 1
    high = round((ordered.size + half) / 2.0)
    return SlopeEstimate(
        float(np.median(ordered)),
        float(ordered[max(low, 0)]),
        float(ordered[min(high, ordered.size - 1)]),
    )


def ratio_drift(
    numbers: NDArray[np.intp],
    directions: list[str],
    ratios: FloatArray,
    u: FloatArray,
) -> Drift:
    """Slope and changes of the ratio with stroke number.

    Parameters
    ----------
    numbers : (n,) stroke numbers.
    directions : list of str
    ratios, u : (n,) ratios and their random standard uncertainties.

    Returns
    -------
    Drift
    """
    good = np.isfinite(ratios)
    group = np.asarray([1 if d == "down" else 0 for d in directions], dtype=np.intp)
    for value in (0, 1):
        mine = good & (group == value)
        if mine.any() and float(np.median(ratios[mine])) < _TAKES:
            good &= group != value
    numbers, ratios, u, group = numbers[good], ratios[good], u[good], group[good]
    if numbers.size < _LEAST:
        return Drift(None, None, (), int(numbers.size))
    estimate = theil_sen(numbers.astype(np.float64), ratios, group)
    if estimate is None:
        return Drift(None, None, (), int(numbers.size))
    # the interval is distribution-free; half its width over 1.96 serves as u, but never less than what the
    # strokes' own uncertainties leave (few strokes give too few pairs for an interval)
    centred = numbers - numbers.mean()
    own = float(np.sqrt(np.mean(u**2) / float(centred @ centred)))
    u_slope = max((estimate.high - estimate.low) / (2.0 * _NORMAL_975), own)
    changes = change_points(ratios, group, u)
    return Drift(
        Quantity(estimate.slope, u_slope, "1"),
        (estimate.low, estimate.high),
        tuple(int(numbers[k - 1]) for k in changes),
        int(numbers.size),
    )
