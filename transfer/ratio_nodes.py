"""Condense the log to its nodes: one per dwell or pause, with the sums every later fit needs."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from transfer.ratio_rows import DwellRows, centred, dwell_rows, instrument
from transfer.strokes_motion import Motion
from transfer.strokes_pressure import Pressure

__all__ = ["Nodes", "build_nodes"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

# Rows of a stroke, next to a turning point without a dwell, that a line to it goes through.
_END_ROWS = 12


@dataclass(frozen=True)
class Nodes:
    """Sums over the rows of each dwell or pause; arrays (k,), in time order.

    rest, hold : which rest and which hold each node belongs to. rows : rows used (0: extrapolated).
    target : set point of the hold, mN/m. time, log_area, off : means of time (s), ln(area/cm^2) and
    pressure minus set point (mN/m). first_time, last_time : s. weight : variance of the mean over the row
    variance. tt, tw, ty, ww, wy, yy : centred sums of squares and products of time, off and ln area; zt, zw,
    zy, zz the same with the lagged pressure as instrument. kept : the rows themselves.
    """

    rest: IntArray
    hold: IntArray
    rows: IntArray
    target: FloatArray
    time: FloatArray
    first_time: FloatArray
    last_time: FloatArray
    log_area: FloatArray
    off: FloatArray
    weight: FloatArray
    tt: FloatArray
    tw: FloatArray
    ty: FloatArray
    ww: FloatArray
    wy: FloatArray
    yy: FloatArray
    zt: FloatArray
    zw: FloatArray
    zy: FloatArray
    zz: FloatArray
    kept: DwellRows

    @property
    def size(self) -> int:
        """Number of nodes."""
        return int(self.rest.size)


def build_nodes(
    time: FloatArray,
    area: FloatArray,
    pressure: FloatArray,
    motion: Motion,
    held: Pressure,
    targets: tuple[float, ...],
    *,
    settling: float = 0.0,
) -> Nodes:
    """Condense rests within holds to nodes.

    Parameters
    ----------
    time, area, pressure : (n,) s, cm^2, mN/m.
    motion : Motion
    held : Pressure
    targets : tuple of float
        Set point of each hold, mN/m, that areas are corrected to.
    settling : float
        Seconds after each move to leave out of the dwell that follows.

    Returns
    -------
    Nodes
    """
    pairs = _pairs(motion, held)
    target = np.asarray([targets[hold] for _, hold in pairs], dtype=np.float64)
    rows = dwell_rows(time, area, pressure, motion, held, pairs, target, settling)
    nodes = _sums(rows, pairs, target)
    return _fill(nodes, pairs, time, area, pressure, motion, held)


def _pairs(motion: Motion, held: Pressure) -> list[tuple[int, int]]:
    """(rest, hold) for every rest that overlaps a hold, in time order."""
    out = []
    h = 0
    for k, rest in enumerate(motion.rests):
        while h < len(held.holds) and held.holds[h].last < rest.first:
            h += 1
        for j in range(h, len(held.holds)):
            if held.holds[j].first > rest.last:
                break
            out.append((k, j))
    return out


def _sums(rows: DwellRows, pairs: list[tuple[int, int]], target: FloatArray) -> Nodes:
    """Means and centred products per node."""
    size, node, count = rows.nodes, rows.node, rows.count
    mean_t, t = centred(node, count, rows.time)
    mean_y, y = centred(node, count, rows.log_area)
    mean_w, w = centred(node, count, rows.off)
    z, z_wander = instrument(rows)
    edges = np.searchsorted(node, np.arange(size + 1))
    some = edges[1:] > edges[:-1]
    first, last = mean_t.copy(), mean_t.copy()
    first[some] = rows.time[edges[:-1][some]]
    last[some] = rows.time[edges[1:][some] - 1]

    def total(values: FloatArray) -> FloatArray:
        return np.asarray(np.bincount(node, values, minlength=size), dtype=np.float64)

    return Nodes(
        rest=np.asarray([p[0] for p in pairs], dtype=np.intp),
        hold=np.asarray([p[1] for p in pairs], dtype=np.intp),
        rows=count.astype(np.intp),
        target=target,
        time=mean_t,
        first_time=first,
        last_time=last,
        log_area=mean_y,
        off=mean_w,
        weight=1.0 / np.maximum(count, 1.0),
        tt=total(t * t),
        tw=total(t * w),
        ty=total(t * y),
        ww=total(w * w),
        wy=total(w * y),
        yy=total(y * y),
        zt=total(z * t),
        zw=total(z * w) + z_wander,
        zy=total(z * y),
        zz=total(z * z),
        kept=rows,
    )


def _fill(
    nodes: Nodes,
    pairs: list[tuple[int, int]],
    time: FloatArray,
    area: FloatArray,
    pressure: FloatArray,
    motion: Motion,
    held: Pressure,
) -> Nodes:
    """Give turning points without a dwell their level, from lines through the strokes' nearest rows."""
    level, off, at, weight = (
        v.copy() for v in (nodes.log_area, nodes.off, nodes.time, nodes.weight)
    )
    for node in np.flatnonzero(nodes.rows == 0):
        rest, hold = pairs[int(node)]
        turn = float(time[min(max(motion.rests[rest].first, 0), time.size - 1)])
        at[node] = turn
        parts = []
        for index, before in ((rest - 1, True), (rest, False)):
            if not 0 <= index < len(motion.moves):
                continue
            move, within = motion.moves[index], held.holds[hold]
            rows = np.arange(max(move.first, within.first), min(move.last, within.last) + 1)
            rows = rows[-_END_ROWS:] if before else rows[:_END_ROWS]
            if rows.size < 3:
                continue
            t = time[rows] - turn
            own = t - t.mean()
            spread = float(own @ own)
            if not spread > 0:  # times too close to draw a line through
                continue
            pull = -t.mean() * own / spread + 1.0 / rows.size
            parts.append(
                (
                    float(pull @ np.log(area[rows])),
                    float(pull @ (pressure[rows] - nodes.target[node])),
                    float(pull @ pull),
                )
            )
        if not parts:
            weight[node] = np.inf
            continue
        share = np.asarray([1.0 / p[2] for p in parts])
        share /= share.sum()
        level[node] = float(share @ np.asarray([p[0] for p in parts]))
        off[node] = float(share @ np.asarray([p[1] for p in parts]))
        # rows of a stroke are single rows, those of dwells may be groups
        weight[node] = float(share**2 @ np.asarray([p[2] for p in parts])) * nodes.kept.group
    return replace(
        nodes,
        log_area=level,
        off=off,
        time=at,
        first_time=np.where(nodes.rows == 0, at, nodes.first_time),
        last_time=np.where(nodes.rows == 0, at, nodes.last_time),
        weight=weight,
    )
