"""Two yardsticks: what a hasty spreadsheet gets, and what least squares gets when told the strokes."""

from __future__ import annotations

import itertools
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import uniform_filter1d
from transfer_matching import FoundStroke, Reading
from transfer_truth import SimulatedLog, Truth

from isotherm.sheet import RunSheet, Substrate

__all__ = ["spreadsheet", "told_least_squares"]

FloatArray = NDArray[np.float64]
MOST_FITTED = 5000  # rows of one film's fit; more are averaged in groups


def _perimeter_and_face(body: Substrate) -> tuple[float, float]:
    """Waterline (mm) and lower end (cm^2) by the sheet."""
    if body.shape == "rod" and body.diameter is not None:
        d = body.diameter.value
        return float(np.pi * d), float(np.pi * d * d / 400.0)
    if body.width is None or body.thickness is None:
        raise ValueError("plate without width or thickness")
    w, t = body.width.value, body.thickness.value
    return 2.0 * (w + t), w * t / 100.0


def _depth(log: SimulatedLog, sheet: RunSheet, contact: float) -> FloatArray:
    sign = -1.0 if sheet.dipping.position_reads == "height" else 1.0
    return sign * (log.position - contact)


def _coated(perimeter: float, face: float, a: float, b: float) -> float:
    below = [perimeter * h / 100.0 + face if h > 0.0 else 0.0 for h in (a, b)]
    return abs(below[1] - below[0])


def spreadsheet(log: SimulatedLog, sheet: RunSheet, contact: float) -> Reading:
    """Before minus after: runs of one sign of the row-to-row difference, area read at either end.

    A run longer than 2 mm is a stroke; a standing row ends it. No creep, no pressure, no
    renewals; `contact` (reading at the surface, mm) is told.
    """
    perimeter, face = _perimeter_and_face(sheet.substrate or Substrate())
    depth = _depth(log, sheet, contact)
    sign = np.sign(np.round(np.diff(depth), 2))
    edges = np.flatnonzero(np.diff(sign)) + 1
    strokes = []
    bounds = [0, *edges.tolist(), sign.size]
    for lo, hi in itertools.pairwise(bounds):
        if sign[lo] == 0 or abs(depth[hi] - depth[lo]) < 2.0:
            continue
        coated = _coated(perimeter, face, depth[lo], depth[hi])
        if coated <= 0.0:
            continue
        ratio = float((log.area[lo] - log.area[hi]) / coated)
        strokes.append(
            FoundStroke(
                float(log.time[lo]),
                float(log.time[hi]),
                "down" if sign[lo] > 0 else "up",
                ratio,
                None,
            )
        )
    return Reading(tuple(strokes))


def _quiet(log: SimulatedLog, truth: Truth, target: float) -> list[NDArray[np.intp]]:
    """Rows of each dwell with the pressure held; a dwell with a renewal in it becomes two."""
    pressure = uniform_filter1d(log.pressure, 5)
    fine = np.abs(pressure - target) < 0.5
    busy = [(s.start - 1.0, s.end + 3.0) for s in truth.strokes]
    busy += [(b - 2.0, e + 20.0) for b, e in truth.renewals]
    busy += [(-np.inf, truth.ready + 20.0)] if truth.ready > 0.0 else []
    busy.sort()
    starts = [-np.inf] + [e for _, e in busy]
    ends = [b for b, _ in busy] + [float(log.time[-1]) + 1.0]
    blocks = [
        np.flatnonzero(fine & (log.time >= a) & (log.time < b))
        for a, b in zip(starts, ends, strict=True)
    ]
    return [rows for rows in blocks if rows.size >= 2]


def _carried(
    area: FloatArray,
    excess: FloatArray,
    time: FloatArray,
    dwells: list[NDArray[np.intp]],
    guess: tuple[float, float],
) -> Callable[[int, float], float]:
    """Fit all dwells of one film together: a level each, one 1/M, one rate (constant plus decaying).

    area (cm^2), excess (smoothed pressure less its set value, mN/m), time (s): (n,). guess: 1/M and its u
    beforehand, m/mN. Returns the area at the set pressure that dwell j has, carried to time t.
    """
    thin = max(sum(d.size for d in dwells) // MOST_FITTED, 1)
    picked = []
    for d in dwells:
        group = max(min(thin, d.size // 4), 1)
        picked.append(d[: d.size - d.size % group].reshape(-1, group))
    area, excess, time = (
        np.concatenate([values[p].mean(axis=1) for p in picked]) for values in (area, excess, time)
    )
    which = np.repeat(np.arange(len(dwells)), [len(p) for p in picked])
    origin = float(time[0])
    t = time - origin
    level = np.array([area[which == j].mean() for j in range(len(dwells))])
    noise = 0.012 + 1.05 * float(np.median(np.abs(np.diff(area))))  # cm^2, of one row
    best, decay, least = np.zeros(len(dwells) + 3), np.inf, np.inf
    for trial in (600.0, 1200.0, 2500.0, 5000.0, 10000.0):
        matrix = np.zeros((t.size + 3, len(dwells) + 3))
        matrix[np.arange(t.size), which] = 1.0
        matrix[:-3, -1] = -excess * level[which]
        matrix[:-3, -2] = -t * level[which]
        matrix[:-3, -3] = -trial * (1.0 - np.exp(-t / trial)) * level[which]
        # the rates are known to lie within 0 and 2e-5 per second: a prior of 7e-6 +- 7e-6 on each
        matrix[-2, -2] = matrix[-1, -3] = noise / 7e-6
        matrix[-3, -1] = noise / guess[1]
        aim = np.concatenate([area, [noise * guess[0] / guess[1], noise, noise]])
        fit = np.linalg.lstsq(matrix, aim, rcond=None)[0]
        rest = float(np.sum((aim - matrix @ fit) ** 2))
        if rest < least:
            best, decay, least = fit, trial, rest

    def at(dwell: int, when: float) -> float:
        lost = best[-2] * (when - origin)
        lost += best[-3] * decay * (1.0 - np.exp(-(when - origin) / decay))
        return float(best[dwell] - level[dwell] * lost)

    return at


def told_least_squares(log: SimulatedLog, sheet: RunSheet, truth: Truth) -> Reading:
    """Least squares with strokes, renewals, contact and the form of the creep known.

    Each film's dwells are fitted together, their areas brought to the set pressure; a stroke takes the gap
    between the two dwells around it, both carried to its middle.
    """
    perimeter, face = _perimeter_and_face(sheet.substrate or Substrate())
    target = sheet.dipping.pressure.value if sheet.dipping.pressure else float(log.pressure[0])
    depth = _depth(log, sheet, truth.contact)
    dwells = _quiet(log, truth, target)
    row = float(np.median(np.diff(log.time)))
    width = 2 * int(2.0 / row) + 1
    smooth = uniform_filter1d(log.pressure, width)
    told = sheet.dipping.modulus
    guess = (0.005, 0.004) if told is None else (1.0 / told.value, 0.03 / told.value)
    dwells = [d[width // 2 : d.size - width // 2] for d in dwells if d.size > width + 2]
    bounds = [-np.inf, *(r[1] for r in truth.renewals), np.inf]
    strokes = []
    for begin, finish in itertools.pairwise(bounds):
        own = [d for d in dwells if begin < log.time[d[0]] < finish]
        if not own:
            continue
        at = _carried(log.area, smooth - target, log.time, own, guess)
        for s in truth.strokes:
            if not (s.judgeable and begin < s.start < finish):
                continue
            before = [j for j, d in enumerate(own) if log.time[d[-1]] <= s.start]
            after = [j for j, d in enumerate(own) if log.time[d[0]] >= s.end]
            between = [
                o for o in truth.strokes
                if before and after and o is not s
                and log.time[own[before[-1]][-1]] <= o.start and o.end <= log.time[own[after[0]][0]]
            ]  # fmt: skip
            ratio = None
            if before and after and not between:
                middle = 0.5 * (s.start + s.end)
                taken = at(before[-1], middle) - at(after[0], middle)
                here, there = np.interp([s.start - row, s.end + row], log.time, depth)
                ratio = taken / _coated(perimeter, face, float(here), float(there))
            strokes.append(FoundStroke(s.start, s.end, s.direction, ratio, None))
    return Reading(tuple(strokes), renewals=truth.renewals)
