"""A branch of any length becomes a few hundred nodes, evenly spaced along the curve."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import MAD_TO_SIGMA, quantum, uneven

__all__ = ["DENSE", "Nodes", "condense", "despike", "row_noise"]

FloatArray = NDArray[np.float64]

SKELETON: Final = 320  # blocks that measure the curve's length
NODES: Final = 256  # nodes the search works on
DIGITS: Final = 1e-6  # smallest scatter of a row, as a share of the pressure range
SPIKE_SIGMAS: Final = 6.0  # a row this far from the median of its neighbours is a spike
# So few points do not tell scatter from shape; a point read off a figure is good to about this share of
# the axis (common practice: the thickness of a drawn line).
FEW: Final = 30  # rows
READING_ERROR: Final = 0.006  # 1
DENSE: Final = 100  # rows from which spikes can be told from shape


@dataclass(frozen=True)
class Nodes:
    """Means of consecutive rows, largest area first. All (m,).

    x : -ln(A / nm^2), so that dΠ/dx is the compression modulus. area nm^2, pressure mN/m (as recorded).
    count : rows in each node. sigma : standard uncertainty of the mean pressure, mN/m.
    noise : scatter of one row, mN/m. first : (m,) index of each node's first row among the branch's rows.
    stop : x of the smallest area of the branch.
    """

    x: FloatArray
    area: FloatArray
    pressure: FloatArray
    count: FloatArray
    sigma: FloatArray
    noise: float
    first: NDArray[np.int64]
    stop: float


def row_noise(area: FloatArray, pressure: FloatArray) -> float:
    """Scatter of one pressure reading about the curve, mN/m, from (n,) area nm^2 and pressure mN/m.

    Each point is compared with the straight line through its two neighbours in travel; the MAD makes
    knees and spikes harmless. Never below the rounding error of a quantised reading.
    """
    if pressure.size < 5:
        return 0.0
    if pressure.size > DENSE:
        # in a dense run the area's own jitter would mislead: rows are taken as evenly spaced
        residual = pressure[1:-1] - 0.5 * (pressure[:-2] + pressure[2:])
        scaled = [residual / np.sqrt(1.5)]
        if uneven(area):
            gap = area[2:] - area[:-2]
            share = (area[1:-1] - area[:-2]) / np.where(gap == 0.0, np.inf, gap)
            share = np.clip(share, -1.0, 2.0)
            residual = pressure[1:-1] - (1.0 - share) * pressure[:-2] - share * pressure[2:]
            scaled.append(residual / np.sqrt(1.0 + share**2 + (1.0 - share) ** 2))
    else:
        scaled = [_left_out(area, pressure, reach) for reach in (1, 2)]
    # the higher order follows a curved branch, the lower one a bent one: the better of the two
    sigma = min(MAD_TO_SIGMA * float(np.median(np.abs(r))) for r in scaled)
    if pressure.size < FEW:
        sigma = min(sigma, READING_ERROR * float(np.ptp(pressure)))
    return float(max(sigma, quantum(pressure) / np.sqrt(12.0)))


def _left_out(area: FloatArray, pressure: FloatArray, reach: int) -> FloatArray:
    """Each point less the polynomial through `reach` neighbours on both sides, in units of σ."""
    order = np.argsort(area, kind="stable")
    a, p = area[order], pressure[order]
    n = a.size
    middle = np.arange(reach, n - reach)
    offsets = [k for k in range(-reach, reach + 1) if k != 0]
    residual = p[middle].copy()
    size = np.ones(middle.size)
    for k in offsets:
        share = np.ones(middle.size)
        for other in offsets:
            if other != k:
                gap = a[middle + k] - a[middle + other]
                share *= (a[middle] - a[middle + other]) / np.where(gap == 0, np.inf, gap)
        share = np.clip(share, -3.0, 3.0)
        residual -= share * p[middle + k]
        size += share**2
    return np.asarray(residual / np.sqrt(size))


def despike(area: FloatArray, pressure: FloatArray, noise: float) -> NDArray[np.bool_]:
    """Mark isolated outliers of (n,) pressure, mN/m: True where a row is a spike.

    A spike stands out, to the same side, from the lines through the rows before and after it, each
    extended to it; a knee or a peak lies on at least one of them. Sparse runs are never despiked.

    Parameters
    ----------
    area, pressure : (n,) nm^2 and mN/m, in the order of travel.
    noise : scatter of one row, mN/m.
    """
    n = pressure.size
    spikes = np.zeros(n, dtype=np.bool_)
    if n < DENSE:
        return spikes
    suspects = _suspects(pressure, noise)
    if suspects.size == 0:
        return spikes
    along = area if uneven(area) else np.arange(n, dtype=np.float64)
    misses = []
    for side in (-1, 1):
        # five rows, three to seven away, so that a spike of up to three rows is in neither line
        index = np.clip(suspects[:, None] + side * np.arange(3, 8), 0, n - 1)
        misses.append(_miss(along, pressure, suspects, index))
    left, right = misses
    # within seven rows of an end only the line from inside can be asked
    left = np.where(suspects < 7, right, left)
    right = np.where(suspects >= n - 7, left, right)
    off = np.minimum(np.abs(left), np.abs(right)) > SPIKE_SIGMAS * noise
    spikes[suspects] = off & (left * right > 0)
    # rows that leave the line and never come back are a bend just before the run stops
    for rows in (spikes, spikes[::-1]):
        run = int(np.argmin(rows))
        if run > 1:
            rows[:run] = False
    return spikes


def _miss(
    along: FloatArray, pressure: FloatArray, rows: NDArray[np.int64], index: NDArray[np.int64]
) -> FloatArray:
    """How far each of (k,) rows lies off the line through its (k, 5) others, in u of that per σ of a row."""
    x, p = along[index], pressure[index]
    middle = x.mean(axis=1)
    spread = x - middle[:, None]
    size = np.maximum(np.sum(spread**2, axis=1), 1e-300)
    reach = along[rows] - middle
    slope = np.sum(spread * p, axis=1) / size
    u = np.sqrt(1.0 + 1.0 / index.shape[1] + reach**2 / size)
    return np.asarray((pressure[rows] - p.mean(axis=1) - slope * reach) / u)


def _suspects(pressure: FloatArray, noise: float) -> NDArray[np.int64]:
    """Rows whose step to either neighbour is unusually large; cheap, linear, over-complete."""
    step = np.abs(np.diff(pressure))
    usual = float(np.median(step))
    large = step > 4.0 * noise + 2.0 * usual
    mark = np.zeros(pressure.size, dtype=np.bool_)
    mark[:-1] |= large
    mark[1:] |= large
    # the middle of a spike three rows long may have small steps to both sides
    mark[1:-1] |= mark[:-2] & mark[2:]
    return np.flatnonzero(mark)


def condense(area: FloatArray, pressure: FloatArray, noise: float, nodes: int = NODES) -> Nodes:
    """Average consecutive rows into at most `nodes` nodes, evenly spaced along the curve's length.

    Parameters
    ----------
    area, pressure : (n,) nm^2 and mN/m, in the order of compression.
    noise : scatter of one row, mN/m.

    Notes
    -----
    The length is measured in the plane of x and Π, each divided by its range, on `SKELETON` equal
    blocks, so that steep and flat stretches both get nodes; its noise part is taken out. A mean of a
    straight stretch lies on it, so condensing loses no information there.
    """
    n = area.size
    starts = np.arange(n) if n <= nodes else _even_length_starts(area, pressure, noise, nodes)
    counts = np.diff(np.append(starts, n)).astype(np.float64)
    mean_area = np.add.reduceat(area, starts) / counts
    mean_pressure = np.add.reduceat(pressure, starts) / counts
    order = np.argsort(-mean_area, kind="stable")
    mean_area, mean_pressure, counts, starts = (
        mean_area[order],
        mean_pressure[order],
        counts[order],
        starts[order],
    )
    step = quantum(pressure)
    crossed = 1.0 + np.abs(np.gradient(mean_pressure)) / step if step > 0 else 1.0
    rounding = step / np.sqrt(12.0) / np.sqrt(crossed) if step > 2.0 * noise else 0.0
    # even a reading without scatter is not known to more than its digits
    least = DIGITS * max(float(np.ptp(pressure)), 1e-9)
    sigma = np.sqrt(max(noise, least) ** 2 / counts + np.square(rounding))
    return Nodes(
        -np.log(mean_area),
        mean_area,
        mean_pressure,
        counts,
        sigma,
        noise,
        starts,
        -float(np.log(area.min())),
    )


def _even_length_starts(
    area: FloatArray, pressure: FloatArray, noise: float, nodes: int
) -> NDArray[np.int64]:
    n = area.size
    edges = np.unique(np.linspace(0, n, min(n, SKELETON) + 1).astype(np.int64))
    counts = np.diff(edges)
    block_x = -np.log(np.maximum(np.add.reduceat(area, edges[:-1]) / counts, 1e-300))
    block_p = np.add.reduceat(pressure, edges[:-1]) / counts
    span_x = max(float(np.ptp(block_x)), 1e-12)
    span_p = max(float(np.ptp(block_p)), 1e-12)
    dx = np.diff(block_x) / span_x
    variance = 2.0 * noise**2 / float(np.mean(counts))
    dp2 = np.maximum(np.diff(block_p) ** 2 - variance, 0.0) / span_p**2
    centres = 0.5 * (edges[:-1] + edges[1:])
    # the even share keeps a minimum of nodes wherever rows are
    length = np.cumsum(np.sqrt(dx**2 + dp2) + 0.25 / dx.size)
    position = np.concatenate([[0.0], length])
    rows = np.interp(np.linspace(0.0, position[-1], nodes + 1), position, centres)
    rows[0], rows[-1] = 0, n
    return np.unique(rows.astype(np.int64))[:-1]
