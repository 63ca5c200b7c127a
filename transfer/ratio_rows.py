"""The rows of the dwells, condensed: what the fits of creep and compressibility work on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.strokes_motion import Motion
from transfer.strokes_pressure import Pressure

__all__ = ["DwellRows", "centred", "dwell_rows", "instrument"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

# Rows this many robust standard deviations off their dwell's line are spikes (a bubble, a knock).
_SPIKE = 6.0
_MOST_SPIKES = 0.02
# More rows than this in all dwells are averaged in groups first: the fits lose nothing by it.
_MOST_ROWS = 60_000
# Lag of the instrument, s and rows: noise of the pressure reading is independent over it, wander is not.
_LAG_SECONDS = 1.0
# Rows on each side that the instrument averages; the strongest is used.
_LAG_WIDTHS = (1, 4, 16, 64)


@dataclass(frozen=True)
class DwellRows:
    """Rows (or averaged groups of `group` rows) of all dwells, in time order; arrays (r,).

    node : node of each. time s, log_area ln(cm^2), off mN/m from the node's set point. place : how many
    rows of the same dwell come before. nodes : number of nodes. spikes : rows left out.
    """

    node: IntArray
    time: FloatArray
    log_area: FloatArray
    off: FloatArray
    place: IntArray
    group: int
    nodes: int
    spikes: int

    @property
    def count(self) -> FloatArray:
        """Rows of each node, (k,)."""
        return np.bincount(self.node, minlength=self.nodes).astype(np.float64)


def dwell_rows(
    time: FloatArray,
    area: FloatArray,
    pressure: FloatArray,
    motion: Motion,
    held: Pressure,
    pairs: list[tuple[int, int]],
    target: FloatArray,
    settling: float,
) -> DwellRows:
    """Take the rows of every dwell out of the log.

    Parameters
    ----------
    time, area, pressure : (n,) s, cm^2, mN/m.
    motion : Motion
    held : Pressure
    pairs : list of (rest, hold)
        One for each node.
    target : (k,) set point of each node, mN/m.
    settling : float
        Seconds after a move that are left out, where a dwell is long enough.

    Returns
    -------
    DwellRows
    """
    node_of = np.full(time.size, -1, dtype=np.intp)
    for k, (rest, hold) in enumerate(pairs):
        stay = motion.rests[rest]
        if not stay.still:
            continue
        first = max(stay.first, held.holds[hold].first)
        last = min(stay.last, held.holds[hold].last)
        if settling > 0 and rest > 0 and first == stay.first and last > first:
            wait = min(settling, 0.25 * float(time[last] - time[first]))
            first = int(np.searchsorted(time, time[first] + wait))
        node_of[first : last + 1] = k
    rows = np.flatnonzero((node_of >= 0) & held.steady)
    node = node_of[rows]
    t, y = time[rows], np.log(area[rows])
    off = pressure[rows] - target[node]
    good = _not_spikes(node, len(pairs), t, y, off)
    spikes = int(good.size - good.sum())
    node, t, y, off = node[good], t[good], y[good], off[good]
    group = max(1, -(-node.size // _MOST_ROWS))
    place = _place(node, len(pairs))
    if group > 1:
        # the odd rows at the end of a dwell are dropped: fewer than one group of them
        number = np.bincount(node, minlength=len(pairs))
        whole = place < (number[node] // group) * group
        node, t, y, off = node[whole], t[whole], y[whole], off[whole]
        shape = (-1, group)
        node = node.reshape(shape)[:, 0]
        t, y, off = (v.reshape(shape).mean(axis=1) for v in (t, y, off))
        place = _place(node, len(pairs))
    return DwellRows(node, t, y, off, place, group, len(pairs), spikes)


def centred(node: IntArray, count: FloatArray, values: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Mean per node (k,), and each row's deviation from its node's mean (r,)."""
    mean = np.bincount(node, values, minlength=count.size) / np.maximum(count, 1.0)
    return mean, values - mean[node]


def _place(node: IntArray, nodes: int) -> IntArray:
    """How many rows of the same node come before each row (nodes are in time order)."""
    number = np.bincount(node, minlength=nodes)
    starts = np.concatenate([[0], np.cumsum(number)[:-1]])
    return np.asarray(np.arange(node.size) - starts[node], dtype=np.intp)


def _not_spikes(
    node: IntArray, nodes: int, time: FloatArray, log_area: FloatArray, off: FloatArray
) -> NDArray[np.bool_]:
    """Rows that lie near their own dwell's line."""
    keep = np.ones(node.size, dtype=bool)
    if node.size < 20:
        return keep
    count = np.bincount(node, minlength=nodes).astype(np.float64)
    _, t = centred(node, count, time)
    tt = np.maximum(np.bincount(node, t * t, minlength=nodes), 1e-30)

    def without_line(values: FloatArray) -> FloatArray:
        _, v = centred(node, count, values)
        return np.asarray(v - (np.bincount(node, t * v, minlength=nodes) / tt)[node] * t)

    w = without_line(off)
    y = without_line(log_area)
    ww = float(w @ w)
    y = y - (float(w @ y) / ww if ww > 0 else 0.0) * w
    for values in (y, w):
        middle = float(np.median(values))
        spread = 1.4826 * float(np.median(np.abs(values - middle)))
        if spread > 0:
            keep &= np.abs(values - middle) <= _SPIKE * spread
    # a stretch of odd rows is no spike but something the fit must show in its uncertainty
    if 1.0 - keep.mean() > _MOST_SPIKES:
        return np.ones(node.size, dtype=bool)
    return keep


def instrument(rows: DwellRows) -> tuple[FloatArray, FloatArray]:
    """Pressure a moment earlier and later, centred per node, and what centring took from its product.

    The mean of the m rows on either side, the row itself and its nearest neighbours left out. m is the one
    that follows the wander best.

    Parameters
    ----------
    rows : DwellRows

    Returns
    -------
    tuple of arrays
        (r,) instrument, mN/m; (k,) correction of its product with the pressure, (mN/m)^2.
    """
    node, off, place, size = rows.node, rows.off, rows.place, rows.nodes
    count = rows.count
    if node.size < 3:
        return np.zeros(node.size), np.zeros(size)
    interval = float(np.median(np.diff(rows.time)))
    lag = max(1, round(_LAG_SECONDS / max(interval, 1e-9)))
    room = count.astype(np.intp)[node]
    base = np.arange(node.size) - place
    summed = np.concatenate([[0.0], np.cumsum(off)])
    _, w = centred(node, count, off)

    best, best_strength = (np.zeros(node.size), np.zeros(size)), -np.inf
    for width in _LAG_WIDTHS:
        total, number = np.zeros(node.size), np.zeros(node.size)
        for low, high in (
            (place - lag - width + 1, place - lag + 1),
            (place + lag, place + lag + width),
        ):
            a, b = np.clip(low, 0, room), np.clip(high, 0, room)
            b = np.maximum(a, b)
            total += summed[base + b] - summed[base + a]
            number += b - a
        lagged = number > 0
        mean = np.where(lagged, total / np.maximum(number, 1.0), 0.0)
        partners = np.bincount(node[lagged], minlength=size).astype(np.float64)
        z = np.zeros(node.size)
        _, z[lagged] = centred(node[lagged], partners, mean[lagged])
        # independent noise: Var(w - z) = s^2 (1 + 1/m); centring leaves -s^2 in each node's product
        gap = (w - z)[lagged]
        noise = float(gap @ gap) / max(1.0, float((1.0 + 1.0 / number[lagged]).sum()))
        lost = np.where(partners > 1, noise, 0.0)
        product = float(z @ w) + float(lost.sum())
        power = float(z @ z)
        strength = product * abs(product) / power if power > 0 else -np.inf
        if strength > best_strength:
            best, best_strength = (z, lost), strength
        if width > 0.3 * float(np.median(count[count > 0])):
            break
    return best
