"""Loss and rate of loss at any time, averaged over a fit's nodes and over the laws.

Within one law the mean and variance over the grid's nodes follow the law of total variance. Between laws
the average is weighted by exp(-Delta AICc/2) and its variance adds the laws' disagreement: Burnham &
Anderson, Model Selection and Multimodel Inference, Springer 2002, sec. 4.3.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_fit import LawFit
from isotherm.hold_models import growth, growth_rate

__all__ = [
    "Moments",
    "law_loss",
    "law_rate",
    "law_weights",
    "level_curve",
    "mean_loss",
    "mean_rate",
    "node_moments",
]

FloatArray = NDArray[np.float64]

_GONE = 1e-3  # part of the film below which an extrapolated law has used it up


@dataclass(frozen=True)
class Moments:
    """Mean and standard uncertainty of a derived value."""

    value: float
    u: float


def law_weights(fits: tuple[LawFit, ...]) -> FloatArray:
    """Share of support of each law, (k,), summing to 1."""
    score = np.array([fit.aicc for fit in fits])
    weight = np.exp(-0.5 * (score - score.min()))
    return np.asarray(weight / weight.sum())


def node_moments(
    fit: LawFit,
    value: FloatArray,
    by_level: FloatArray | float = 0.0,
    by_drop: FloatArray | float = 0.0,
) -> Moments:
    """Mean and u of a value known at every node.

    Parameters
    ----------
    fit : LawFit
        The law's nodes.
    value : (q,) array
        The value at each node.
    by_level, by_drop : (q,) array or float
        Its derivatives by y0 and b, for the variance within a node.

    Returns
    -------
    Moments
    """
    var = fit.covariance
    within = by_level**2 * var[:, 0] + 2.0 * by_level * by_drop * var[:, 1] + by_drop**2 * var[:, 2]
    mean = float(fit.weight @ value)
    return Moments(mean, float(np.sqrt(fit.weight @ ((value - mean) ** 2 + within))))


def law_loss(fit: LawFit, seconds: float) -> Moments:
    """Relative loss b g(t)/y0 of one law over `seconds` since the arrival."""
    g = growth(fit.name, np.array([seconds]), fit.time_constant, fit.exponent)[0]
    loss = fit.drop * g / fit.level
    # extrapolated further than there is film, all of it is lost
    return node_moments(fit, np.minimum(loss, 1.0), -loss / fit.level, g / fit.level)


def law_rate(fit: LawFit, seconds: float) -> Moments:
    """Relative rate of loss -d ln y/dt = b g'(t)/y of one law at `seconds`, 1/s."""
    at = np.array([seconds])
    g = growth(fit.name, at, fit.time_constant, fit.exponent)[0]
    slope = growth_rate(fit.name, at, fit.time_constant, fit.exponent)[0]
    left = fit.level - fit.drop * g
    there = left > _GONE * fit.level  # no film, no rate
    level = np.where(there, left, np.inf)
    rate = fit.drop * slope / level
    return node_moments(fit, rate, -rate / level, slope * fit.level / level**2)


def _between(
    fits: tuple[LawFit, ...], seconds: float, each: Callable[[LawFit, float], Moments]
) -> Moments:
    weight = law_weights(fits)
    parts = [each(fit, seconds) for fit in fits]
    value = np.array([part.value for part in parts])
    u = np.array([part.u for part in parts])
    mean = float(weight @ value)
    return Moments(mean, float(np.sqrt(weight @ (u**2 + (value - mean) ** 2))))


def mean_loss(fits: tuple[LawFit, ...], seconds: float) -> Moments:
    """Relative loss over `seconds` since the arrival, averaged over the laws."""
    return _between(fits, seconds, law_loss)


def mean_rate(fits: tuple[LawFit, ...], seconds: float) -> Moments:
    """Relative rate of loss at `seconds` since the arrival, 1/s, averaged over the laws."""
    return _between(fits, seconds, law_rate)


def level_curve(fit: LawFit, time: FloatArray) -> FloatArray:
    """Most likely level of one law at `time` ((m,) s since the arrival), (m,) unit of y."""
    best = slice(fit.best, fit.best + 1)
    shape = growth(fit.name, time, fit.time_constant[best], fit.exponent[best])
    return np.asarray(fit.level[fit.best] - fit.drop[fit.best] * shape[:, 0])
