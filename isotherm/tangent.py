"""The limiting area: the tangent to the stiffest stretch, extended to zero pressure."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branch_view import BranchView
from isotherm.quantity import Quantity
from isotherm.result import Tangent

__all__ = ["limiting_area"]

FloatArray = NDArray[np.float64]

ROUNDED: Final = 2.0  # widths next to a knee that belong to neither neighbour


def _stiffest(view: BranchView) -> int | None:
    """Index of the stiffest rising stretch that is not baseline, plateau or collapsed film."""
    reading = view.reading
    plateau = set()
    for onset, end in reading.coexistences:
        plateau |= set(range(onset + 1, (len(reading.stretches) if end is None else end + 1)))
    first = 1 if reading.baseline and len(reading.stretches) > 1 else 0
    best = None
    for j in range(first, reading.last + 1):
        stretch = reading.stretches[j]
        if j in plateau or stretch.modulus <= 0:
            continue
        if best is None or stretch.modulus > reading.stretches[best].modulus:
            best = j
    return best


def limiting_area(view: BranchView) -> tuple[Quantity, Tangent] | None:
    """Regression of Π on A over the whole stiffest stretch, extended to Π = 0.

    The roundings at the stretch's ends are left out. The regression's covariance is scaled to its
    residuals, so that a curved stretch shows in u.
    """
    j = _stiffest(view)
    if j is None:
        return None
    model, nodes = view.model, view.nodes
    stretch = view.reading.stretches[j]
    low, high = stretch.start, stretch.stop
    margin_low = ROUNDED * float(model.widths[j - 1]) if j > 0 else 0.0
    margin_high = ROUNDED * float(model.widths[j]) if j < model.knots.size else 0.0
    room = 0.3 * (high - low)
    inside = (nodes.x >= low + min(margin_low, room)) & (nodes.x <= high - min(margin_high, room))
    if int(inside.sum()) < 3:
        inside = (nodes.x >= low) & (nodes.x <= high)
    if int(inside.sum()) < 3:
        return None
    line = _line(view, inside)
    if line.slope >= 0:
        return None
    value = -line.intercept / line.slope
    # a stretch that is not quite straight has no single tangent: how far the line moves when a fifth
    # is left off at either end is taken as the half-width of a rectangular distribution (GUM 4.3.7)
    doubt = 0.0
    part = 0.2 * (high - low)
    for a, b in ((low + part, high), (low, high - part)):
        fewer = inside & (nodes.x >= a) & (nodes.x <= b)
        if int(fewer.sum()) >= 3:
            other = _line(view, fewer)
            if other.slope < 0:
                doubt = max(doubt, abs(-other.intercept / other.slope - value) / math.sqrt(3.0))
    zero = (view.zero.u_random or 0.0) / abs(line.slope)
    systematic = math.hypot(view.zero.u_systematic or 0.0, view.pressure_u or 0.0) / abs(line.slope)
    quantity = Quantity.combine(
        value,
        "nm^2",
        u_random=math.hypot(line.u_root, zero, doubt),
        u_systematic=math.hypot(value * (view.relative_u or 0.0), systematic),
    )
    area = nodes.area[inside]
    return quantity, Tangent(line.slope, line.intercept, (float(area.max()), float(area.min())))


@dataclass(frozen=True)
class _Line:
    """Π = slope A + intercept, mN/m per nm^2 and mN/m; u_root: of the area where it meets zero, nm^2."""

    slope: float
    intercept: float
    u_root: float


def _line(view: BranchView, inside: NDArray[np.bool_]) -> _Line:
    """Weighted regression of Π (zero subtracted) on A over the nodes `inside`."""
    nodes = view.nodes
    area, y = nodes.area[inside], nodes.pressure[inside] - view.offset
    w = 1.0 / nodes.sigma[inside] ** 2
    total = float(w.sum())
    centre = float((w * area).sum()) / total
    mean = float((w * y).sum()) / total
    spread = max(float((w * (area - centre) ** 2).sum()), 1e-300)
    slope = float((w * (area - centre) * y).sum()) / spread
    residual = y - mean - slope * (area - centre)
    scale = max(1.0, float((w * residual**2).sum()) / max(y.size - 2, 1))
    steep = slope if slope else -1e-12
    variance = scale * ((1.0 / total) / steep**2 + (mean / steep**2) ** 2 / spread)
    return _Line(slope, mean - slope * centre, math.sqrt(variance))
