"""A straight line through points, by least squares, whatever the points are."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["straight_line"]

FloatArray = NDArray[np.float64]


def straight_line(x: FloatArray, y: FloatArray) -> tuple[float, float]:
    """Slope and value at x = 0 of the least-squares line through (n,) points, n >= 1.

    Points at one x tell no slope: it is 0 then, and the value their mean.
    """
    middle = float(x.mean())
    apart = x - middle
    size = float(apart @ apart)
    # what rounding leaves of equal numbers is no extent
    extent = x.size * (4.0 * float(np.finfo(np.float64).eps) * float(np.abs(x).max())) ** 2
    slope = float(apart @ y) / size if size > extent else 0.0
    return slope, float(y.mean()) - slope * middle
