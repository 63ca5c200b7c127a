"""Rounded knees: how much a smooth curve lies off the sharp one, by distance from the knee.

Each form is a smooth max(0, d) minus max(0, d): it dies away on both sides, so the branches on
either side, extended, still meet at the knee itself. Widths are scaled so that every form lies equally
far off the corner, which is how a person sees a rounded knee.
"""

from __future__ import annotations

import math

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
    corner = math.log(2.0) * width  # of the softplus, at the knee
    if form == "hyperbola":
        return np.asarray(0.5 * (np.sqrt(d * d + 4 * corner**2) - d))
    sigma = corner * math.sqrt(2 * math.pi)
    density = np.exp(-0.5 * (d / sigma) ** 2) / math.sqrt(2 * math.pi)
    return np.asarray(sigma * density - d * ndtr(-d / sigma))
