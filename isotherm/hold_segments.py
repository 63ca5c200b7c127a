"""Where in a record the trough holds: pressure kept while the area drifts, or barrier stopped.

The record is condensed once. A hold is the longest stretch over which one of the two, pressure or area,
keeps within a narrow band; the stretch is taken out and the next longest looked for in what remains. A
stretch of even pressure that the barrier crosses at its travelling speed is a compression through a flat
part of the isotherm, not a hold.
"""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_arrival import barrier_arrival, pressure_arrival
from isotherm.hold_condense import Condensed, condense_record

__all__ = ["Stretch", "find_stretches"]

FloatArray = NDArray[np.float64]

# The barrier is travelling, not creeping, above this part of its speed elsewhere in the record.
_TRAVEL_PART = 0.3
# A stretch of even pressure crossed at nearly that speed is a compression through a flat part of the
# isotherm; a film that collapses may creep fast, but not as fast as the barrier drives it.
_SAME_SPEED = 0.7
# mN/m: below this there is no film under pressure to hold (waiting for the solvent to evaporate).
_LEAST_PRESSURE = 1.0
_MEANS = (1, 9, 41)  # blocks averaged, to look through a controller's hunting
_CLEARLY = 1.5
_SHORTEST = 60.0  # s: nothing slower than a controller's settling can be seen in less
_SHORTEST_PART = 0.05  # of the longest hold: shorter stops are pauses
_FEWEST_BLOCKS = 8
_GAP_PART = 0.05  # of a hold: a disturbance no longer than this does not end it
# mN/m: modulus of an ordinary condensed film, to weigh a relative change of area against one of pressure.
_MODULUS = 100.0
# mN/m: a drift any trough shows plainly; and how many times the other's it must be to be sure of the kind.
_CLEAR_DRIFT = 0.3
_CLEAR_RATIO = 3.0
# A controller trades scatter of pressure for scatter of area; a stopped barrier's reading is far quieter.
_TRADED_PART = 0.25
# Scatter against that of successive differences, 1 for white noise; its own scatter is a few per cent.
_BUSY_RATIO = 1.25


@dataclass(frozen=True)
class Stretch:
    """Rows of one hold. kind : "isobaric" | "isochoric".  start, stop : rows, stop not included."""

    kind: str
    start: int
    stop: int


def _longest_flat(values: FloatArray, time: FloatArray, band: float) -> tuple[int, int]:
    """First and last index of the longest stretch (in time) whose values stay within `band`."""
    highest: deque[int] = deque()
    lowest: deque[int] = deque()
    best, found = -1.0, (0, 0)
    first = 0
    level, at = values.tolist(), time.tolist()
    for i, value in enumerate(level):
        while highest and level[highest[-1]] <= value:
            highest.pop()
        while lowest and level[lowest[-1]] >= value:
            lowest.pop()
        highest.append(i)
        lowest.append(i)
        while level[highest[0]] - level[lowest[0]] > band:
            first += 1
            if highest[0] < first:
                highest.popleft()
            if lowest[0] < first:
                lowest.popleft()
        if at[i] - at[first] > best:
            best, found = at[i] - at[first], (first, i)
    return found


def _longest_kept(data: Condensed, first: int, last: int) -> tuple[float, int, int]:
    """Duration and blocks of the longest stretch between two blocks that keeps pressure or area.

    A controller that hunts is seen through moving means; the longer mean is used only where it makes the
    stretch clearly longer, because it blurs the ends.
    """
    window = slice(first, last + 1)
    time = data.time[window]
    a, b = _longest_flat(data.area[window], time, data.area_band)
    best = (float(time[b] - time[a]), first + a, first + b)
    for width in _MEANS:
        if width > time.size // 4:
            break
        kernel = np.ones(width) / width
        smooth = np.convolve(data.pressure[window], kernel, mode="valid")
        a, b = _longest_flat(smooth, time[: smooth.size], data.pressure_band)
        b += width - 1
        duration = float(time[b] - time[a])
        if duration > (_CLEARLY if width > 1 else 1.0) * best[0]:
            best = (duration, first + a, first + b)
    return best


def _travel_speed(data: Condensed, first: int, last: int) -> float:
    """Barrier's travelling speed outside first..last, area per second; 0 where it never travels."""
    step = 3
    outside = np.ones(data.time.size, dtype=bool)
    outside[first : last + 1] = False
    covered = np.abs(data.area[step:] - data.area[:-step])
    speed = covered / (data.time[step:] - data.time[:-step])
    seen = outside[step:] & outside[:-step] & (covered > 6.0 * data.area_noise)
    return float(np.quantile(speed[seen], 0.9)) if int(seen.sum()) >= 3 else 0.0


def _clear_kind(data: Condensed, first: int, last: int) -> str:
    """Which of the two drifted, if one clearly did; else ""."""
    first += (last - first) // 10  # the settling says nothing
    part = max((last - first) // 4, 1)
    area, pressure = data.area[first : last + 1], data.pressure[first : last + 1]
    by_area = _MODULUS * abs(float(np.median(area[-part:]) / np.median(area[:part])) - 1.0)
    by_pressure = abs(float(np.median(pressure[-part:]) - np.median(pressure[:part])))
    if max(by_area, by_pressure) < _CLEAR_DRIFT:
        return ""
    if by_area > _CLEAR_RATIO * by_pressure:
        return "isobaric"
    return "isochoric" if by_pressure > _CLEAR_RATIO * by_area else ""


def _busy_kind(data: Condensed, first: int, last: int) -> str:
    """Where nothing drifts: a controller keeps the barrier busy, a stopped one only shows its reading."""
    first += (last - first) // 10
    area, pressure = data.area[first : last + 1], data.pressure[first : last + 1]
    traded = _MODULUS * float(np.std(area)) / max(abs(float(area.mean())), 1e-300)
    if traded > _TRADED_PART * float(np.std(pressure)):
        return "isobaric"
    # successive differences hold no slow motion: white readings have a ratio of 1, wandering ones below
    step = float(np.sqrt(np.mean(np.diff(area) ** 2)))
    slow = float(np.std(area)) * np.sqrt(2.0)
    return "isobaric" if slow > _BUSY_RATIO * step else "isochoric"


def _kinds(data: Condensed, taken: list[tuple[int, int]]) -> list[str]:
    """Kind of every stretch; the unclear ones follow the clear ones of the same record."""
    clear = [_clear_kind(data, a, b) for a, b in taken]
    known = [kind for kind in clear if kind]
    if known:
        usual = max(sorted(set(known)), key=known.count)
        return [kind or usual for kind in clear]
    return [_busy_kind(data, a, b) for a, b in taken]


def _trim_travel(data: Condensed, first: int, last: int, travel: float) -> tuple[int, int]:
    """Drop blocks at both ends over which the barrier still, or already, travels."""
    if travel <= 0:
        return first, last
    speed = np.abs(np.diff(data.area)) / np.diff(data.time)
    limit = max(_TRAVEL_PART * travel, 4.0 * data.area_noise / float(np.median(np.diff(data.time))))
    while last - first > _FEWEST_BLOCKS and speed[last - 1] > limit:
        last -= 1
    while last - first > _FEWEST_BLOCKS and speed[first] > limit:
        first += 1
    return first, last


def find_stretches(time: FloatArray, area: FloatArray, pressure: FloatArray) -> tuple[Stretch, ...]:
    """Find every hold of a record.

    Parameters
    ----------
    time : (n,) array
        s, increasing.
    area : (n,) array
        Trough area (cm^2) or area per molecule (nm^2).
    pressure : (n,) array
        mN/m.

    Returns
    -------
    tuple of Stretch
        In time order; empty where the record holds nothing.
    """
    data = condense_record(time, area, pressure)
    free = [(0, data.time.size - 1)]
    taken: list[tuple[int, int]] = []
    longest = 0.0
    while free:
        first, last = free.pop()
        if last - first < _FEWEST_BLOCKS:
            continue
        duration, a, b = _longest_kept(data, first, last)
        if duration < max(_SHORTEST, _SHORTEST_PART * longest) or b - a < _FEWEST_BLOCKS:
            continue
        free += [(first, a - 1), (b + 1, last)]
        travel = _travel_speed(data, a, b)
        a, b = _trim_travel(data, a, b, travel)
        crossed = abs(data.area[b] - data.area[a]) / max(data.time[b] - data.time[a], 1e-9)
        moving = travel > 0 and crossed > _SAME_SPEED * travel
        bare = float(np.median(data.pressure[a : b + 1])) < _LEAST_PRESSURE
        if moving or bare or b - a < _FEWEST_BLOCKS:
            continue
        longest = max(longest, float(data.time[b] - data.time[a]))
        taken.append((a, b))
    return _placed(data, time, area, pressure, _merged(data, sorted(taken)), longest)


def _merged(data: Condensed, taken: list[tuple[int, int]]) -> list[tuple[int, int]]:
    """Join stretches of one hold that a knock on the trough has parted."""
    joined: list[tuple[int, int]] = []
    for a, b in taken:
        if joined:
            first, last = joined[-1]
            gap = float(data.time[a] - data.time[last])
            same = all(
                abs(float(np.median(x[a : a + _FEWEST_BLOCKS]) - np.median(x[last - 7 : last + 1])))
                < band
                for x, band in ((data.pressure, data.pressure_band), (data.area, data.area_band))
            )
            if same and gap < _GAP_PART * float(data.time[b] - data.time[first]):
                joined[-1] = (first, b)
                continue
        joined.append((a, b))
    return joined


def _placed(
    data: Condensed, time: FloatArray, area: FloatArray, pressure: FloatArray,
    taken: list[tuple[int, int]], longest: float,
) -> tuple[Stretch, ...]:  # fmt: skip
    """Give each stretch its kind and the row at which its set point was reached."""
    stretches: list[Stretch] = []
    floor = 0
    taken = [(a, b) for a, b in taken if data.time[b] - data.time[a] >= _SHORTEST_PART * longest]
    for (a, b), kind in zip(taken, _kinds(data, taken), strict=True):
        if kind == "isobaric":
            start = pressure_arrival(data, pressure, (a, b), floor)
        else:
            start = barrier_arrival(data, time, area, (a, b), floor)
        # the last block may hold the first rows of what follows
        stop = int(data.edges[b + 1] if b + 1 == data.time.size else data.edges[b])
        stretches.append(Stretch(kind, start, stop))
        floor = b + 1
    return tuple(stretches)
