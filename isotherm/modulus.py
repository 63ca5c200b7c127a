"""Compression modulus by local polynomial regression that never spans a knee."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = ["LocalFit", "local_regression"]

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

WANTED: Final = 0.04  # relative standard uncertainty of the modulus a bandwidth has to reach
SOFT: Final = 5.0  # mN/m; below it the uncertainty wanted is WANTED times this
AGREE: Final = 2.5  # half-width of the intervals that have to intersect, in u
HALF_WIDTHS: Final = (1, 2, 3, 4, 6, 8, 12, 16, 24, 32, 48, 64, 96, 128)  # nodes


@dataclass(frozen=True)
class LocalFit:
    """Smoothed pressure and modulus at every node. All (m,), mN/m."""

    pressure: FloatArray
    u_pressure: FloatArray
    modulus: FloatArray
    u_modulus: FloatArray


def local_regression(
    x: FloatArray, y: FloatArray, sigma: FloatArray, stretches: IntArray
) -> LocalFit:
    """Local parabola of Π on x = -ln A at every node: its value and its slope dΠ/dx = -dΠ/d ln A.

    Parameters
    ----------
    x, y, sigma : (m,) nodes, x increasing; pressure and its standard uncertainty, mN/m.
    stretches : (s + 1,) node indices that bound the stretches between knees, first 0, last m.

    Notes
    -----
    The bandwidth at a node grows through `HALF_WIDTHS` until the modulus is known to `WANTED`
    (relative), and never beyond the first whose estimate leaves the intersection of the confidence
    intervals of the narrower ones (Goldenshluger & Nemirovski, Math. Methods Statist. 1997, 6, 135):
    wide where the branch is straight, narrow where it bends.
    """
    m = x.size
    stretch = np.searchsorted(stretches, np.arange(m), side="right") - 1
    low, high = stretches[stretch], stretches[stretch + 1]
    weight = 1.0 / sigma**2
    base = x.mean()
    unit = max(float(np.ptp(x)), 1e-12)
    t = ((x - base) / unit).astype(np.longdouble)
    v = (y - y.mean()).astype(np.longdouble)
    powers = t[:, None] ** np.arange(5)
    sums = np.vstack([np.zeros(5), np.cumsum(weight[:, None] * powers, axis=0)])
    cross = np.vstack([np.zeros(3), np.cumsum((weight * v)[:, None] * powers[:, :3], axis=0)])
    value = np.full(m, np.nan)
    u_value = np.full(m, np.inf)
    slope = np.full(m, np.nan)
    u_slope = np.full(m, np.inf)
    open_ = np.ones(m, dtype=np.bool_)
    lower, upper = np.full(m, -np.inf), np.full(m, np.inf)
    longest = int(np.max(np.diff(stretches), initial=1))
    for half in HALF_WIDTHS:
        at = np.flatnonzero(open_)
        if at.size == 0 or half > 2 * longest:
            break
        a = np.maximum(at - half, low[at])
        b = np.minimum(at + half + 1, high[at])
        fit = _parabola(sums[b] - sums[a], cross[b] - cross[a], t[at], b - a)
        known = np.isfinite(fit.u_slope)
        lower[at] = np.where(
            known, np.maximum(lower[at], fit.slope - AGREE * fit.u_slope), lower[at]
        )
        upper[at] = np.where(
            known, np.minimum(upper[at], fit.slope + AGREE * fit.u_slope), upper[at]
        )
        agrees = known & (lower[at] <= upper[at])
        better = agrees & (fit.u_slope < u_slope[at])
        chosen = at[better]
        value[chosen], u_value[chosen] = fit.value[better], fit.u_value[better]
        slope[chosen], u_slope[chosen] = fit.slope[better], fit.u_slope[better]
        enough = u_slope[at] / unit <= WANTED * np.maximum(np.abs(slope[at]) / unit, SOFT)
        whole = (a == low[at]) & (b == high[at])
        open_[at[enough | whole | (known & ~agrees)]] = False
    lost = ~np.isfinite(value)
    value[lost], u_value[lost] = (y - y.mean())[lost], sigma[lost]
    return LocalFit(value + y.mean(), u_value, slope / unit, u_slope / unit)


@dataclass(frozen=True)
class _Parabolas:
    value: FloatArray
    u_value: FloatArray
    slope: FloatArray
    u_slope: FloatArray


def _parabola(s: FloatArray, r: FloatArray, at: FloatArray, count: IntArray) -> _Parabolas:
    """Weighted parabolas about `at` from moment sums s (k, 5) and r (k, 3); lines below 5 nodes."""
    c = at
    m0 = s[:, 0]
    m1 = s[:, 1] - c * m0
    m2 = s[:, 2] - 2 * c * s[:, 1] + c**2 * m0
    m3 = s[:, 3] - 3 * c * s[:, 2] + 3 * c**2 * s[:, 1] - c**3 * m0
    m4 = s[:, 4] - 4 * c * s[:, 3] + 6 * c**2 * s[:, 2] - 4 * c**3 * s[:, 1] + c**4 * m0
    r0 = r[:, 0]
    r1 = r[:, 1] - c * r0
    r2 = r[:, 2] - 2 * c * r[:, 1] + c**2 * r0
    size = np.maximum(np.sqrt(m2 / m0), 1e-9)  # scales the window to order one
    n = np.zeros((c.size, 3, 3))
    n[:, 0, 0], n[:, 0, 1], n[:, 0, 2] = m0, m1 / size, m2 / size**2
    n[:, 1, 0], n[:, 1, 1], n[:, 1, 2] = n[:, 0, 1], n[:, 0, 2], m3 / size**3
    n[:, 2, 0], n[:, 2, 1], n[:, 2, 2] = n[:, 0, 2], n[:, 1, 2], m4 / size**4
    n /= m0[:, None, None].astype(float)
    right = np.stack([r0, r1 / size, r2 / size**2], axis=1) / m0[:, None]
    few = count < 5
    n[few, 2, :2] = n[few, :2, 2] = 0.0
    n[few, 2, 2] = 1.0
    right[few, 2] = 0.0
    n[:, [0, 1, 2], [0, 1, 2]] += 1e-9
    inverse = np.linalg.inv(n)
    solution = np.einsum("kij,kj->ki", inverse, right.astype(float))
    variance = np.maximum(inverse[:, [0, 1], [0, 1]], 0.0) / m0[:, None].astype(float)
    size = size.astype(float)
    u = np.sqrt(variance)
    none = count < 3
    u_slope = np.where(none, np.inf, u[:, 1] / size)
    return _Parabolas(solution[:, 0], u[:, 0], solution[:, 1] / size, u_slope)
