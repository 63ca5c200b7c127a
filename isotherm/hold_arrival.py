"""The moment a hold begins: the pressure reaches its set point, or the barrier stops."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import robust_noise
from isotherm.hold_condense import Condensed
from isotherm.straight_line import straight_line

__all__ = ["barrier_arrival", "pressure_arrival"]

FloatArray = NDArray[np.float64]

# mN/m: how far below the set point the approach to it begins, for placing its arrival.
_APPROACH = 3.0
# Relative: farther from the area kept than this, the barrier is travelling rather than slowing to its stop.
_AREA_APPROACH = 5e-3
_TRAVEL_BLOCKS = 5  # of travel before the stop, for the straight line


def _far_block(
    blocks: FloatArray, target: float, found: tuple[int, int], floor: int, reach: float
) -> int:
    """Last block before the hold that is still on its way to the set point; -1 where there is none."""
    before = np.flatnonzero(np.abs(blocks[floor : found[0] + 1] - target) > reach)
    return floor + int(before[-1]) if before.size else -1


def pressure_arrival(
    data: Condensed, pressure: FloatArray, found: tuple[int, int], floor: int
) -> int:
    """Row at which the pressure first reaches the set point."""
    first, last = found
    target = float(np.median(data.pressure[first : last + 1]))
    # Coming from another hold, the approach may be shorter; a record that begins with its hold begins
    # within reach, ringing included.
    step = abs(target - float(data.pressure[floor])) if floor else target
    reach = max(min(_APPROACH, 0.5 * step), 0.5 * data.pressure_band)
    far = _far_block(data.pressure, target, found, floor, reach)
    if far < 0:
        return int(data.edges[floor])
    rows = pressure[data.edges[far] : data.edges[last + 1]]
    side = np.sign(target - data.pressure[far])
    there = np.flatnonzero(side * (rows - target) >= -robust_noise(rows))
    return int(data.edges[far] + (there[0] if there.size else 0))


def barrier_arrival(
    data: Condensed, time: FloatArray, area: FloatArray, found: tuple[int, int], floor: int
) -> int:
    """Row at which the barrier stops: its travel, extended as a straight line, meets the area kept."""
    first, last = found
    target = float(np.median(data.area[first : last + 1]))
    reach = max(data.area_band, _AREA_APPROACH * abs(target))
    far = _far_block(data.area, target, found, floor, reach)
    if far < 0:
        return int(data.edges[floor])
    begin = int(data.edges[max(floor, far - _TRAVEL_BLOCKS)])
    stop, limit = int(data.edges[far + 1]), int(data.edges[first + 1])
    if stop - begin < 3:
        return min(stop, limit)
    slope, level = straight_line(time[begin:stop] - time[stop - 1], area[begin:stop])
    if slope == 0.0:
        return min(stop, limit)
    meets = time[stop - 1] + (target - level) / slope
    return int(np.clip(np.searchsorted(time, meets), stop - 1, limit))
