"""Is there a knee in this window? One rounded hinge against the best smooth polynomial."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.lapack import orthonormal

__all__ = ["Candidate", "Hinge", "Verdict", "judge_knee", "rounding_floor", "with_slopes"]

FloatArray = NDArray[np.float64]

# No rounding shape is exact: misfits below this share of a window's range decide nothing (our choice).
INDIFFERENT: Final = 5e-4
SMOOTH_DEGREE: Final = 6  # a smooth rival gets as many parameters as the richest knee model
POSITIONS: Final = 24  # hinges tried along a window, before the best is refined
_WIDTHS: Final = np.array([0.008, 0.035, 0.14])  # rounding widths tried, shares of half a window
_SHIFTS: Final = np.array([-0.6, -0.3, 0.0, 0.3, 0.6])  # then about the best, shares of a grid step
_FACTORS: Final = np.array([0.55, 1.0, 1.6])  # and on its width


@dataclass(frozen=True)
class Candidate:
    """A possible knee: x, width, slopes (moduli, mN/m) just left and right, and its evidence (ΔBIC)."""

    x: float
    width: float
    before: float
    after: float
    evidence: float


@dataclass(frozen=True)
class Hinge:
    """One rounded hinge on a window scaled to [-1, 1], and the polynomial degree beside it."""

    at: float
    width: float
    degree: int
    curved: bool
    bic: float
    rss: float


@dataclass(frozen=True)
class Verdict:
    """The best knee of a window, and the weighted residual sum of the best polynomial.

    x, width : of the knee. evidence : for it (ΔBIC).
    """

    x: float
    width: float
    evidence: float
    hinge: Hinge
    smooth_rss: float


def judge_knee(x: FloatArray, y: FloatArray, sigma: FloatArray) -> Verdict | None:
    """The best single rounded knee in a window against the best smooth polynomial.

    Parameters
    ----------
    x, y, sigma : (n,) window of nodes, x increasing.

    Returns
    -------
    Verdict or None
        None where the window has too few nodes to tell.
    """
    n = x.size
    if n < 6:
        return None
    first, last = float(x[0]), float(x[-1])
    centre, half = 0.5 * (first + last), 0.5 * (last - first)
    if half <= 0:
        return None
    t = (x - centre) / half
    weight = 1.0 / sigma
    target = y * weight
    log_n = math.log(n)
    smooth_degree = min(SMOOTH_DEGREE, n // 3)
    powers = _chebyshev(t, smooth_degree, weight)
    q = orthonormal(powers)
    along = target @ q
    total = float(target @ target)
    floor = rounding_floor(y, float(weight @ weight))
    rss = total
    smooth = (math.inf, 0.0)  # lowest BIC, and its residual sum
    for order, part in enumerate(along.tolist()):
        rss -= part * part
        if order:
            left = max(rss, 0.0)
            smooth = min(smooth, (n * math.log(left + floor) + (order + 1) * log_n, left))
    fitter = _HingeFitter(t, weight, target, q, along, total, floor)
    edge = 2 if n < 30 else 3
    positions = t[edge : n - edge]
    if positions.size > POSITIONS:
        positions = positions[:: positions.size // POSITIONS + 1]
    coarse = fitter.best(positions, _WIDTHS if n >= 16 else _WIDTHS[:1])
    if coarse is None:
        return None
    gap = float((positions[1:] - positions[:-1]).max()) if positions.size > 1 else 0.1
    # never beyond the window's own positions: what lies outside is another window's knee
    shifted = np.clip(coarse.at + gap * _SHIFTS, float(positions[0]), float(positions[-1]))
    fine = fitter.best(shifted, coarse.width * (_FACTORS if n >= 16 else _FACTORS[1:2]))
    best = fine if fine is not None and fine.bic < coarse.bic else coarse
    return Verdict(
        centre + half * best.at, half * best.width, smooth[0] - best.bic, best, smooth[1]
    )


def with_slopes(verdict: Verdict, x: FloatArray, y: FloatArray, sigma: FloatArray) -> Candidate:
    """The knee of a window with the moduli beside it; x, y, sigma : (n,) the window judged."""
    centre, half = 0.5 * float(x[0] + x[-1]), 0.5 * float(x[-1] - x[0])
    t = (x - centre) / half
    weight = 1.0 / sigma
    hinge = verdict.hinge
    h = _rounded(t - hinge.at, np.asarray(hinge.width))
    columns = [_chebyshev(t, hinge.degree, weight), (h * weight)[:, None]]
    if hinge.curved:
        columns.append((h * h * weight)[:, None])
    c = np.linalg.lstsq(np.concatenate(columns, axis=1), y * weight, rcond=None)[0]
    derivative = np.polynomial.chebyshev.chebder(c[: hinge.degree + 1])
    before = float(np.polynomial.chebyshev.chebval(hinge.at, derivative))
    after = before + float(c[hinge.degree + 1])
    return Candidate(verdict.x, verdict.width, before / half, after / half, verdict.evidence)


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
    total: float
    floor: float

    def best(self, positions: FloatArray, widths: FloatArray) -> Hinge | None:
        """The hinge of lowest BIC at any of the positions and widths, beside degrees 1, 2 and 3.

        Shapes below: (d, g) for d degrees and g hinges. What is left of a column beside a polynomial is
        its square less those of its parts along the basis, so one running sum serves all degrees.
        """
        n = self.t.size
        degrees = [d for d in (1, 2, 3) if n >= d + 5 and d < self.q.shape[1]]
        if not degrees:
            return None
        # a hinge is a row here, so that every sum runs along memory: plain, and times itself
        g, top = positions.size * widths.size, degrees[-1] + 1
        distance = (self.t - positions[:, None])[:, None, :]
        hinge = _rounded(distance, widths[:, None]).reshape(g, n)
        columns = np.empty((2, g, n))
        plain, squared = columns
        np.multiply(hinge, self.weight, out=plain)
        np.multiply(plain, hinge, out=squared)
        basis = np.empty((n, top + 1))
        basis[:, :top] = self.q[:, :top]
        basis[:, top] = self.target
        inner = (columns.reshape(2 * g, n) @ basis).reshape(2, g, top + 1).transpose(0, 2, 1)
        p1, p2 = inner[:, :top]
        a = self.along[:top, None]
        parts = np.empty((5, top, g))
        np.multiply(p1, p1, out=parts[0])
        np.multiply(p1, p2, out=parts[1])
        np.multiply(p2, p2, out=parts[2])
        np.multiply(p1, a, out=parts[3])
        np.multiply(p2, a, out=parts[4])
        whole = np.empty((5, 1, g))
        whole[0, 0] = np.einsum("gn,gn->g", plain, plain)
        whole[1, 0] = np.einsum("gn,gn->g", plain, squared)
        whole[2, 0] = np.einsum("gn,gn->g", squared, squared)
        whole[3:, 0] = inner[:, top]
        s11, s12, s22, r1, r2 = whole - parts.cumsum(axis=1)[:, 1:]
        sound = s11 > 1e-9 * whole[0]
        square, product = r1 * r1, s11 * s22
        det = product - s12 * s12
        regular = sound & (det > 1e-7 * product)
        gains = np.zeros((2, len(degrees), g))
        np.divide(square, s11, out=gains[0], where=sound)
        both = square * s22 - 2.0 * r1 * r2 * s12 + r2 * r2 * s11
        np.divide(both, det, out=gains[1], where=regular)
        where = gains.argmax(axis=2)
        return self._cheapest(degrees, gains, where, positions, widths)

    def _cheapest(
        self,
        degrees: list[int],
        gains: FloatArray,
        where: NDArray[np.intp],
        positions: FloatArray,
        widths: FloatArray,
    ) -> Hinge | None:
        """The hinge of lowest BIC among the best of each degree, alone and with its square."""
        n = self.t.size
        log_n = math.log(n)
        rss = self.total - float(self.along[0]) ** 2
        best = (math.inf, 0, 0, False, 0.0)
        for row, degree in enumerate(degrees):
            rss -= float(self.along[row + 1]) ** 2
            for curved in (False, True):
                if curved and n < degree + 8:
                    continue
                at = int(where[int(curved), row])
                left = max(rss - float(gains[int(curved), row, at]), 0.0)
                bic = n * math.log(left + self.floor) + (degree + 4 + int(curved)) * log_n
                if bic < best[0]:
                    best = (bic, at, degree, curved, left)
        bic, at, degree, curved, left = best
        if not degree:
            return None
        position, width = divmod(at, widths.size)
        return Hinge(float(positions[position]), float(widths[width]), degree, curved, bic, left)


def _chebyshev(t: FloatArray, degree: int, weight: FloatArray) -> FloatArray:
    """Weighted Chebyshev polynomials up to `degree` (at least 1), (n, degree + 1)."""
    rows = np.empty((degree + 1, t.size))
    rows[0] = weight
    rows[1] = t * weight
    twice = 2.0 * t
    for m in range(2, degree + 1):
        np.multiply(twice, rows[m - 1], out=rows[m])
        rows[m] -= rows[m - 2]
    return rows.T


def _rounded(distance: FloatArray, width: FloatArray) -> FloatArray:
    """A hinge rounded as a hyperbola, cheap to compute; curvature as a softplus of that width."""
    out = np.asarray(distance * distance + 4.0 * width * width)
    np.sqrt(out, out=out)
    out += distance
    out *= 0.5
    return out


def rounding_floor(y: FloatArray, weights: float) -> float:
    """Weighted sum of squares below which two models are equally perfect; `weights`: sum of 1/sigma^2."""
    span = float(y.max() - y.min())
    return weights * (INDIFFERENT * max(span, 1e-9)) ** 2
