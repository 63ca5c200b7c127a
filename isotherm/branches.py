"""Compressions, expansions and holds, found from the area signal with hysteresis against noise."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.trace import Trace

__all__ = ["BranchRows", "find_branches", "quantum", "robust_noise", "steady_area", "uneven"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# A reversal counts as a branch when the area comes back by this share of its whole range (our choice:
# below it, nothing measurable fits on the branch) and by this many standard deviations of the reading.
SMALLEST_REVERSAL: Final = 0.02  # 1
REVERSAL_SIGMAS: Final = 8.0  # 1
BLOCKS: Final = 1024  # turning points are searched on block means, then placed on rows
# The barrier stands still where it covers less than this share of its usual step.
CLEAR_SIGMAS: Final = (
    17.0  # travel between two readings, in σ of one, at which standing still shows
)
PAUSE_SPEED: Final = 0.08  # 1
# Rows are uneven where the usual departure from the usual step is more than UNEVEN of it, and departures of
# neighbours are less against one another than half of what jitter makes them (our choices).
UNEVEN: Final = 0.15  # 1
JITTER: Final = -0.25  # 1
STRETCH: Final = 16  # rows
STRETCHES: Final = 64  # looked at, at most twice as many
# MAD of a normal distribution is 0.6745 standard deviations.
MAD_TO_SIGMA: Final = 1.0 / 0.6745  # 1


@dataclass(frozen=True)
class BranchRows:
    """Rows of one branch, in the order of travel.

    direction : "compression" or "expansion".
    cycle : 1 for the first compression and what follows it until the next compression.
    rows : (n,) indices into the trace; pauses of the barrier left out.
    paused : number of rows left out because the barrier stood still.
    """

    direction: str
    cycle: int
    rows: IntArray
    paused: int = 0


def robust_noise(values: FloatArray) -> float:
    """Standard deviation of the scatter about a smooth signal, in the units of `values` (n,).

    From second differences, whose standard deviation is √6 σ for white noise, by their MAD, so that
    spikes, knees and trends do not count; never below the rounding error q/√12 of a quantised reading.
    """
    if values.size < 3:
        return 0.0
    second = values[2:] - 2.0 * values[1:-1] + values[:-2]
    sigma = MAD_TO_SIGMA * float(np.median(np.abs(second))) / np.sqrt(6.0)
    return float(max(sigma, quantum(values) / np.sqrt(12.0)))


def quantum(values: FloatArray) -> float:
    """Step of a quantised reading, in the units of `values` (n,); 0 where no step shows.

    A reading counts as quantised when at least a tenth of the successive differences are exactly zero;
    the step is then the smallest difference that is not (to rounding of the decimal text).
    """
    steps = np.abs(np.diff(values[:4096]))
    scale = float(np.max(np.abs(values[:4096]), initial=0.0))
    moving = steps > 1e-9 * scale
    if steps.size == 0 or moving.sum() < 5 or moving.mean() > 0.9:
        return 0.0
    return float(np.quantile(steps[moving], 0.02))


def uneven(area: FloatArray) -> bool:
    """Whether the steps between rows of (n,) area differ because the travel does, not by jitter.

    Jitter of the reading sends one step long and the next one short: neighbouring steps have a correlation
    of -1/2 then, and none where each row was taken at another moment. Compared within short stretches,
    so that a change of the barrier's speed does not count.
    """
    steps = np.diff(area)
    blocks = steps.size // STRETCH
    if blocks < 4:
        return False
    stretches = steps[: blocks * STRETCH].reshape(blocks, STRETCH)
    stretches = stretches[:: max(1, blocks // STRETCHES)]
    apart = stretches - np.median(stretches, axis=1)[:, None]
    usual = float(np.median(np.abs(apart)))
    if usual <= UNEVEN * abs(float(np.median(steps))):
        return False
    apart = np.clip(apart, -6.0 * usual, 6.0 * usual)
    return float(np.sum(apart[:, 1:] * apart[:, :-1])) > JITTER * float(np.sum(apart**2))


def steady_area(area: FloatArray) -> FloatArray:
    """Area along one branch with the jitter of the encoder averaged out.

    Parameters
    ----------
    area : (n,) in the order of travel.

    Returns
    -------
    (n,) array
        A running mean over a few steps of the barrier, which keeps a steady travel as it is; the input
        itself where its steps stand clear of its scatter, where the rows lie unevenly along the travel, or
        where there are too few.
    """
    n = area.size
    noise = robust_noise(area)
    step = abs(float(area[-1] - area[0])) / max(n - 1, 1)
    if n < 200 or noise < 0.3 * step or step <= 0 or uneven(area):
        return area
    half = int(np.clip(np.ceil(3.0 * noise / step), 2, n // 100))
    totals = np.concatenate([[0.0], np.cumsum(area)])
    index = np.arange(n)
    # near the ends the window shrinks on both sides, so that it stays centred
    reach = np.minimum(np.minimum(index, n - 1 - index), half)
    return np.asarray((totals[index + reach + 1] - totals[index - reach]) / (2 * reach + 1))


def find_branches(trace: Trace) -> tuple[BranchRows, ...]:
    """Split a run into compressions and expansions.

    Parameters
    ----------
    trace : Trace
        Rows in time order, or in file order where it has no time.

    Returns
    -------
    tuple of BranchRows
        In time order. A monotonic run without time is one compression whichever end comes first.
    """
    area = trace.area
    span = float(area.max() - area.min())
    tolerance = max(
        SMALLEST_REVERSAL * span, REVERSAL_SIGMAS * min(robust_noise(area), 0.02 * span)
    )
    turns = _turning_points(area, tolerance)
    if trace.time is None and len(turns) == 2:
        rows = np.arange(area.size)
        if area[turns[1]] > area[turns[0]]:
            rows = rows[::-1].copy()
        return (BranchRows("compression", 1, rows),)
    noise = robust_noise(area)
    branches = []
    cycle = 0
    turns = [turn for k, turn in enumerate(turns) if k == 0 or turn > max(turns[:k])]
    for first, last in itertools.pairwise(turns):
        direction = "compression" if area[last] < area[first] else "expansion"
        if direction == "compression" or cycle == 0:
            cycle += 1
        rows, paused = _moving_rows(area, first, last, noise)
        branches.append(BranchRows(direction, cycle, rows, paused))
    return tuple(branches)


def _turning_points(area: FloatArray, tolerance: float) -> list[int]:
    """Rows where the area turns by more than `tolerance`, with the first and the last row."""
    n = area.size
    lowest = np.minimum.accumulate(area)
    if float(np.max(area - lowest)) < tolerance:
        # one compression: it starts at the last row of the initial maximum and ends at the minimum
        ends = [int(np.argmax(area)), int(np.argmin(area))]
        return ends if ends[0] < ends[1] else [0, n - 1]
    highest = np.maximum.accumulate(area)
    if float(np.max(highest - area)) < tolerance:
        ends = [int(np.argmin(area)), int(np.argmax(area))]
        return ends if ends[0] < ends[1] else [0, n - 1]
    edges = np.unique(np.linspace(0, n, min(n, BLOCKS) + 1).astype(np.int64))
    means = np.add.reduceat(area, edges[:-1]) / np.diff(edges)
    pivots: list[int] = []
    low = high = 0
    rising: bool | None = None
    for i, value in enumerate(means.tolist()):
        if value > means[high]:
            high = i
        if value < means[low]:
            low = i
        if rising is not False and means[high] - value > tolerance:
            pivots.append(high)
            rising, low = False, i
            high = i
        elif rising is not True and value - means[low] > tolerance:
            pivots.append(low)
            rising, high = True, i
            low = i
    if rising is None:
        return [0, n - 1]
    pivots.append(high if rising else low)
    upward = means[pivots[1]] > means[pivots[0]]
    turns = []
    for k, pivot in enumerate(pivots):
        start, stop = int(edges[max(pivot - 1, 0)]), int(edges[min(pivot + 2, edges.size - 1)])
        minimum = (k % 2 == 0) == upward
        local = area[start:stop]
        turns.append(start + int(np.argmin(local) if minimum else np.argmax(local)))
    return turns


def _moving_rows(area: FloatArray, first: int, last: int, noise: float) -> tuple[IntArray, int]:
    """Rows from `first` to `last` while the barrier moves: end holds and inner pauses left out."""
    stretch = area[first : last + 1]
    tolerance = 3.0 * noise
    leaving = np.abs(stretch - stretch[0]) <= tolerance
    arriving = np.abs(stretch - stretch[-1]) <= tolerance
    begin = int(np.flatnonzero(leaving)[-1])
    end = int(np.flatnonzero(arriving)[0])
    if end <= begin:
        begin, end = 0, stretch.size - 1
    rows = np.arange(first + begin, first + end + 1)
    n = rows.size
    # wide enough for the usual travel to stand clear of the reading's scatter
    step = abs(float(stretch[end] - stretch[begin])) / max(n - 1, 1)
    clear = int(np.ceil(CLEAR_SIGMAS * noise / step)) if step > 0 else n
    width = max(5, n // 200, clear)
    if n < 10 * width:
        return rows, 0
    moving = stretch[begin : end + 1]
    covered = np.abs(moving[width:] - moving[:-width])
    usual = float(np.median(covered))
    if usual < 0.5 * CLEAR_SIGMAS * noise:
        return rows, 0
    slow = covered < PAUSE_SPEED * usual
    if not slow.any():
        return rows, 0
    # a window that hardly moved is a pause from its second row to its last
    marks = np.zeros(n + 1, dtype=np.int64)
    starts = np.flatnonzero(slow)
    np.add.at(marks, starts + 1, 1)
    np.add.at(marks, starts + width, -1)
    keep = np.cumsum(marks[:n]) == 0
    return rows[keep], int(n - keep.sum())
