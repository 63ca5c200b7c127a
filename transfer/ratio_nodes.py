"""Condense the log to its nodes: one per dwell or pause, with the sums every later fit needs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.strokes_motion import Motion
from transfer.strokes_pressure import Pressure

__all__ = ["Nodes", "build_nodes"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

# Rows this many robust standard deviations off their dwell's line are spikes (a bubble, a knock).
_SPIKE = 6.0
# Rows of a stroke, next to a turning point without a dwell, that a line to it goes through.
_END_ROWS = 12
# Lag of the instrument, s and rows: noise of the pressure reading is independent over it, wander is not.
_LAG_SECONDS = 1.0
# Rows on each side that the instrument averages; the strongest is used.
_LAG_WIDTHS = (1, 4, 16, 64)


@dataclass(frozen=True)
class Nodes:
    """Sums over the rows of each dwell or pause; arrays (k,), in time order.

    rest, hold : which rest and which hold each node belongs to. rows : rows used (0: extrapolated).
    target : set point of the hold, mN/m. time, log_area, off : means of time (s), ln(area/cm^2) and
    pressure minus set point (mN/m). weight : variance of the mean over the row variance.
    tt, tw, ty, ww, wy, yy : centred sums of squares and products of time, off and ln area; zt, zw, zy, zz the
    same with the lagged pressure as instrument. row_node : (n,) node of each row of the log, or -1.
    """

    rest: IntArray
    hold: IntArray
    rows: IntArray
    target: FloatArray
    time: FloatArray
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
    row_node: IntArray
    spikes: int

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
) -> Nodes:
    """Condense rests within holds to nodes.

    Parameters
    ----------
    time, area, pressure : (n,) s, cm^2, mN/m.
    motion : Motion
    held : Pressure
    targets : tuple of float
        Set point of each hold, mN/m, that areas are corrected to.

    Returns
    -------
    Nodes
    """
    pairs = _pairs(motion, held)
    row_node = np.full(time.size, -1, dtype=np.intp)
    for node, (rest, hold) in enumerate(pairs):
        if motion.rests[rest].still:
            first = max(motion.rests[rest].first, held.holds[hold].first)
            last = min(motion.rests[rest].last, held.holds[hold].last)
            row_node[first : last + 1] = node
    row_node[~held.steady] = -1
    log_area = np.log(area)
    target = np.asarray([targets[hold] for _, hold in pairs], dtype=np.float64)
    row_node, spikes = _drop_spikes(time, log_area, pressure, row_node, len(pairs))
    sums = _sums(time, log_area, pressure, row_node, target)
    for node, (rest, hold) in enumerate(pairs):
        if sums["rows"][node] == 0:
            _extrapolate(
                sums,
                node,
                rest,
                time,
                log_area,
                pressure - target[node],
                motion,
                held.holds[hold].first,
                held.holds[hold].last,
            )
    return Nodes(
        rest=np.asarray([p[0] for p in pairs], dtype=np.intp),
        hold=np.asarray([p[1] for p in pairs], dtype=np.intp),
        rows=sums.pop("rows").astype(np.intp),
        target=target,
        row_node=row_node,
        spikes=spikes,
        **sums,
    )


def _pairs(motion: Motion, held: Pressure) -> list[tuple[int, int]]:
    """(rest, hold) for every rest that overlaps a hold, in time order."""
    out = []
    for k, rest in enumerate(motion.rests):
        for h, hold in enumerate(held.holds):
            if rest.first <= hold.last and rest.last >= hold.first:
                out.append((k, h))
    return out


def _centred(
    node: IntArray, count: FloatArray, values: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Mean per node, and each row's deviation from its node's mean."""
    mean = np.bincount(node, values, minlength=count.size) / np.maximum(count, 1.0)
    return mean, values - mean[node]


def _drop_spikes(
    time: FloatArray, log_area: FloatArray, pressure: FloatArray, row_node: IntArray, size: int
) -> tuple[IntArray, int]:
    """Take rows far off their own dwell's line out of it."""
    rows = np.flatnonzero(row_node >= 0)
    node = row_node[rows]
    count = np.bincount(node, minlength=size).astype(np.float64)
    _, t = _centred(node, count, time[rows])
    _, y = _centred(node, count, log_area[rows])
    _, w = _centred(node, count, pressure[rows])
    tt = np.maximum(np.bincount(node, t * t, minlength=size), 1e-30)
    y = y - (np.bincount(node, t * y, minlength=size) / tt)[node] * t
    w = w - (np.bincount(node, t * w, minlength=size) / tt)[node] * t
    if rows.size < 20:
        return row_node, 0
    ww = float(w @ w)
    y = y - (float(w @ y) / ww if ww > 0 else 0.0) * w
    out = np.zeros(rows.size, dtype=bool)
    for values in (y, w):
        middle = float(np.median(values))
        spread = 1.4826 * float(np.median(np.abs(values - middle)))
        if spread > 0:
            out |= np.abs(values - middle) > _SPIKE * spread
    # a stretch of odd rows is no spike but something the fit must be told of in its uncertainty
    if out.mean() > 0.02:
        return row_node, 0
    cleaned = row_node.copy()
    cleaned[rows[out]] = -1
    return cleaned, int(out.sum())


def _sums(
    time: FloatArray,
    log_area: FloatArray,
    pressure: FloatArray,
    row_node: IntArray,
    target: FloatArray,
) -> dict[str, FloatArray]:
    """Means and centred products per node."""
    size = target.size
    rows = np.flatnonzero(row_node >= 0)
    node = row_node[rows]
    count = np.bincount(node, minlength=size).astype(np.float64)
    off = pressure[rows] - target[node]

    mean_t, t = _centred(node, count, time[rows])
    mean_y, y = _centred(node, count, log_area[rows])
    mean_w, w = _centred(node, count, off)
    z, z_wander = _instrument(time, rows, node, count, off)

    def total(values: FloatArray) -> FloatArray:
        return np.asarray(np.bincount(node, values, minlength=size), dtype=np.float64)

    return {
        "rows": count,
        "time": mean_t,
        "log_area": mean_y,
        "off": mean_w,
        "weight": 1.0 / np.maximum(count, 1.0),
        "tt": total(t * t),
        "tw": total(t * w),
        "ty": total(t * y),
        "ww": total(w * w),
        "wy": total(w * y),
        "yy": total(y * y),
        "zt": total(z * t),
        "zw": total(z * w) + z_wander,
        "zy": total(z * y),
        "zz": total(z * z),
    }


def _instrument(
    time: FloatArray, rows: IntArray, node: IntArray, count: FloatArray, off: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Pressure a moment earlier and later, centred per node, and what centring took from its product.

    The mean of the m rows on either side, the row itself and its nearest neighbours left out. m is the one
    that follows the wander best.
    """
    interval = float(np.median(np.diff(time)))
    lag = max(1, round(_LAG_SECONDS / interval))
    size = count.size
    starts = np.concatenate([[0], np.cumsum(count)[:-1]]).astype(np.intp)
    place = np.arange(rows.size) - starts[node]
    room = count[node].astype(np.intp)
    summed = np.concatenate([[0.0], np.cumsum(off)])
    _, w = _centred(node, count, off)

    def window(low: IntArray, high: IntArray) -> tuple[FloatArray, IntArray]:
        low, high = np.clip(low, 0, room), np.clip(high, 0, room)
        number = np.maximum(high - low, 0)
        base = starts[node]
        return summed[base + np.maximum(high, low)] - summed[base + low], number

    best, best_strength = (np.zeros(rows.size), np.zeros(size)), -np.inf
    for width in _LAG_WIDTHS:
        before, n_before = window(place - lag - width + 1, place - lag + 1)
        after, n_after = window(place + lag, place + lag + width)
        number = n_before + n_after
        lagged = number > 0
        mean = np.where(lagged, (before + after) / np.maximum(number, 1), 0.0)
        partners = np.bincount(node[lagged], minlength=size).astype(np.float64)
        z = np.zeros(rows.size)
        _, z[lagged] = _centred(node[lagged], partners, mean[lagged])
        # independent noise: Var(w - z) = s^2 (1 + 1/m); centring leaves -s^2 in each node's product
        difference = (w - z)[lagged]
        noise = float(difference @ difference) / max(1.0, float((1.0 + 1.0 / number[lagged]).sum()))
        lost = np.where(partners > 1, noise, 0.0)
        product = float(z @ w) + float(lost.sum())
        power = float(z @ z)
        strength = product * abs(product) / power if power > 0 else -np.inf
        if strength > best_strength:
            best, best_strength = (z, lost), strength
        if width > 0.3 * float(np.median(count[count > 0])):
            break
    return best


def _extrapolate(
    sums: dict[str, FloatArray],
    node: int,
    rest: int,
    time: FloatArray,
    log_area: FloatArray,
    off: FloatArray,
    motion: Motion,
    first: int,
    last: int,
) -> None:
    """Give a turning point without a dwell its level, from lines through the strokes' nearest rows."""
    turning = motion.rests[rest]
    at = time[min(max(turning.first, 0), time.size - 1)]
    parts = []
    for move_index, before in ((rest - 1, True), (rest, False)):
        if not 0 <= move_index < len(motion.moves):
            continue
        move = motion.moves[move_index]
        rows = np.arange(max(move.first, first), min(move.last, last) + 1)
        rows = rows[-_END_ROWS:] if before else rows[:_END_ROWS]
        if rows.size < 3:
            continue
        t = time[rows] - at
        centred = t - t.mean()
        pull = -t.mean() * centred / float(centred @ centred) + 1.0 / rows.size
        parts.append((float(pull @ log_area[rows]), float(pull @ off[rows]), float(pull @ pull)))
    sums["time"][node] = at
    if not parts:
        sums["weight"][node] = np.inf
        return
    share = np.asarray([1.0 / p[2] for p in parts])
    share /= share.sum()
    sums["log_area"][node] = float(share @ np.asarray([p[0] for p in parts]))
    sums["off"][node] = float(share @ np.asarray([p[1] for p in parts]))
    sums["weight"][node] = float(share**2 @ np.asarray([p[2] for p in parts]))
