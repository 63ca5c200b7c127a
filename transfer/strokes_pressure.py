"""Where the film was held at its pressure, and what interrupted it: renewals, set-point changes, loss."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

__all__ = ["Hold", "Interruption", "Pressure", "find_holds"]

FloatArray = NDArray[np.float64]

# Narrowest band around the set point that counts as held, mN/m. A controller in order keeps within a few
# tenths (practice), and set points are changed by more than that.
_BAND = 0.5
# The sheet's tolerance widens it: what the user allows is held.
_BAND_TOLERANCE = 1.5
# Scatter of the held pressure may widen it.
_BAND_SCATTER = 5.0
# It is taken from the pressures this near the set point, mN/m. Of a ramp, which crowds about no pressure,
# half lie within half of that: a median distance of this part or more is no scatter about a set point.
_NEAR = 3.0
_CROWDED = 0.4
# A dip that comes with a move (the controller lagging behind a fast stroke) does not end the hold, up to
# this part of the pressure; deeper ones, or ones that last while the dipper rests, are a lost film.
_DIP_PART = 0.5
_SETTLING_SECONDS = 60.0
_REST_OFF_SECONDS = 20.0
# A plateau is one that keeps this many seconds and rows and this part of the log.
_PLATEAU_SECONDS = 20.0
_PLATEAU_ROWS = 5
_PLATEAU_PART = 0.02
# A level below this part of the set point is film being spread or pressed, not dipped.
_SECOND_PART = 0.5
# Below this pressure, mN/m, nothing that could be dipped covers the water (the gas-like end of an isotherm).
_NO_FILM = 1.5
_MAX_PLATEAUS = 6
# Rows enough to see which pressures a log spends its time at.
_MOST_SORTED = 40_000
# A film that comes back larger by this part was renewed; creep and strokes only make it smaller.
_RENEWED_PART = 0.01
_GLITCH_ROWS = 2
# A hold begins and ends where the pressure is within this part of the band: on a ramp, that is near its end.
_EDGE = 0.5
# Between its first and last third a ramp through the band climbs by 4/3 of the band (2/3 of its width).
_CLIMB = 1.1


@dataclass(frozen=True)
class Hold:
    """One stretch of film at one set point, rows first..last (dips inside are not `steady`).

    pressure : median while held, mN/m. scatter : robust standard deviation about it, mN/m.
    """

    first: int
    last: int
    pressure: float
    scatter: float


@dataclass(frozen=True)
class Interruption:
    """Rows between two holds. kind: start | renewal | set-point change | lost control | end."""

    first: int
    last: int
    kind: str


@dataclass(frozen=True)
class Pressure:
    """holds in time order, interruptions between and around them, steady: (n,) rows usable for levels."""

    holds: tuple[Hold, ...]
    interruptions: tuple[Interruption, ...]
    steady: NDArray[np.bool_]
    band: float


def find_holds(
    time: FloatArray,
    area: FloatArray,
    pressure: FloatArray,
    *,
    target: float | None,
    tolerance: float = 0.0,
    moves: tuple[tuple[int, int], ...] = (),
) -> Pressure:
    """Find the stretches in which the film was held at a set point.

    Parameters
    ----------
    time, area, pressure : (n,) s, cm^2, mN/m.
    target : float or None
        The sheet's dipping pressure, mN/m; tried first as a set point.
    tolerance : float
        What the sheet allows about it, mN/m.
    moves : tuple of (first row, last row)
        Where the dipper moved: a second set point counts only when something was dipped at it.

    Returns
    -------
    Pressure
    """
    interval = float(np.median(np.diff(time)))
    need = max(_PLATEAU_ROWS, int(_PLATEAU_SECONDS / interval))
    smooth = _median3(pressure)
    center = _mode(smooth, 4.0 * _BAND)
    if target is not None and np.mean(np.abs(smooth - target) <= 2.0 * _BAND) > 0.2:
        center = target
    middle, scatter = _middle(smooth, center)
    band = max(_BAND, _BAND_SCATTER * scatter, _BAND_TOLERANCE * tolerance)

    label = np.full(time.size, -1, dtype=np.intp)
    free = np.ones(time.size, dtype=bool)
    settings: list[float] = []
    for _ in range(_MAX_PLATEAUS):
        if free.sum() < max(need, _PLATEAU_PART * time.size):
            break
        at = middle if not settings else _mode(smooth[free], 2.0 * band)
        inside = free & (np.abs(smooth - at) <= band)
        if inside.sum() < max(need, _PLATEAU_PART * time.size):
            break
        for first, last in _true_runs(inside):
            # a ramp crosses the band from edge to edge; a hold stays where it is
            third = max(1, (last - first + 1) // 3)
            early = float(np.median(smooth[first : first + third]))
            late = float(np.median(smooth[last + 1 - third : last + 1]))
            climbing = abs(late - early) > _CLIMB * band
            if last - first + 1 >= need and not climbing and at > _NO_FILM:
                label[first : last + 1] = len(settings)
        free &= ~inside
        settings.append(at)
    label = _bridge_glitches(label)
    stretches = _stretches(time, label, smooth, area, settings, moves, band)
    main = [first for first, _, which in stretches if which == 0]
    holds = [
        (first, last, which)
        for first, last, which in stretches
        if which == 0
        or (
            settings[which] > _SECOND_PART * settings[0]
            and any(a >= first and b <= last for a, b in moves)
            # a set point left and come back to was changed for something else than dipping
            and not (main and min(main) < first < max(main))
        )
    ]
    steady = np.zeros(time.size, dtype=bool)
    out: list[Hold] = []
    for first, last, which in holds:
        rows = slice(first, last + 1)
        inside = label[rows] == which
        value = float(np.median(pressure[rows][inside]))
        spread = 1.4826 * float(np.median(np.abs(smooth[rows][inside] - value)))
        limit = max(_EDGE * band, 4.0 * spread)
        close = inside & (np.abs(smooth[rows] - value) <= limit)
        usable = np.flatnonzero(close)
        first, last = first + int(usable[0]), first + int(usable[-1])
        # a few rows of settling at an edge made by an interruption
        trim = 3 if last - first > 20 else 0
        first += trim if first > 0 else 0
        last -= trim if last < time.size - 1 else 0
        steady[first : last + 1] = label[first : last + 1] == which
        out.append(Hold(first, last, value, spread))
    return Pressure(tuple(out), _interruptions(out, area, smooth, band), steady, band)


def _middle(pressure: FloatArray, center: float) -> tuple[float, float]:
    """Middle of the pressures near one, and their scatter (0 where they crowd about none), mN/m."""
    near = pressure[np.abs(pressure - center) <= _NEAR]
    if near.size == 0:
        return center, 0.0
    middle = float(np.median(near))
    apart = float(np.median(np.abs(near - middle)))
    return middle, 1.4826 * apart if apart < _CROWDED * _NEAR else 0.0


def _median3(values: FloatArray) -> FloatArray:
    """Median of each row and its two neighbours: single-row glitches vanish."""
    out = values.copy()
    a, b, c = values[:-2], values[1:-1], values[2:]
    out[1:-1] = np.maximum(np.minimum(a, b), np.minimum(np.maximum(a, b), c))
    return out


def _mode(values: FloatArray, width: float) -> float:
    """Middle of the window of `width` that holds the most values above the no-film pressure."""
    some = values[:: max(1, values.size // _MOST_SORTED)]
    ordered = np.sort(some[some > _NO_FILM])
    if ordered.size == 0:
        return float(np.median(values))
    upto = np.searchsorted(ordered, ordered + width, side="right")
    best = int(np.argmax(upto - np.arange(ordered.size)))
    return float(np.median(ordered[best : upto[best]]))


def _true_runs(mask: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """First and last row of every run of True."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], mask, [False]]).astype(np.int8)))
    return [(int(a), int(b) - 1) for a, b in zip(edges[::2], edges[1::2], strict=True)]


def _bridge_glitches(label: NDArray[np.intp]) -> NDArray[np.intp]:
    """Let one or two odd rows inside a hold not break it."""
    out = label.copy()
    for first, last in _true_runs(label < 0):
        inner = first > 0 and last < label.size - 1
        if inner and last - first < _GLITCH_ROWS and label[first - 1] == label[last + 1]:
            out[first : last + 1] = label[first - 1]
    return out


def _still(time: FloatArray, moves: tuple[tuple[int, int], ...]) -> NDArray[np.bool_]:
    """Rows at which the dipper rests and the controller has had time to settle."""
    moving = np.zeros(time.size + 1)
    for first, last in moves:
        until = int(np.searchsorted(time, time[last] + _SETTLING_SECONDS))
        moving[first] += 1.0
        moving[until] -= 1.0
    return np.asarray(np.cumsum(moving)[:-1] <= 0.0)


def _stretches(
    time: FloatArray,
    label: NDArray[np.intp],
    pressure: FloatArray,
    area: FloatArray,
    settings: list[float],
    moves: tuple[tuple[int, int], ...],
    band: float,
) -> list[tuple[int, int, int]]:
    """Join held runs at one set point across dips of moves; (first row, last row, set point)."""
    still = _still(time, moves)
    seconds = np.diff(time, prepend=time[0])
    joined: list[tuple[int, int, int]] = []
    for which, setting in enumerate(settings):
        # seconds, summed from the start, that the pressure was off this set point while the dipper rested
        off = np.cumsum(seconds * still * (np.abs(pressure - setting) > band))
        mine: list[tuple[int, int, int]] = []
        for a, b in _true_runs(label == which):
            if any(first <= a and b <= last for first, last, _ in joined):
                continue  # the level of a dip of another set point
            if mine:
                first, last, _ = mine[-1]
                dip = float(np.max(np.abs(pressure[last : a + 1] - setting)))
                later = float(np.median(area[a : min(a + 9, b + 1)]))
                grown = later > area[last] * (1.0 + _RENEWED_PART) or bool(
                    np.max(area[last : a + 1]) > area[last] * (1.0 + 5.0 * _RENEWED_PART)
                )
                resting = float(off[a] - off[last]) > _REST_OFF_SECONDS
                shallow = dip <= max(2.0 * band, _DIP_PART * setting)
                if shallow and not grown and not resting:
                    mine[-1] = (first, b, which)
                    continue
            mine.append((a, b, which))
        joined.extend(mine)
    return sorted(joined)


def _level_elsewhere(pressure: FloatArray, setting: float, band: float) -> bool:
    """Whether most of an interruption was spent at one other pressure."""
    off = pressure[np.abs(pressure - setting) > band]
    if off.size < _PLATEAU_ROWS:
        return False
    spread = 1.4826 * float(np.median(np.abs(off - np.median(off))))
    return spread < 0.5 * band


def _interruptions(
    holds: list[Hold], area: FloatArray, pressure: FloatArray, band: float
) -> tuple[Interruption, ...]:
    """Name what lies before, between and after the holds."""
    out: list[Interruption] = []
    if not holds:
        return ()
    if holds[0].first > 0:
        out.append(Interruption(0, holds[0].first - 1, "start"))
    for before, after in pairwise(holds):
        rows = slice(before.last, after.first + 1)
        opened = float(np.max(area[rows])) > (1.0 + 5 * _RENEWED_PART) * area[before.last]
        emptied = float(np.min(pressure[rows])) < 0.5 * min(before.pressure, after.pressure)
        larger = area[after.first] > (1.0 + _RENEWED_PART) * area[before.last]
        same = abs(after.pressure - before.pressure) <= band
        if (same and larger) or (opened and emptied):
            kind = "renewal"
        elif not same or _level_elsewhere(pressure[rows], before.pressure, band):
            kind = "set-point change"
        else:
            kind = "lost control"
        out.append(Interruption(before.last + 1, after.first - 1, kind))
    if holds[-1].last < area.size - 1:
        out.append(Interruption(holds[-1].last + 1, area.size - 1, "end"))
    return tuple(out)
