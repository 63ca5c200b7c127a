"""Several kinds that bend together: then it is the ledger that is wrong."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np

from isotherm.quantity import Quantity
from transfer.evidence_average import weighted_mean
from transfer.evidence_fit import LineFit
from transfer.evidence_line import KindLine

__all__ = ["bend_together"]

# Changes of slope are alike when they scatter no more than so many times their u.
_SAME_CHANGE: Final = 2.0


def bend_together(
    lines: Sequence[KindLine], crooked: Sequence[str], level: float
) -> tuple[str, ...]:
    """Kinds that bend after the same layers while most kinds do: the ledger then is what is wrong."""
    bent = [line for line in lines if line.reading.label in crooked and line.bends(level / 2.0)]
    able = [line for line in lines if line.bend is not None]
    if len(bent) < 2 or 2 * len(bent) <= len(able):
        return ()
    low = max(line.bend.index_range[0] for line in bent if line.bend is not None)
    high = min(line.bend.index_range[1] for line in bent if line.bend is not None)
    # a fault of the ledger changes every kind's slope by the same part
    parts = [_slope_change(line.bend.fit) for line in bent if line.bend is not None]
    mean = weighted_mean(parts).value
    chi_square = sum(((p.value - mean) / (p.u or math.inf)) ** 2 for p in parts)
    alike = chi_square <= _SAME_CHANGE**2 * (len(parts) - 1)
    return tuple(line.reading.label for line in bent) if low <= high and alike else ()


def _slope_change(fit: LineFit) -> Quantity:
    """Change of slope at the hinge over the slope before it."""
    first = fit.slope_index
    before, change = (float(v) for v in fit.parameters[first : first + 2])
    if before == 0.0:
        return Quantity(0.0, math.inf, "1")
    lever = np.array([-change / before**2, 1.0 / before])
    variance = float(lever @ fit.covariance[first : first + 2, first : first + 2] @ lever)
    return Quantity(change / before, math.sqrt(max(variance, 0.0)), "1")
