"""Find the stretches of a record in which the barriers oscillate at one frequency and amplitude."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import robust_noise
from isotherm.oscillation_fit import fit_sinusoid, refine_frequency

__all__ = ["OscillatingStretch", "find_stretches"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# Extremes must stand out by this many standard deviations of the reading: in 10^5 rows of normal noise
# the largest excursion, end to end, is about 9.
_PROMINENCE: Final = 10.0
# Half cycles belong together while period and amplitude stay within these factors of their median;
# smaller changes of set frequency or amplitude are then looked for in all half cycles together.
_SAME_PERIOD: Final = 1.25
_SAME_AMPLITUDE: Final = 1.2
_FEWEST_HALF_CYCLES: Final = 4
_FEWEST_ROWS: Final = 24
_COARSE: Final = 8.0  # rows a half cycle
_UNEXPLAINED: Final = (
    0.1  # largest part of the variance that a sinusoid may leave; triangles leave 0.015
)
_CHANGE_P: Final = 1e-3  # probability of inventing a change in a steady stretch
_SMALLEST_CHANGE: Final = 0.01  # relative scatter of half cycles below which nothing changes


@dataclass(frozen=True)
class OscillatingStretch:
    """Rows first to last (exclusive), from one extreme of area to another; period in s.

    amplitude : half of the swing of ln A, 1. half_cycles : extremes passed.
    """

    first: int
    last: int
    period: float
    amplitude: float
    half_cycles: int


def find_stretches(time: FloatArray, area: FloatArray) -> tuple[OscillatingStretch, ...]:
    """Segment a record by its oscillations.

    Parameters
    ----------
    time : (n,) s, increasing
    area : (n,) any unit, positive

    Returns
    -------
    tuple of OscillatingStretch
        In order of time; at least two cycles each.
    """
    strain = np.log(area)
    # Few readings a period look like noise to the estimate of noise: then a quarter of the whole swing
    # has to do, and only what is a sinusoid beyond doubt is believed.
    quarter = 0.25 * float(np.ptp(strain))
    for threshold in (_PROMINENCE * robust_noise(strain), quarter):
        found = [
            s for s in _stretches(time, strain, max(threshold, 1e-9)) if _is_wave(time, strain, s)
        ]
        if found:
            return tuple(found)
    return ()


def _is_wave(time: FloatArray, strain: FloatArray, stretch: OscillatingStretch) -> bool:
    """Whether a sinusoid at the stretch's period explains its area beyond chance and nearly all of it."""
    rows = slice(stretch.first, stretch.last)
    t, y = time[rows], strain[rows]
    if len(t) < _FEWEST_ROWS or len(t) < 2.0 * stretch.half_cycles:
        return False
    omega = refine_frequency(t, y, stretch.period)
    wave = fit_sinusoid(t, y, omega)
    left = float(wave.residual @ wave.residual)
    about = y - wave.drift
    freedom = len(t) - 9
    whole = float(about @ about)
    return left / freedom < _UNEXPLAINED * whole / len(t)


def _stretches(
    time: FloatArray, strain: FloatArray, threshold: float
) -> tuple[OscillatingStretch, ...]:
    extremes = _extremes(strain, threshold)
    if len(extremes) <= _FEWEST_HALF_CYCLES:
        return ()
    times, values = time[extremes], strain[extremes]
    if float(np.median(np.diff(extremes))) < _COARSE:
        times, values = _between_rows(time, strain, extremes)
    halves = np.diff(times)
    swings = 0.5 * np.abs(np.diff(values))
    found: list[OscillatingStretch] = []
    start = 0
    for k in range(1, len(halves) + 1):  # over half cycles, not rows
        members = slice(start, k)
        if k < len(halves):
            period = float(np.median(halves[members]))
            swing = float(np.median(swings[members]))
            if _alike(halves[k], period, _SAME_PERIOD) and _alike(
                swings[k], swing, _SAME_AMPLITUDE
            ):
                continue
        if k - start >= _FEWEST_HALF_CYCLES:
            cuts = [start, *_changes(halves[members], swings[members], start), k]
            found.extend(
                OscillatingStretch(
                    int(extremes[a]),
                    int(extremes[b]) + 1,
                    2.0 * float(times[b] - times[a]) / (b - a),
                    float(np.median(swings[a:b])),
                    b - a,
                )
                for a, b in pairwise(cuts)
            )
        start = k
    return tuple(found)


def _alike(one: float, other: float, factor: float) -> bool:
    """Whether two lengths differ by less than a factor; a clock that stands still makes them 0 or less."""
    return max(one, other) < factor * min(one, other)


def _between_rows(
    time: FloatArray, strain: FloatArray, extremes: IntArray
) -> tuple[FloatArray, FloatArray]:
    """Time and height of extremes by the parabola through three readings: rows are too far apart."""
    inner = np.clip(extremes, 1, len(strain) - 2)
    before, at, after = strain[inner - 1], strain[inner], strain[inner + 1]
    bend = before - 2.0 * at + after
    lean = 0.5 * (after - before)
    with np.errstate(divide="ignore", invalid="ignore"):
        offset = np.clip(np.where(bend != 0, -lean / bend, 0.0), -0.5, 0.5)
    step = 0.5 * (time[inner + 1] - time[inner - 1])
    return time[inner] + offset * step, at + 0.5 * lean * offset


def _changes(halves: FloatArray, swings: FloatArray, offset: int) -> list[int]:
    """Half cycles (counted from `offset`) at which period or amplitude steps, by recursive halving."""
    n = len(halves)
    places = np.arange(_FEWEST_HALF_CYCLES, n - _FEWEST_HALF_CYCLES + 1)
    if len(places) == 0:
        return []
    p, where = min(_step(halves, places), _step(swings, places))
    if p * len(places) > _CHANGE_P:
        return []
    cut = int(where)
    return [
        *_changes(halves[:cut], swings[:cut], offset),
        offset + cut,
        *_changes(halves[cut:], swings[cut:], offset + cut),
    ]


def _step(values: FloatArray, places: IntArray) -> tuple[float, float]:
    """Probability by chance of the best step of the mean, and its place."""
    from scipy.special import fdtrc

    n = len(values)
    about = values - values.mean()
    total = float(about @ about)
    left = np.cumsum(about)[places - 1]
    gained = left**2 / places + left**2 / (n - places)
    best = int(np.argmax(gained))
    rest = max(total - float(gained[best]), 0.0)
    if total <= (_SMALLEST_CHANGE * float(values.mean())) ** 2 * n or rest <= 0:
        return (1.0, 0.0) if rest > 0 or total <= 0 else (0.0, float(places[best]))
    freedom = n - 2
    return float(fdtrc(1, freedom, float(gained[best]) / (rest / freedom))), float(places[best])


def _extremes(strain: FloatArray, threshold: float) -> IntArray:
    """Rows of alternating maxima and minima that stand out by `threshold`."""
    from scipy.signal import find_peaks

    tops = find_peaks(strain, prominence=threshold)[0]
    bottoms = find_peaks(-strain, prominence=threshold)[0]
    rows = np.concatenate([tops, bottoms]).astype(np.int64)
    kind = np.concatenate([np.ones(len(tops)), -np.ones(len(bottoms))])
    order = np.argsort(rows, kind="stable")
    rows, kind = rows[order], kind[order]
    if len(rows) < 2:
        return rows
    # of several in a row of one kind the furthest stands: label the groups, keep each one's best
    group = np.concatenate([[0], np.cumsum(kind[1:] != kind[:-1])])
    height = kind * strain[rows]
    best = np.lexsort((height, group))
    last = np.concatenate([np.flatnonzero(np.diff(group[best])), [len(best) - 1]])
    return np.asarray(rows[best[last]], dtype=np.int64)
