"""Film removed against dipper reading inside each move, condensed to bins."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.ratio_film import MOST_CHANGE, FilmFit, film_area
from transfer.ratio_nodes import Nodes
from transfer.strokes_motion import Motion

__all__ = ["RemovalCurve", "removal_curve"]

FloatArray = NDArray[np.float64]

_BINS = 60


@dataclass(frozen=True)
class RemovalCurve:
    """Film gone since the dwell before, at the set point and with creep taken out.

    reading : (b,) mm. removed : (b,) cm^2. variance : (b,) cm^4, independent part. time : (b,) s.
    time_start, time_end : s. bin_width : mm, 0 for single rows.
    row_seconds : s between rows. total : cm^2 between the two dwells, u_total its u (cm^2).
    """

    move: int
    before: int
    after: int
    start: float
    end: float
    reading: FloatArray
    removed: FloatArray
    variance: FloatArray
    time: FloatArray
    total: float
    u_total: float
    time_start: float
    time_end: float
    bin_width: float
    row_seconds: float


def removal_curve(
    time: FloatArray,
    position: FloatArray,
    area: FloatArray,
    pressure: FloatArray,
    motion: Motion,
    nodes: Nodes,
    fit: FilmFit,
    move: int,
    before: int,
    after: int,
) -> RemovalCurve:
    """Follow the film through one move.

    Parameters
    ----------
    time, position, area, pressure : (n,) s, mm, cm^2, mN/m.
    motion : Motion
    nodes : Nodes
    fit : FilmFit
    move, before, after : int
        Indices of the move and of the nodes on both sides.

    Returns
    -------
    RemovalCurve
    """
    way = motion.moves[move]
    rows = slice(way.first, way.last + 1)
    t, x = time[rows], position[rows]
    row_seconds = (way.end - way.start) / max(t.size, 1)
    off = pressure[rows] - nodes.target[before]
    at_target = area[rows] * np.exp(np.clip(fit.compressibility * off, -MOST_CHANGE, MOST_CHANGE))
    removed = film_area(nodes, fit, before, t) - at_target
    start = motion.rests[nodes.rest[before]].level
    end = motion.rests[nodes.rest[after]].level
    middle = np.asarray([0.5 * (way.start + way.end)])
    scale = float(film_area(nodes, fit, before, middle)[0])
    row_variance = scale**2 * fit.row_variance * fit.inflation * nodes.kept.group
    width = 0.0
    if x.size > _BINS and end != start:
        width = abs(end - start) / _BINS
        edges = np.clip(((x - start) / (end - start) * _BINS).astype(np.intp), 0, _BINS - 1)
        count = np.bincount(edges, minlength=_BINS).astype(np.float64)
        used = count > 0
        mean = [np.bincount(edges, v, minlength=_BINS)[used] / count[used] for v in (x, removed, t)]
        x, removed, t = mean
        variance = row_variance / count[used]
    else:
        variance = np.full(x.size, row_variance)
    left = float(film_area(nodes, fit, after, middle)[0])
    total = scale - left
    u_total = scale * float(np.sqrt(fit.mean_variance[before] + fit.mean_variance[after]))
    return RemovalCurve(
        move=move,
        before=before,
        after=after,
        start=start,
        end=end,
        reading=x,
        removed=removed,
        variance=variance,
        time=t,
        total=total,
        u_total=u_total,
        time_start=way.start,
        time_end=way.end,
        bin_width=width,
        row_seconds=row_seconds,
    )
