"""A branch read off a figure, cut into convex pieces that meet: an exact partition of few points.

Works in the plane of the figure (area and pressure as shares of their axes), because there a reading
errs alike along both. Drawn against area a film's branches are straight or convex (they stiffen on the
way), so a piece may bend one way only; whatever bends the other way is a new piece.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = ["Figure", "Part", "cut", "figure_of"]

FloatArray = NDArray[np.float64]

DEGREES: Final = (1, 2, 3)
FEWEST: Final = (2, 5, 8)  # points a piece of each degree needs
PENALTY: Final = 4.0  # of a piece, beside ln n for each of its parameters
STEEPEST: Final = 60.0  # slope in the figure beyond which a line counts as upright
# Reading errors, shares of the axes: a point read off a figure is good to a few thousandths of the axis
# (common practice: the thickness of a drawn line). Start values; the points then decide, within
# a factor of about `SPREAD` (one sigma of ln).
PRESSURE_READING: Final = 2.0e-3
AREA_READING: Final = 0.8e-3
SPREAD: Final = 0.7
# No film follows a cubic exactly: readings are never taken for better than this share of either axis.
SHAPE: Final = 2.0e-3
ROUNDED: Final = (
    5.0e-3  # share of the axis by which two pieces may fail to meet: the knee is rounded
)
LEAST_START: Final = (
    0.05  # slope in the figure; a rising piece does not begin by falling more steeply
)
SWEEPS: Final = 2
HOPELESS: Final = 200.0  # cost


@dataclass(frozen=True)
class Figure:
    """Points in the plane of the figure, all (n,): u grows with compression, s the uncertainty of v."""

    u: FloatArray
    v: FloatArray
    s: FloatArray
    width: float
    height: float
    foot: float
    start: float
    pressure_reading: float
    area_reading: float


@dataclass(frozen=True)
class Part:
    """One piece: points first to last - 1; slopes (dv/du) at its ends and of its chord, u of a slope.

    value : polynomial of (u - centre) / half, lowest power first.
    """

    first: int
    last: int
    degree: int
    start: float
    end: float
    chord: float
    u_slope: float
    centre: float
    half: float
    value: FloatArray

    @property
    def count(self) -> int:
        """Points of the piece."""
        return self.last - self.first

    def at(self, u: FloatArray) -> FloatArray:
        """v at (m,) u."""
        t = (u - self.centre) / self.half
        return np.asarray(np.polynomial.polynomial.polyval(t, self.value))

    def slope_at(self, u: float) -> float:
        """dv/du at u."""
        t = (u - self.centre) / self.half
        by_t = np.polynomial.polynomial.polyder(self.value)
        return float(np.polynomial.polynomial.polyval(t, by_t)) / self.half


@dataclass(frozen=True)
class _Fits:
    """Every possible piece, (n, n + 1, degrees): cost, values at and one point beyond each end, u²."""

    cost: FloatArray
    ends: FloatArray  # (4, ...): one before the first, first, last, one after the last
    variance: FloatArray  # (4, ...)


def figure_of(area: FloatArray, pressure: FloatArray, floor: float) -> tuple[Figure, list[Part]]:
    """The points as a figure with its reading errors, and its pieces.

    Parameters
    ----------
    area, pressure : (n,) nm^2, largest area first, and mN/m.
    floor : mN/m, below which no pressure reading is known (its rounding).
    """
    width = max(float(np.ptp(area)), 1e-12)
    height = max(float(np.ptp(pressure)), 1e-12)
    u, v = (area[0] - area) / width, (pressure - pressure.min()) / height
    least = max(SHAPE, floor / height)
    reading = (max(PRESSURE_READING, least), AREA_READING)
    slope = _local_slopes(u, v)
    parts: list[Part] = []
    s = np.full(u.size, reading[0])
    for _ in range(SWEEPS):
        s = np.hypot(reading[0], np.minimum(slope, STEEPEST) * reading[1])
        parts = cut(u, v, s)
        slope = np.abs(
            np.concatenate([[p.slope_at(float(t)) for t in u[p.first : p.last]] for p in parts])
        )
        reading = _readings(u, v, slope, parts, least)
    s = np.hypot(reading[0], np.minimum(slope, STEEPEST) * reading[1])
    parts = cut(u, v, s)
    foot = float(pressure.min())
    return Figure(u, v, s, width, height, foot, float(area[0]), *reading), parts


def _local_slopes(u: FloatArray, v: FloatArray) -> FloatArray:
    step = np.diff(v) / np.maximum(np.diff(u), 1e-6)
    left = np.concatenate([step[:1], step])
    right = np.concatenate([step, step[-1:]])
    wide = (v[2:] - v[:-2]) / np.maximum(u[2:] - u[:-2], 1e-6)
    both = np.concatenate([step[:1], wide, step[-1:]])
    return np.asarray(np.median(np.abs(np.stack([left, right, both])), axis=0))


def _readings(
    u: FloatArray, v: FloatArray, slope: FloatArray, parts: list[Part], least: float
) -> tuple[float, float]:
    """Most probable reading errors along both axes, from the residuals of the pieces and the priors."""
    residual = np.concatenate([v[p.first : p.last] - p.at(u[p.first : p.last]) for p in parts])
    free = np.concatenate(
        [np.full(p.count, max(p.count - p.degree - 1, 0) / p.count) for p in parts]
    )
    q = np.geomspace(0.25, 4.0, 17)
    sp, sa = np.meshgrid(PRESSURE_READING * q, AREA_READING * q, indexing="ij")
    steep = np.minimum(slope, STEEPEST)
    variance = sp[..., None] ** 2 + (steep * sa[..., None]) ** 2
    share = np.maximum(free, 1e-3)
    # residuals are smaller than errors by the degrees of freedom the pieces took; Student's t of
    # five degrees keeps one misread point from deciding
    misfit = residual**2 / (variance * share)
    term = free * (0.5 * np.log(variance) + 3.0 * np.log1p(misfit / 5.0))
    prior = (np.log(sp / PRESSURE_READING) ** 2 + np.log(sa / AREA_READING) ** 2) / (
        2.0 * SPREAD**2
    )
    best = np.unravel_index(int(np.argmin(term.sum(axis=-1) + prior)), sp.shape)
    return max(float(sp[best]), least), max(float(sa[best]), 0.15 * SHAPE)


def cut(u: FloatArray, v: FloatArray, s: FloatArray) -> list[Part]:
    """The pieces of least total cost: misfit, failure to meet, and a penalty for each parameter."""
    n = u.size
    fits = _all_fits(u, v, s)
    penalty = PENALTY + np.log(n) * (np.array(DEGREES) + 1.0)
    best = fits.cost + penalty
    best[1:] = np.inf
    back = np.full((n, n + 1, len(DEGREES), 2), -1, dtype=np.int64)
    for i in range(2, n - 1):
        before = best[:i, i]  # (h, degree)
        if not np.isfinite(before).any():
            continue
        # a way here that costs far more than the best one is never part of the cheapest whole
        h, e = np.nonzero(before < before.min() + HOPELESS)
        # both pieces at the last point of the one and at the first point of the other
        gap_left = fits.ends[2, h, i, e][:, None, None] - fits.ends[0, i, i + 1 :][None]
        gap_right = fits.ends[3, h, i, e][:, None, None] - fits.ends[1, i, i + 1 :][None]
        var_left = fits.variance[2, h, i, e][:, None, None] + fits.variance[0, i, i + 1 :][None]
        var_right = fits.variance[3, h, i, e][:, None, None] + fits.variance[1, i, i + 1 :][None]
        miss = np.minimum(
            gap_left**2 / (var_left + ROUNDED**2), gap_right**2 / (var_right + ROUNDED**2)
        )
        miss = np.where(gap_left * gap_right <= 0, 0.0, miss)
        total = before[h, e][:, None, None] + miss
        choice = np.argmin(total, axis=0)
        value = np.take_along_axis(total, choice[None], axis=0)[0]
        best[i, i + 1 :] = fits.cost[i, i + 1 :] + penalty + value
        back[i, i + 1 :, :, 0] = h[choice]
        back[i, i + 1 :, :, 1] = e[choice]
    last = best[:, n]
    i, d = divmod(int(np.argmin(last)), len(DEGREES))
    j = n
    out: list[Part] = []
    while True:
        out.append(_part(u, v, s, i, j, DEGREES[d]))
        if i == 0:
            return out[::-1]
        j, i, d = i, int(back[i, j, d, 0]), int(back[i, j, d, 1])


def _all_fits(u: FloatArray, v: FloatArray, s: FloatArray) -> _Fits:
    n = u.size
    shape = (n, n + 1, len(DEGREES))
    cost = np.full(shape, np.inf)
    ends, variance = np.zeros((4, *shape)), np.full((4, *shape), 1.0)
    first, stop = np.triu_indices(n + 1, 2)
    first, stop = first.astype(np.int64), stop.astype(np.int64)
    centre = 0.5 * (u[first] + u[stop - 1])
    half = np.maximum(0.5 * (u[stop - 1] - u[first]), 1e-9)
    moments, cross = _moments(u, v, s, centre, half)
    outer = np.concatenate([[2 * u[0] - u[1]], u, [2 * u[-1] - u[-2]]])
    places = np.stack([outer[first], outer[first + 1], outer[stop], outer[stop + 1]], axis=1)
    places = np.clip((places - centre[:, None]) / half[:, None], -50.0, 50.0)
    powers = places[..., None] ** np.arange(max(DEGREES) + 1)
    for k, degree in enumerate(DEGREES):
        p = degree + 1
        at = np.flatnonzero(stop - first >= FEWEST[k])
        if at.size == 0:
            continue
        normal = moments[at][:, np.add.outer(np.arange(p), np.arange(p))]
        normal += 1e-9 * normal[:, :1, :1] * np.eye(p)
        inverse = np.linalg.inv(normal)
        right = cross[at, :p]
        c = (inverse @ right[..., None])[..., 0]
        fitted = (normal @ c[..., None])[..., 0]
        rss = cross[at, -1] - np.sum(c * (2.0 * right - fitted), axis=1)
        rss = np.maximum(rss, 0.0)
        if degree > 1:
            rss = np.where(_convex(c) & _one_way(c, half[at]), rss, np.inf)
        i, j = first[at], stop[at]
        cost[i, j, k] = rss
        basis = powers[at, :, :p]
        ends[:, i, j, k] = (basis @ c[..., None])[..., 0].T
        variance[:, i, j, k] = np.sum((basis @ inverse) * basis, axis=-1).T
    return _Fits(cost, ends, variance)


def _moments(
    u: FloatArray, v: FloatArray, s: FloatArray, centre: FloatArray, half: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Weighted sums over every piece, in its own coordinate t from -1 to 1, of all that begin alike at once.

    Returns Σ w t^k for k = 0..6 and Σ w v t^k for k = 0..3, Σ w v² last; pieces in the order of
    `np.triu_indices(n + 1, 2)`.
    """
    n = u.size
    highest = 2 * max(DEGREES)
    first, stop = np.triu_indices(n + 1, 2)
    moments = np.empty((first.size, highest + 1))
    cross = np.empty((first.size, max(DEGREES) + 2))
    w = s**-2.0
    begin = 0
    for i in range(n - 1):
        # all pieces that begin at point i: one triangle of powers each
        count = n - 1 - i
        rows = slice(begin, begin + count)
        begin += count
        t = (u[i:][None, :] - centre[rows, None]) / half[rows, None]
        term = np.where(np.arange(n - i)[None, :] < (stop[rows] - i)[:, None], w[i:][None, :], 0.0)
        for k in range(highest + 1):
            moments[rows, k] = term.sum(axis=1)
            if k < cross.shape[1] - 1:
                cross[rows, k] = term @ v[i:]
            if k == 0:
                cross[rows, -1] = term @ v[i:] ** 2
            term = term * t
    return moments, cross


def _convex(c: FloatArray) -> NDArray[np.bool_]:
    """Whether (m, d + 1) polynomials bend upwards at both ends of -1 to 1."""
    bend = 2.0 * c[:, 2]
    change = 6.0 * c[:, 3] if c.shape[1] > 3 else np.zeros(c.shape[0])
    return np.asarray(np.minimum(bend - change, bend + change) >= 0)


def _one_way(c: FloatArray, half: FloatArray) -> NDArray[np.bool_]:
    """Whether (m, d + 1) polynomials rise all along, or do not rise even at their end."""
    orders = np.arange(1, c.shape[1])
    start = np.sum(c[:, 1:] * orders * (-1.0) ** (orders - 1), axis=1) / half
    end = np.sum(c[:, 1:] * orders, axis=1) / half
    return np.asarray((start >= -LEAST_START) | (end <= 0))


def _part(u: FloatArray, v: FloatArray, s: FloatArray, i: int, j: int, degree: int) -> Part:
    t, y, w = u[i:j], v[i:j], 1.0 / s[i:j]
    centre, half = 0.5 * float(t[0] + t[-1]), max(0.5 * float(t[-1] - t[0]), 1e-9)
    basis = np.vander((t - centre) / half, degree + 1, increasing=True) * w[:, None]
    c = np.linalg.lstsq(basis, y * w, rcond=None)[0]
    line = w**2
    mean = float((line * t).sum() / line.sum())
    spread = float((line * (t - mean) ** 2).sum())
    by_t = np.polynomial.polynomial.polyder(c)
    start, end = np.polynomial.polynomial.polyval(np.array([-1.0, 1.0]), by_t) / half
    chord = float(
        np.polynomial.polynomial.polyval(1.0, c) - np.polynomial.polynomial.polyval(-1.0, c)
    )
    return Part(
        i, j, degree, float(start), float(end), chord / (2 * half),
        1.0 / np.sqrt(max(spread, 1e-12)), centre, half, np.asarray(c),
    )  # fmt: skip
