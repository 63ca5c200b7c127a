"""Rounded knees: how much a smooth curve lies off the sharp one, by distance from the knee.

Each form is a smooth max(0, d) minus max(0, d): it dies away on both sides, so the branches on
either side, extended, still meet at the knee itself.
"""

from __future__ import annotations

import numpy as np
from isotherm_truth import FloatArray
from scipy.special import ndtr

__all__ = ["FORMS", "excess"]

FORMS = ("softplus", "hyperbola", "gaussian")


def excess(form: str, distance: FloatArray, width: float) -> FloatArray:
    """Return smooth max(0, d) - max(0, d), in the unit of `distance` (n,); `width` > 0 likewise."""
    d = np.abs(distance)
    if form == "softplus":
        return np.asarray(width * np.log1p(np.exp(-d / width)))
    if form == "hyperbola":
        return np.asarray(0.5 * (np.sqrt(d * d + 4 * width * width) - d))
    density = np.exp(-0.5 * (d / width) ** 2) / np.sqrt(2 * np.pi)
    return np.asarray(width * density - d * ndtr(-d / width))
