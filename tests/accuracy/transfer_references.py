"""Two yardsticks: what a hasty spreadsheet gets, and what least squares gets when told the strokes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import uniform_filter1d
from transfer_matching import FoundStroke, Reading
from transfer_truth import SimulatedLog, Truth

from isotherm.sheet import RunSheet, Substrate

__all__ = ["spreadsheet", "told_least_squares"]

FloatArray = NDArray[np.float64]


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


def spreadsheet(log: SimulatedLog, sheet: RunSheet) -> Reading:
    """Before minus after: runs of one sign of the row-to-row difference, area read at either end.

    A run longer than 2 mm is a stroke; a standing row ends it. No creep, no pressure, no renewals.
    """
    perimeter, face = _perimeter_and_face(sheet.substrate or Substrate())
    given = sheet.dipping.surface_at
    depth = _depth(log, sheet, given.value if given is not None else float(log.position[0]))
    sign = np.sign(np.round(np.diff(depth), 2))
    edges = np.flatnonzero(np.diff(sign)) + 1
    strokes = []
    bounds = [0, *edges.tolist(), sign.size]
    for lo, hi in zip(bounds[:-1], bounds[1:], strict=True):
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
    """Rows of the dwell before each stroke and after the last, pressure held."""
    pressure = uniform_filter1d(log.pressure, 5)
    fine = np.abs(pressure - target) < 0.5
    for begin, finish in truth.renewals:
        fine &= ~((log.time > begin - 2.0) & (log.time < finish + 20.0))
    starts = [s.start for s in truth.strokes] + [float(log.time[-1]) + 1.0]
    ends = [float(log.time[0]) - 1.0] + [s.end for s in truth.strokes]
    return [
        np.flatnonzero(fine & (log.time > e + 3.0) & (log.time < s - 1.0))
        for s, e in zip(starts, ends, strict=True)
    ]


def _compliance(
    log: SimulatedLog, smooth: FloatArray, dwells: list[NDArray[np.intp]], sheet: RunSheet
) -> float:
    """1/M (m/mN) from the sheet, weighed with the dwells' own slope of ln A against pressure."""
    top = bottom = 0.0
    rest = 0.0
    count = 0
    for rows in dwells:
        if rows.size < 12:
            continue
        t = log.time[rows] - log.time[rows].mean()
        basis = np.vander(t / max(float(np.abs(t).max()), 1e-9), 3)
        both = np.column_stack([np.log(log.area[rows]), smooth[rows]])
        both = both - basis @ np.linalg.lstsq(basis, both, rcond=None)[0]
        top -= float(both[:, 0] @ both[:, 1])
        bottom += float(both[:, 1] @ both[:, 1])
        rest += float(both[:, 0] @ both[:, 0])
        count += rows.size
    if bottom == 0.0:
        return 1.0 / sheet.dipping.modulus.value if sheet.dipping.modulus else 0.0
    own = top / bottom
    own_variance = max(rest - own * top, 1e-15) / max(count, 1) / bottom * 5.0
    if sheet.dipping.modulus is None:
        return max(own, 0.0)
    told = 1.0 / sheet.dipping.modulus.value
    told_variance = (0.03 * told) ** 2
    return (own / own_variance + told / told_variance) / (1.0 / own_variance + 1.0 / told_variance)


def told_least_squares(log: SimulatedLog, sheet: RunSheet, truth: Truth) -> Reading:
    """Least squares with strokes, renewals and contact known: level per dwell and a local creep rate.

    Each stroke uses the two dwells on either side; their areas, brought to the set pressure, are fitted by a
    level each and one relative rate.
    """
    perimeter, face = _perimeter_and_face(sheet.substrate or Substrate())
    target = sheet.dipping.pressure.value if sheet.dipping.pressure else float(log.pressure[0])
    depth = _depth(log, sheet, truth.contact)
    dwells = _quiet(log, truth, target)
    row = float(np.median(np.diff(log.time)))
    smooth = uniform_filter1d(log.pressure, max(int(4.0 / row), 1))
    per_pressure = _compliance(log, smooth, dwells, sheet)
    film = log.area * (1.0 + (smooth - target) * per_pressure)
    strokes = []
    for i, s in enumerate(truth.strokes):
        if not s.judgeable:
            continue
        broken = [r for r in truth.renewals]
        near = [
            j
            for j in range(max(i - 1, 0), min(i + 3, len(dwells)))
            if dwells[j].size >= 2
            and not any(
                min(log.time[dwells[j][0]], s.start) < r[0] < max(log.time[dwells[j][-1]], s.end)
                for r in broken
            )
        ]
        ratio = None
        if i in near and i + 1 in near:
            rows = np.concatenate([dwells[j] for j in near])
            which = np.concatenate([np.full(dwells[j].size, k) for k, j in enumerate(near)])
            level = np.array([film[dwells[j]].mean() for j in near])
            matrix = np.zeros((rows.size, len(near) + 1))
            matrix[np.arange(rows.size), which] = 1.0
            middle = 0.5 * (s.start + s.end)
            matrix[:, -1] = (log.time[rows] - middle) * level[which]
            fit = np.linalg.lstsq(matrix, film[rows], rcond=None)[0]
            a, b = near.index(i), near.index(i + 1)
            # each level is the film's area carried to the middle of the stroke
            here, there = np.interp([s.start - row, s.end + row], log.time, depth)
            ratio = float(fit[a] - fit[b]) / _coated(perimeter, face, here, there)
        strokes.append(FoundStroke(s.start, s.end, s.direction, ratio, None))
    return Reading(tuple(strokes), renewals=truth.renewals)
