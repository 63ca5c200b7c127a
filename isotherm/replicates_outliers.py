"""Which of a few repeated values lie outside what the others allow."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = ["OutlyingValue", "outlying_values"]

FloatArray = NDArray[np.float64]

# More than one outlier is looked for only where enough values remain to judge it: one for each five.
_VALUES_PER_OUTLIER: Final = 5
# Rosner's approximation names too many below about 25 values; with this part of alpha for the later
# steps, false alarms on normal samples of 3 to 40 measured at most 1.15 times the stated level.
_LATER_PART_OF_ALPHA: Final = 0.25
_FEWEST: Final = 3


@dataclass(frozen=True)
class OutlyingValue:
    """One outlying value: its place, its studentised deviate, and the critical value it exceeds."""

    index: int
    deviate: float
    critical: float


def outlying_values(values: FloatArray, alpha: float) -> tuple[OutlyingValue, ...]:
    """Grubbs' test, carried on by Rosner's generalised form where there are ten values or more.

    Parameters
    ----------
    values : (n,) finite values, taken as normal where nothing is wrong
    alpha : float
        Probability of naming any value when nothing is wrong (two-sided).

    Returns
    -------
    tuple of OutlyingValue
        Most deviating first; empty for fewer than three values or none outlying.

    Notes
    -----
    Grubbs, Technometrics 1969, 11, 1; Rosner, Technometrics 1983, 25, 165, equation 2.5. With three
    or four values the largest possible deviate, (n - 1)/√n, hardly exceeds the critical one: the
    test then names almost nothing, which is the truth about so few values. Departure: steps after the
    first use a quarter of `alpha`, which keeps the stated level for small n.
    """
    from scipy.special import stdtrit

    n = len(values)
    if n < _FEWEST:
        return ()
    most = max(1, n // _VALUES_PER_OUTLIER)
    left = np.arange(n)
    found: list[OutlyingValue] = []
    passed = 0
    for step in range(most):
        sample = values[left]
        s = float(np.std(sample, ddof=1))
        # differences within rounding of equal values are no evidence
        if not s > 1e-12 * max(float(np.abs(sample).max()), 1e-300):
            break
        distances = np.abs(sample - sample.mean()) / s
        worst = int(np.argmax(distances))
        size = n - step
        level = alpha if step == 0 else alpha * _LATER_PART_OF_ALPHA
        t = float(stdtrit(size - 2, 1.0 - level / (2.0 * size)))
        critical = (size - 1) * t / math.sqrt(size * (size - 2 + t * t))
        found.append(OutlyingValue(int(left[worst]), float(distances[worst]), critical))
        if distances[worst] > critical:
            passed = step + 1
        left = np.delete(left, worst)
        if len(left) < _FEWEST:
            break
    return tuple(found[:passed])
