"""Zero of pressure from the flat start of a branch: subtracted when it is one, else left and said so."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.condense import Nodes
from isotherm.quantity import Quantity

__all__ = ["Zero", "find_zero"]

FloatArray = NDArray[np.float64]

LARGEST_OFFSET: Final = (
    1.0  # mN/m; a larger reading on a clean surface is a probe that was not zeroed
)
# A probe on a clean surface may wander by this much over a run (common practice: drift of a wetted
# plate is a few tenths of a mN/m an hour); a steeper start is film already compressed.
LARGEST_TREND: Final = 0.35  # mN/m over the baseline
FEWEST_NODES: Final = 4
SIGMAS: Final = 3.0


@dataclass(frozen=True)
class Zero:
    """offset: what was subtracted (mN/m; u_systematic is the drift it may have gathered since)."""

    offset: Quantity
    warnings: tuple[str, ...]
    baseline_rows: float


def find_zero(nodes: Nodes, end: float | None, film_from: float | None = None) -> Zero:
    """Zero offset of a branch.

    Parameters
    ----------
    nodes : the branch, as recorded.
    end : x where the flat start ends (its knee less the rounding), None where there is none.
    film_from : x from which film resists, to extrapolate drift over; None: over the whole branch.
    """
    # nothing subtracted: the zero may be off, and drift, by what is usual (rectangular, GUM 4.3.7)
    none = Quantity.combine(
        0.0, "mN/m", u_random=None, u_systematic=LARGEST_TREND / float(np.sqrt(3.0))
    )
    if end is None:
        return Zero(
            none,
            (
                "pressure zero not checked: the branch has no flat start at large area; nothing was "
                "subtracted",
            ),
            0.0,
        )
    inside = nodes.x <= end
    if int(inside.sum()) < FEWEST_NODES:
        inside[: min(FEWEST_NODES, inside.size)] = True
        inside &= nodes.x <= nodes.x[0] + 2.0 * max(end - nodes.x[0], 0.0)
    if int(inside.sum()) < 3:
        return Zero(none, ("pressure zero not checked: too few points before lift-off",), 0.0)
    # time runs with the rows, whatever the barrier's speed
    row = nodes.first[inside] + 0.5 * nodes.count[inside]
    y, w = nodes.pressure[inside], 1.0 / nodes.sigma[inside] ** 2
    total = float(w.sum())
    centre = float((w * row).sum()) / total
    mean = float((w * y).sum()) / total
    spread = float((w * (row - centre) ** 2).sum())
    slope = float((w * (row - centre) * y).sum()) / spread if spread > 0 else 0.0
    residual = y - mean - slope * (row - centre)
    dof = max(y.size - 2, 1)
    scale = max(1.0, float((w * residual**2).sum()) / dof)
    u_slope = float(np.sqrt(scale / spread)) if spread > 0 else 0.0
    length = float(np.ptp(row)) + 1.0
    trend, u_trend = slope * length, u_slope * length
    last = float(row.max())
    trending = abs(trend) > SIGMAS * u_trend
    rest = float(nodes.first[-1] + nodes.count[-1]) - last
    offset = mean + (slope * (last - centre) if trending else 0.0)
    u_offset = float(np.sqrt(scale / total))
    if trending:
        u_offset = float(np.hypot(u_offset, u_slope * (last - centre)))
    # what the probe may drift after the baseline: the trend seen, or as much as could hide in it,
    # as a rectangular distribution (GUM 4.3.7)
    unseen = (
        (abs(slope) if trending else min(u_slope, LARGEST_TREND / length)) * rest / np.sqrt(3.0)
    )
    unseen = min(unseen, LARGEST_TREND)
    film = trending and _bends(row - centre, residual, w, scale)
    if film or abs(trend) > max(LARGEST_TREND, SIGMAS * u_trend):
        return Zero(
            none,
            (
                f"pressure zero not subtracted: the start is not flat (it changes by {trend:+.2f} mN/m "
                "before lift-off); film may have been compressed already, or the probe drifts",
            ),
            float(nodes.count[inside].sum()),
        )
    if abs(offset) > LARGEST_OFFSET:
        return Zero(
            none,
            (
                f"pressure zero not subtracted: the flat start reads {offset:+.2f} mN/m, more than "
                f"{LARGEST_OFFSET:g} mN/m from zero; the probe was not zeroed on a clean surface, or "
                "film was already there",
            ),
            float(nodes.count[inside].sum()),
        )
    return Zero(
        Quantity.combine(offset, "mN/m", u_random=u_offset, u_systematic=float(unseen)),
        (),
        float(nodes.count[inside].sum()),
    )


def _bends(t: FloatArray, residual: FloatArray, w: FloatArray, scale: float) -> bool:
    """Whether a trend steepens: a probe drifts in a straight line, a gas resists ever more.

    Parameters
    ----------
    t : (m,) rows from their weighted mean. residual : (m,) about the straight line, mN/m. w : weights.
    scale : the line's reduced χ².
    """
    if t.size < 6:
        return False
    bend = t**2
    basis = np.stack([np.ones_like(t), t], axis=1)
    projection = np.linalg.solve(basis.T @ (w[:, None] * basis), basis.T @ (w * bend))
    bend = bend - basis @ projection
    size = float((w * bend**2).sum())
    if size <= 0:
        return False
    curve = float((w * bend * residual).sum()) / size
    left = residual - curve * bend
    scale = max(1.0, min(scale, float((w * left**2).sum()) / max(t.size - 3, 1)))
    return curve > SIGMAS * float(np.sqrt(scale / size))
