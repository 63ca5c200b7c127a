"""Is there a knee in this window? One rounded hinge against the best smooth polynomial."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = ["Candidate", "Verdict", "judge_knee", "rounding_floor"]

FloatArray = NDArray[np.float64]

# No rounding shape is exact: misfits below this share of a window's range decide nothing (our choice).
INDIFFERENT: Final = 5e-4
SMOOTH_DEGREE: Final = 6  # a smooth rival gets as many parameters as the richest knee model
POSITIONS: Final = 24  # hinges tried along a window, before the best is refined
WIDTH_GRID: Final = (0.008, 0.035, 0.14)  # rounding widths tried, shares of half a window


@dataclass(frozen=True)
class Candidate:
    """A possible knee: x, width, slopes (moduli, mN/m) just left and right, and its evidence (ΔBIC)."""

    x: float
    width: float
    before: float
    after: float
    evidence: float


@dataclass(frozen=True)
class Verdict:
    """The best knee of a window: BIC and weighted residual sum of its model, and of the best polynomial's."""

    knee: Candidate
    bic: float
    knee_rss: float
    smooth_rss: float


def judge_knee(
    x: FloatArray, y: FloatArray, sigma: FloatArray, *, slopes: bool = False
) -> Verdict | None:
    """The best single rounded knee in a window against the best smooth polynomial.

    Parameters
    ----------
    x, y, sigma : (n,) window of nodes, x increasing.
    slopes : whether the moduli beside the knee are wanted; NaN otherwise.

    Returns
    -------
    Verdict or None
        None where the window has too few nodes to tell.
    """
    n = x.size
    if n < 6:
        return None
    centre, half = 0.5 * (x[0] + x[-1]), 0.5 * (x[-1] - x[0])
    if half <= 0:
        return None
    t = (x - centre) / half
    weight = 1.0 / sigma
    target = y * weight
    smooth_degree = min(SMOOTH_DEGREE, n // 3)
    powers = np.polynomial.chebyshev.chebvander(t, smooth_degree) * weight[:, None]
    q, _ = np.linalg.qr(powers)
    along = q.T @ target
    total = float(target @ target)
    rss_smooth = np.maximum(total - np.cumsum(along**2), 0.0)
    floor = rounding_floor(y, weight)
    orders = np.arange(1, smooth_degree + 1)
    bics = n * np.log(rss_smooth[orders] + floor) + (orders + 1) * np.log(n)
    smoothest = int(np.argmin(bics))
    bic_smooth = float(bics[smoothest])
    fitter = _HingeFitter(t, weight, target, q, along, floor)
    edge = 2 if n < 30 else 3
    positions = t[edge : n - edge]
    if positions.size > POSITIONS:
        positions = positions[:: positions.size // POSITIONS + 1]
    widths = np.array(WIDTH_GRID) if n >= 16 else np.array([WIDTH_GRID[0]])
    coarse = fitter.best(np.repeat(positions, widths.size), np.tile(widths, positions.size))
    if coarse is None:
        return None
    gap = float(np.max(np.diff(positions))) if positions.size > 1 else 0.1
    shifts = coarse.at + gap * np.array([-0.6, -0.3, 0.0, 0.3, 0.6])
    wider = coarse.width * (np.array([0.55, 1.0, 1.6]) if n >= 16 else np.array([1.0]))
    fine = fitter.best(np.repeat(shifts, wider.size), np.tile(wider, shifts.size))
    best = fine if fine is not None and fine.bic < coarse.bic else coarse
    before, after = fitter.slopes(best, powers) if slopes else (math.nan, math.nan)
    knee = Candidate(
        float(centre + half * best.at),
        float(half * best.width),
        before / half,
        after / half,
        float(bic_smooth - best.bic),
    )
    return Verdict(knee, best.bic, best.rss, float(rss_smooth[orders[smoothest]]))


@dataclass(frozen=True)
class _Hinge:
    """One rounded hinge on a window scaled to [-1, 1], and the polynomial degree beside it."""

    at: float
    width: float
    degree: int
    curved: bool
    bic: float
    rss: float


@dataclass(frozen=True)
class _HingeFitter:
    """Least squares of polynomial plus rounded hinge for many hinges at once.

    With an orthonormal polynomial basis q, one more column h lowers the residual sum of squares by
    (h⊥·r)²/(h⊥·h⊥), two by the 2 × 2 analogue, so a whole grid costs two matrix products.
    """

    t: FloatArray
    weight: FloatArray
    target: FloatArray
    q: FloatArray
    along: FloatArray
    floor: float

    def best(self, at: FloatArray, width: FloatArray) -> _Hinge | None:
        """The hinge of lowest BIC among (g,) positions and widths, beside degrees 1, 2 and 3."""
        n = self.t.size
        degrees = [d for d in (1, 2, 3) if n >= d + 5 and d < self.q.shape[1]]
        if not degrees:
            return None
        hinge = _rounded(self.t[:, None] - at, width)
        h1 = hinge * self.weight[:, None]
        h2 = hinge * h1
        basis = self.q[:, : degrees[-1] + 1]
        k1, k2 = basis.T @ h1, basis.T @ h2
        t1, t2 = self.target @ h1, self.target @ h2
        n11 = np.einsum("ij,ij->j", h1, h1)
        n12 = np.einsum("ij,ij->j", h1, h2)
        n22 = np.einsum("ij,ij->j", h2, h2)
        # one row a degree: what is left of the columns and of the target beside its polynomial
        a = self.along[: degrees[-1] + 1, None]
        rows = slice(1, None)
        s11 = n11 - np.cumsum(k1 * k1, axis=0)[rows]
        s12 = n12 - np.cumsum(k1 * k2, axis=0)[rows]
        s22 = n22 - np.cumsum(k2 * k2, axis=0)[rows]
        r1 = t1 - np.cumsum(a * k1, axis=0)[rows]
        r2 = t2 - np.cumsum(a * k2, axis=0)[rows]
        rss0 = float(self.target @ self.target) - np.cumsum(a[:, 0] ** 2)[rows]
        sound = s11 > 1e-9 * n11
        one = np.where(sound, r1 * r1 / np.where(sound, s11, 1.0), 0.0)
        det = s11 * s22 - s12 * s12
        sound &= det > 1e-7 * s11 * s22
        both = (r1 * r1 * s22 - 2.0 * r1 * r2 * s12 + r2 * r2 * s11) / np.where(sound, det, 1.0)
        both = np.where(sound, both, 0.0)
        log_n = math.log(n)
        best: _Hinge | None = None
        for curved, gains in ((False, one), (True, both)):
            chosen = gains.argmax(axis=1)
            for row, degree in enumerate(degrees):
                if curved and n < degree + 8:
                    continue
                i = int(chosen[row])
                left = max(float(rss0[row]) - float(gains[row, i]), 0.0)
                bic = n * math.log(left + self.floor) + (degree + 4 + int(curved)) * log_n
                if best is None or bic < best.bic:
                    best = _Hinge(float(at[i]), float(width[i]), degree, curved, bic, left)
        return best

    def slopes(self, hinge: _Hinge, powers: FloatArray) -> tuple[float, float]:
        """Slopes just left and right of the hinge, per unit of t."""
        h = _rounded(self.t - hinge.at, np.asarray(hinge.width))
        columns = [powers[:, : hinge.degree + 1], (h * self.weight)[:, None]]
        if hinge.curved:
            columns.append((h * h * self.weight)[:, None])
        c = np.linalg.lstsq(np.concatenate(columns, axis=1), self.target, rcond=None)[0]
        derivative = np.polynomial.chebyshev.chebder(c[: hinge.degree + 1])
        before = float(np.polynomial.chebyshev.chebval(hinge.at, derivative))
        return before, before + float(c[hinge.degree + 1])


def _rounded(distance: FloatArray, width: FloatArray) -> FloatArray:
    """A hinge rounded as a hyperbola, cheap to compute; curvature as a softplus of that width."""
    return np.asarray(0.5 * (distance + np.sqrt(distance * distance + 4.0 * width * width)))


def rounding_floor(y: FloatArray, weight: FloatArray) -> float:
    """Weighted sum of squares below which two models are equally perfect."""
    return float(np.sum(weight**2)) * (INDIFFERENT * max(float(np.ptp(y)), 1e-9)) ** 2
