"""Search the reading at which the lower edge touches, from where the film starts and stops going."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.geometry import Geometry
from transfer.ratio_curves import RemovalCurve

__all__ = ["ContactSearch", "chi_squared", "search_contact"]

FloatArray = NDArray[np.float64]

_GRID = 120
# A move that fits badly at a reading (late start, failed part) may weigh against it by this much, no more.
_CAP = 60.0
# How much worse "edge always in water" must fit before a contact inside the travel is believed.
_INSIDE = 6.0
# Places that fit worse than the best by less than this (two standard deviations) are not excluded.
_NOT_EXCLUDED = 4.0
# Delays between dipper and trough area to try, s: the film leaves the water line, and the barriers follow,
# a little late.
_DELAYS = (0.0, 0.5, 1.0, 2.0, 4.0, 8.0)
# Near either end of the way the transfer is taken as even over this part of the travel, or this many mm.
_NEAR_PART = 0.2
_NEAR_MM = 4.0
_LEAST_ROWS = 3


@dataclass(frozen=True)
class ContactSearch:
    """Best reading for one sign, mm, with its u; delay in s; score (chi-squared, scaled and capped).

    outside : the data do not exclude that the edge is in the water throughout. reach : how far inside the
    travel, mm from its air end, the contact lies or, where outside, could lie all the same.
    """

    at: float
    u: float
    delay: float
    score: float
    outside: bool
    reach: float


def chi_squared(
    curve: RemovalCurve, geometry: Geometry, reads: str, grid: FloatArray, delay: float = 0.0
) -> FloatArray:
    """Chi-squared of one whole move for each contact reading, its ratio fitted at each.

    Parameters
    ----------
    curve : RemovalCurve
    geometry : Geometry
    reads : str
        "depth" or "height".
    grid : (g,) contact readings, mm.
    delay : float
        Of the area behind the dipper, s.

    Returns
    -------
    (g,) array
    """
    sign = 1.0 if reads == "depth" else -1.0
    x = np.concatenate([[curve.start], _delayed(curve, delay), [curve.end]])
    y = np.concatenate([[0.0], curve.removed, [curve.total]])
    end_variance = curve.u_total**2
    weight = 1.0 / np.concatenate([[end_variance], curve.variance, [end_variance]])
    wet = geometry.coated(sign * (x[None, :] - grid[:, None]))
    crossed = np.abs(wet - wet[:, :1])
    xx = crossed**2 @ weight
    xy = crossed @ (weight * y)
    yy = float((weight * y**2).sum())
    return np.asarray(yy - np.where(xx > 0, xy**2 / np.maximum(xx, 1e-300), 0.0))


def search_contact(
    curves: list[RemovalCurve],
    geometry: Geometry,
    travel: tuple[float, float],
    signs: tuple[str, ...],
) -> dict[str, ContactSearch]:
    """Find the contact for each sign the reading may have.

    First whole moves against readings and delays; then, around the best, only the stretches next to the
    surface and next to the deep end, each with a slope of its own, so that uneven transfer elsewhere does
    not move the contact. The deep ends, whose readings are known, fix the delay.

    Parameters
    ----------
    curves : list of RemovalCurve
        Moves that took clearly more film than noise.
    geometry : Geometry
    travel : (lowest, highest) reading, mm.
    signs : tuple of str
        Of "depth" and "height".

    Returns
    -------
    dict of str to ContactSearch
    """
    usual = float(np.median([c.time_end - c.time_start for c in curves]))
    delays = [d for d in _DELAYS if d <= 0.15 * usual]
    grids = {reads: _grid(reads, travel) for reads in signs}
    tables = {
        reads: np.stack(
            [[chi_squared(c, geometry, reads, grids[reads], d) for c in curves] for d in delays]
        )
        for reads in signs
    }
    points = np.asarray([c.reading.size + 1 for c in curves])
    # how badly the best of all fits each move is the measure of its misfit elsewhere
    least = np.min([table.min(axis=(0, 2)) for table in tables.values()], axis=0)
    scale = np.maximum(least / points, 1.0)
    out: dict[str, ContactSearch] = {}
    for reads in signs:
        scaled = (tables[reads] - least[None, :, None]) / scale[None, :, None]
        score = np.minimum(scaled, _CAP).sum(axis=1)
        at_delay, at_grid = np.unravel_index(int(np.argmin(score)), score.shape)
        best = float(score[at_delay, at_grid])
        outside = at_grid == 0 or float(score[:, 0].min()) - best < _INSIDE
        coarse, delay = float(grids[reads][at_grid]), delays[at_delay]
        u = 0.1 * (travel[1] - travel[0])
        reach = _reach(grids[reads], score.min(axis=0), reads, travel)
        if not outside:
            coarse, u, delay = _refine(curves, geometry, reads, travel, coarse, delay)
        out[reads] = ContactSearch(coarse, u, delay, best, bool(outside), reach)
    return out


def _grid(reads: str, travel: tuple[float, float]) -> FloatArray:
    """Contact readings to try: first a place well beyond the air end (edge always in water)."""
    low, high = travel
    span = high - low
    beyond = low - 0.2 * span if reads == "depth" else high + 0.2 * span
    inside = np.linspace(low - 0.02 * span, high + 0.02 * span, _GRID + 1)
    return np.concatenate([[beyond], inside])


def _reach(grid: FloatArray, profile: FloatArray, reads: str, travel: tuple[float, float]) -> float:
    """How far inside the travel, mm from its air end, the deepest place lies that is not excluded."""
    places = grid[profile - profile.min() < _NOT_EXCLUDED]
    inward = places - travel[0] if reads == "depth" else travel[1] - places
    return max(0.0, float(inward.max()))


def _delayed(curve: RemovalCurve, delay: float) -> FloatArray:
    """Reading of the dipper a little earlier than each bin."""
    if delay == 0.0:
        return curve.reading
    time = np.concatenate([[curve.time_start], curve.time, [curve.time_end]])
    reading = np.concatenate([[curve.start], curve.reading, [curve.end]])
    return np.asarray(np.interp(curve.time - delay, time, reading))


@dataclass(frozen=True)
class _Stretch:
    """Rows of one move near one end: film still to go or already gone (y, cm^2) against delayed reading."""

    curve: RemovalCurve
    rows: NDArray[np.intp]
    y: FloatArray
    weight: FloatArray
    anchor: float  # variance of the level the stretch starts from or ends at
    deep_end: float | None  # its reading, for stretches at the deep end


def _stretches(
    curves: list[RemovalCurve], reads: str, at: float, delay: float, reach: float
) -> list[_Stretch]:
    """Cut the stretches next to the surface and next to the deep end out of every move."""
    sign = 1.0 if reads == "depth" else -1.0
    out: list[_Stretch] = []
    for curve in curves:
        depth = sign * (_delayed(curve, delay) - at)
        ends = sign * (np.asarray([curve.start, curve.end]) - at)
        deepest = float(ends.max())
        down = ends[1] > ends[0]
        shallow_y = curve.removed if down else curve.total - curve.removed
        deep_y = curve.total - curve.removed if down else curve.removed
        crosses = float(ends.min()) < 0.0
        near = np.flatnonzero((depth > -reach) & (depth < reach))
        deep = np.flatnonzero(depth > deepest - reach)
        anchor = curve.u_total**2
        if crosses and near.size >= _LEAST_ROWS:
            out.append(
                _Stretch(curve, near, shallow_y[near], 1 / curve.variance[near], anchor, None)
            )
        if deepest > 2.0 * reach and deep.size >= _LEAST_ROWS:
            end = curve.end if down else curve.start
            out.append(_Stretch(curve, deep, deep_y[deep], 1 / curve.variance[deep], anchor, end))
    return out


def _stretch_misfit(
    stretch: _Stretch, geometry: Geometry, reads: str, grid: FloatArray, delay: float
) -> FloatArray:
    """Chi-squared of one stretch at each contact reading; its slope free, its level known to `anchor`."""
    sign = 1.0 if reads == "depth" else -1.0
    x = _delayed(stretch.curve, delay)[stretch.rows]
    if stretch.deep_end is None:
        cover = geometry.mean_coated(sign * (x[None, :] - grid[:, None]), stretch.curve.bin_width)
    else:
        cover = np.abs(x - stretch.deep_end)[None, :] * np.ones((grid.size, 1))
    w, y = stretch.weight, stretch.y
    one = float(w.sum()) + 1.0 / stretch.anchor
    xx = cover**2 @ w
    x1 = cover @ w
    xy = cover @ (w * y)
    y1, yy = float(w @ y), float(w @ y**2)
    determinant = np.maximum(xx * one - x1**2, 1e-300)
    explained = (one * xy**2 - 2.0 * x1 * xy * y1 + xx * y1**2) / determinant
    return np.asarray(yy - explained)


def _refine(
    curves: list[RemovalCurve],
    geometry: Geometry,
    reads: str,
    travel: tuple[float, float],
    at: float,
    delay: float,
) -> tuple[float, float, float]:
    """Contact, its u, and delay from the stretches near both ends of the moves."""
    span = travel[1] - travel[0]
    reach = max(_NEAR_MM, _NEAR_PART * span)
    step, delay_step = span / _GRID, max(0.25, 0.5 * delay)
    start = at
    for round_ in range(4):
        stretches = _stretches(curves, reads, at, delay, reach)
        if not any(s.deep_end is None for s in stretches):
            return at, 0.1 * span, delay
        places = at + step * np.linspace(-2.0, 2.0, 21)
        delays = np.unique(np.maximum(delay + delay_step * np.linspace(-2.0, 2.0, 9), 0.0))
        score, table = _score(stretches, geometry, reads, places, delays)
        best_delay, best_place = np.unravel_index(int(np.argmin(score)), score.shape)
        at, delay = float(places[best_place]), float(delays[best_delay])
        on_edge = best_place in (0, places.size - 1) or (
            best_delay == delays.size - 1 or (best_delay == 0 and delays[0] > 0.0)
        )
        if not on_edge:
            step, delay_step = step / 3.0, delay_step / 2.0
        if round_ == 3 or abs(at - start) > 0.2 * span:
            break
    return at, _spread(curves, stretches, geometry, reads, at, delay, span, table), delay


def _score(
    stretches: list[_Stretch],
    geometry: Geometry,
    reads: str,
    places: FloatArray,
    delays: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Pooled, scaled and capped misfit, (delays, places), and each stretch's own, (delays, s, places)."""
    table = np.stack(
        [[_stretch_misfit(s, geometry, reads, places, float(d)) for s in stretches] for d in delays]
    )
    freedom = np.asarray([max(1, s.rows.size - 1) for s in stretches])
    least = table.min(axis=(0, 2))
    scale = np.maximum(least / freedom, 1.0)
    scaled = (table - least[None, :, None]) / scale[None, :, None]
    return np.minimum(scaled, _CAP).sum(axis=1), table


def _spread(
    curves: list[RemovalCurve],
    stretches: list[_Stretch],
    geometry: Geometry,
    reads: str,
    at: float,
    delay: float,
    span: float,
    table: FloatArray,
) -> float:
    """Standard uncertainty of the contact: profile of the misfit, and scatter between strokes."""
    half = 0.002 * span
    delays = np.unique(np.maximum(delay + max(0.1, 0.3 * delay) * np.linspace(-2, 2, 9), 0.0))
    curvature = half
    for _ in range(6):
        places = at + half * np.linspace(-2.0, 2.0, 41)
        score, _table = _score(stretches, geometry, reads, places, delays)
        profile = score.min(axis=0)
        inside = places[profile - profile.min() <= 1.0]
        curvature = 0.5 * float(inside.max() - inside.min())
        if inside.max() < places[-1] and inside.min() > places[0]:
            break
        half *= 2.0
    places = at + 0.05 * span * np.linspace(-1.0, 1.0, 101)
    near = [s for s in stretches if s.deep_end is None]
    own = np.asarray(
        [places[int(np.argmin(_stretch_misfit(s, geometry, reads, places, delay)))] for s in near]
    )
    rising = np.asarray([s.curve.end > s.curve.start for s in near])
    scatter = bias = 0.0
    if len(near) >= 3:
        scatter = 1.4826 * float(np.median(np.abs(own - np.median(own)))) / np.sqrt(len(near))
    if rising.any() and (~rising).any():
        # what the delay does not explain of the difference between both ways stays in doubt
        bias = 0.5 * abs(float(np.median(own[rising]) - np.median(own[~rising])))
    floor = float(places[1] - places[0]) / np.sqrt(12.0 * len(near))
    parts = (curvature, scatter, 0.5 * bias, floor, _model_doubt(curves, delay))
    return float(np.sqrt(sum(part**2 for part in parts)))


def _model_doubt(curves: list[RemovalCurve], delay: float) -> float:
    """What the model leaves open, mm, common to all strokes.

    The film does not lag by a pure delay, and area and position of one row were not read at one instant:
    the dipper's way within a fifth of a row's time and a quarter of the delay is not known.
    """
    speed = float(
        np.median([abs(c.end - c.start) / max(c.time_end - c.time_start, 1e-9) for c in curves])
    )
    row = float(np.median([c.row_seconds for c in curves]))
    return float(np.hypot(0.2 * speed * row, 0.25 * speed * delay))
