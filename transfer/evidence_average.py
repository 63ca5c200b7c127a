"""Weighted mean of repeated values, honest when they scatter more than their u allows."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from isotherm.quantity import Quantity

__all__ = ["weighted_mean"]


def weighted_mean(values: Sequence[Quantity]) -> Quantity:
    """Mean of `values` (one unit) weighted by 1/u²; u enlarged by the Birge ratio when that exceeds 1.

    Without any u: the plain mean and its standard error (None for a single value).

    Source: Birge, Phys. Rev. 1932, 40, 207.
    """
    numbers = np.array([v.value for v in values])
    unit = values[0].unit
    n = len(numbers)
    given = np.array([v.u if v.u is not None and v.u > 0 else math.nan for v in values])
    if not np.all(np.isfinite(given)):
        mean = float(numbers.mean())
        return Quantity(mean, float(numbers.std(ddof=1)) / math.sqrt(n) if n > 1 else None, unit)
    weight = 1.0 / given**2
    mean = float(np.sum(weight * numbers) / np.sum(weight))
    u = 1.0 / math.sqrt(float(np.sum(weight)))
    if n > 1:
        birge = math.sqrt(float(np.sum(weight * (numbers - mean) ** 2)) / (n - 1))
        u *= max(1.0, birge)
    return Quantity(mean, u, unit)
