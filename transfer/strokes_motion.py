"""Cut the dipper's trace into rests and moves, with hysteresis against noise and encoder steps."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

__all__ = ["Motion", "Move", "Rest", "find_motion", "position_noise"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]

# A level change counts when it exceeds this many standard deviations of the reading's noise: over the
# rows of one rest (thousands) a normal deviate stays below about 4, and both ends of a step are noisy.
_NOISE_FACTOR = 6.0
# ... and this many encoder steps, since a level between two steps flickers by one step.
_STEP_FACTOR = 1.6
# ... and this part of the travel: smaller shifts (backlash, settling) are no stroke of anyone's.
_TRAVEL_PART = 0.004
# The encoder-step estimate may be fooled by a dipper that moves in every row; never let it claim more.
_LARGEST_PART = 0.02
# A rest inside a run of steps is a gap this many times the run's usual time per step, and this many rows.
_REST_FACTOR = 4.0
_REST_ROWS = 3
# Part of a move's way, at each end, that the line to its start or end goes through.
_END_PART = 0.15
# Readings enough to see the encoder's lattice.
_MOST_LATTICE = 20_000
# A perfectly quiet reading still counts as being at a level within this part of the dead band.
_LEAST_PART = 0.05
# Changes of up to this many steps show whether there are steps at all.
_FEW_STEPS = 12.0
# Groups of rows that the dead band is walked along, at most.
_MOST_WALKED = 40_000


@dataclass(frozen=True)
class Rest:
    """The dipper standing still. rows first..last (inclusive), level mm, u_level mm (of the mean).

    still is False where it only turned round, or where the log starts or ends on the way.
    """

    first: int
    last: int
    level: float
    u_level: float
    still: bool = True

    @property
    def rows(self) -> int:
        """Number of rows; 0 when the dipper turned round without a reading at rest."""
        return max(0, self.last - self.first + 1)


@dataclass(frozen=True)
class Move:
    """The dipper on its way between two rests. start and end in s; rows first..last lie between."""

    start: float
    end: float
    first: int
    last: int


@dataclass(frozen=True)
class Motion:
    """rests[k] and rests[k + 1] are joined by moves[k]. noise and resolution of the reading in mm."""

    rests: tuple[Rest, ...]
    moves: tuple[Move, ...]
    noise: float
    resolution: float


def position_noise(position: FloatArray) -> tuple[float, float]:
    """Return the reading's noise (standard deviation, mm) and its smallest step (mm), from the trace.

    Parameters
    ----------
    position : (n,) dipper reading, mm.

    Returns
    -------
    tuple of float
        Noise from the median absolute second difference (a steady move leaves none), and the encoder step
        (0 where the reading has none).
    """
    # stretches spread over a long log are enough
    if position.size > 4 * _MOST_WALKED:
        length = _MOST_WALKED // 20
        starts = np.linspace(0, position.size - length, 20).astype(np.intp)
        pieces = np.stack([position[a : a + length] for a in starts])
    else:
        pieces = position[None, :]
    second = pieces[:, 2:] - 2.0 * pieces[:, 1:-1] + pieces[:, :-2]
    noise = 1.4826 * float(np.median(np.abs(second))) / np.sqrt(6.0) if second.size else 0.0
    return noise, _encoder_step(pieces.ravel())


def _encoder_step(position: FloatArray) -> float:
    """Spacing of the readings' lattice, mm, or 0 where they lie on none."""
    some = position[:: max(1, position.size // _MOST_LATTICE)]
    gaps = np.diff(np.unique(np.round(some, 6)))
    gaps = gaps[gaps > 2e-6]
    if gaps.size < 3:
        return 0.0
    step = float(np.quantile(gaps, 0.05))
    # an encoder's readings differ by whole steps; a smooth reading's do not
    few = gaps[gaps < _FEW_STEPS * step] / step
    return step if float(np.mean(np.abs(few - np.round(few)) < 0.1)) > 0.9 else 0.0


def find_motion(time: FloatArray, position: FloatArray) -> Motion:
    """Cut the trace into rests joined by moves.

    A dead band as wide as the noise asks for follows the reading; leaving it is a step. Runs of steps one
    way are moves; a gap much longer than the run's usual step is a rest.

    Parameters
    ----------
    time : (n,) s, rising.
    position : (n,) dipper reading, mm.

    Returns
    -------
    Motion
    """
    noise, step = position_noise(position)
    low, high = (
        np.quantile(position[:: max(1, position.size // _MOST_WALKED)], [0.001, 0.999])
        if position.size > 2000
        else (position.min(), position.max())
    )
    travel = float(high - low)
    band = max(
        _NOISE_FACTOR * noise,
        min(_STEP_FACTOR * step, _LARGEST_PART * travel),
        _TRAVEL_PART * travel,
    )
    if travel <= 0 or travel < 2.0 * band:
        level = float(np.mean(position))
        whole = Rest(0, position.size - 1, level, noise / np.sqrt(position.size))
        return Motion((whole,), (), noise, step)
    events = _steps(position, band)
    return _runs(time, position, events, band, noise, step)


def _steps(position: FloatArray, band: float) -> IntArray:
    """Rows at which the reading has left the dead band around its last step.

    A long log is first averaged in groups of rows, so that the walk has a bounded length.
    """
    group = -(-position.size // _MOST_WALKED)
    if group > 1:
        whole = position.size // group * group
        walked = position[:whole].reshape(-1, group).mean(axis=1)
    else:
        walked = position
    events: list[int] = []
    anchor = float(np.median(walked[: min(5, walked.size)]))
    for place, value in enumerate(walked.tolist()):
        if value - anchor > band or anchor - value > band:
            anchor = value
            events.append(place)
    return np.asarray(events, dtype=np.intp) * group + group // 2


def _runs(
    time: FloatArray, position: FloatArray, events: IntArray, band: float, noise: float, step: float
) -> Motion:
    """Group steps into moves, measure the rests between, and refine where each move starts and ends."""
    rests = _merge(_gaps(time, position, events), position, band, noise, step)
    interval = float(np.median(np.diff(time)))
    moves = [
        _move(
            time,
            position,
            before,
            after,
            max(3.0 * noise, min(step, band), _LEAST_PART * band),
            interval,
        )
        for before, after in pairwise(rests)
    ]
    trimmed = []
    margin = 0.5 * interval
    for k, rest in enumerate(rests):
        left = moves[k - 1].end + margin if k else -np.inf
        right = moves[k].start - margin if k < len(moves) else np.inf
        first = int(np.searchsorted(time, left, side="left"))
        last = int(np.searchsorted(time, right, side="right")) - 1
        trimmed.append(_settle(time, position, rest, first, last, moves, k, interval))
    return Motion(tuple(trimmed), tuple(moves), noise, step)


def _settle(
    time: FloatArray,
    position: FloatArray,
    rest: Rest,
    first: int,
    last: int,
    moves: list[Move],
    k: int,
    interval: float,
) -> Rest:
    """Give a rest its rows; one too short to be told from turning round is not called still."""
    # the log's first and last rows are at rest only if they stay longer than the move would allow
    row = min(max(rest.first, 0), position.size - 1)
    if last - first + 1 >= 2:
        rows = position[first : last + 1]
        if 0 < k < len(moves) or not moves:
            return Rest(first, last, rest.level, rest.u_level)
        move = moves[0] if k == 0 else moves[-1]
        span = position[max(0, move.first) : move.last + 1]
        speed = abs(float(span[-1] - span[0])) / max(move.end - move.start, interval)
        drift = abs(float(rows[-1] - rows[0]))
        if drift < 0.5 * speed * (time[last] - time[first]) or rows.size > 2 * _REST_ROWS:
            return Rest(first, last, rest.level, rest.u_level)
    if k == 0:
        row, move = 0, moves[0]
    elif k == len(moves):
        row, move = position.size - 1, moves[-1]
    else:
        move = moves[k - 1]
        near = slice(max(0, first - 2), last + 3)
        rising = position[min(move.last, position.size - 1)] > position[move.first]
        rows = position[near]
        if rows.size:
            row = max(0, first - 2) + int(rows.argmax() if rising else rows.argmin())
    span = position[move.first : move.last + 1]
    speed = (
        abs(float(span[-1] - span[0])) / max(move.end - move.start, interval) if span.size else 0
    )
    return Rest(row, row, float(position[row]), rest.u_level + 0.5 * speed * interval, still=False)


def _gaps(time: FloatArray, position: FloatArray, events: IntArray) -> list[tuple[int, int]]:
    """Row ranges [after, until) in which the dipper rests or turns: between runs of steps, and within."""
    anchors = np.concatenate([position[:1], position[events]])
    direction = np.sign(np.diff(anchors))
    gap = np.diff(np.concatenate([time[:1], time[events]]))
    gap_rows = np.diff(np.concatenate([[0], events]))
    turn = np.flatnonzero(np.diff(direction) != 0) + 1
    bounds = np.concatenate([[0], turn, [events.size]])
    # the usual time per step of a run, from its own steps but the first (that one waited at rest)
    usual = np.zeros(events.size)
    for a, b in pairwise(bounds):
        inner = gap[a + 1 : b]
        usual[a:b] = np.median(inner) if inner.size else 0.0
    is_rest = (gap > _REST_FACTOR * usual) & (gap_rows > _REST_ROWS)
    is_rest[bounds[:-1]] = True  # every run begins after a rest, if only a turning point
    starts = np.flatnonzero(is_rest)
    before = np.where(starts > 0, events[starts - 1], 0)
    ranges = [(int(a), int(b)) for a, b in zip(before, events[starts], strict=True)]
    return [*ranges, (int(events[-1]), position.size)]


def _merge(
    gaps: list[tuple[int, int]], position: FloatArray, band: float, noise: float, step: float
) -> list[Rest]:
    """Join neighbouring rests whose levels differ by less than the dead band: that step was noise."""
    rests: list[Rest] = []
    for after, until in gaps:
        rest = _rest(position, after, until, band, noise, step)
        if rests and abs(rest.level - rests[-1].level) < band:
            rest = _rest(position, rests[-1].first, until, band, noise, step)
            rests.pop()
        rests.append(rest)
    return rests


def _rest(
    position: FloatArray, after: int, until: int, band: float, noise: float, step: float
) -> Rest:
    """Level of the rest between two step rows: the mean of the rows near the value most of them share."""
    rows = position[after:until]
    if rows.size == 0:
        return Rest(after, until - 1, float(position[min(after, position.size - 1)]), step)
    middle = float(np.median(rows))
    inside = rows[np.abs(rows - middle) <= max(3.5 * noise, min(step, band), _LEAST_PART * band)]
    level = float(np.mean(inside)) if inside.size else middle
    # rounding to the encoder's step leaves a uniform error that averaging cannot remove
    rounding = step / np.sqrt(12.0) if noise < step else 0.0
    u = float(np.hypot(noise / np.sqrt(max(1, inside.size)), rounding))
    return Rest(after, until - 1, level, u)


def _move(
    time: FloatArray,
    position: FloatArray,
    before: Rest,
    after: Rest,
    margin: float,
    interval: float,
) -> Move:
    """Where a move leaves one level and reaches the next, from a straight line through each end of it."""
    a, b = (before.first + before.last) // 2, (after.first + after.last) // 2 + 1
    a, b = max(0, a), min(position.size, max(b, a + 2))
    way = abs(after.level - before.level)
    part = (position[a:b] - before.level) / (after.level - before.level)
    edge = min(0.25, margin / way)
    # on the way from the last row still at the old level to the first row at the new one
    at_new = np.flatnonzero(part > 1.0 - edge)
    upto = int(at_new[0]) if at_new.size else part.size - 1
    at_old = np.flatnonzero(part[: upto + 1] < edge)
    since = int(at_old[-1]) if at_old.size else 0
    inner = np.arange(since + 1, upto)
    if inner.size < 2:
        start, end = time[a + since], time[a + upto]
    else:
        share = part[inner]
        head = inner[share < max(_END_PART, share[min(2, share.size - 1)])]
        tail = inner[share > min(1.0 - _END_PART, share[max(0, share.size - 3)])]
        start = _crossing(time[a + head], part[head], 0.0, time[a + since])
        end = _crossing(time[a + tail], part[tail], 1.0, time[a + upto])
        slack = 2.0 * interval
        reach = edge * (time[a + upto] - time[a + since])
        start = float(np.clip(start, time[a + since] - slack - 2.0 * reach, time[a + since + 1]))
        end = float(np.clip(end, time[a + upto - 1], time[a + upto] + slack + 2.0 * reach))
    first = int(np.searchsorted(time, start, side="right"))
    last = int(np.searchsorted(time, end, side="left")) - 1
    return Move(float(start), float(end), first, max(first, last))


def _crossing(time: FloatArray, part: FloatArray, level: float, otherwise: float) -> float:
    """Time at which the straight line through some rows passes `level`, or `otherwise`."""
    if time.size < 2:
        return float(otherwise)
    t = time - time[0]
    centred = t - t.mean()
    spread = float(centred @ centred)
    slope = float(centred @ part) / spread if spread > 0 else 0.0
    if slope <= 0.0:
        return float(otherwise)
    return float(time[0] + t.mean() + (level - part.mean()) / slope)
