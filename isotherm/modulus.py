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
    unit = max(float(np.ptp(x)), 1e-12)
    t = x / unit
    v = y - y.mean()
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
        index = at[:, None] + np.arange(-half, half + 1)
        inside = (index >= a[:, None]) & (index < b[:, None])
        index = np.clip(index, 0, m - 1)
        fit = _parabola(
            t[index] - t[at][:, None], v[index], np.where(inside, weight[index], 0.0), b - a
        )
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


def _parabola(t: FloatArray, v: FloatArray, w: FloatArray, count: IntArray) -> _Parabolas:
    """Weighted parabolas through (k, h) values v at offsets t; a line below five points.

    The value and the slope are those at offset 0.
    """
    m0 = w.sum(axis=1)
    size = np.maximum(np.sqrt(np.einsum("kh,kh->k", w, t * t) / m0), 1e-12)
    s = t / size[:, None]
    w = w / m0[:, None]
    ws = w * s
    wss = ws * s
    m1 = ws.sum(axis=1)
    m2 = wss.sum(axis=1)
    m3 = np.einsum("kh,kh->k", wss, s)
    m4 = np.einsum("kh,kh->k", wss, s * s)
    r0 = np.einsum("kh,kh->k", w, v)
    r1 = np.einsum("kh,kh->k", ws, v)
    r2 = np.einsum("kh,kh->k", wss, v)
    few = count < 5
    # cofactors of the symmetric matrix [[1, m1, m2], [m1, m2, m3], [m2, m3, m4]]
    a = np.where(few, 1.0, m2 * m4 - m3 * m3)
    c00 = np.where(few, m2, a)
    c01 = np.where(few, -m1, m2 * m3 - m1 * m4)
    c02 = np.where(few, 0.0, m1 * m3 - m2 * m2)
    c11 = np.where(few, 1.0, m4 - m2 * m2)
    c12 = np.where(few, 0.0, m1 * m2 - m3)
    det = np.where(few, m2 - m1 * m1, c00 + m1 * c01 + m2 * c02)
    sound = (det > 1e-12) & (count >= 3)
    det = np.where(sound, det, 1.0)
    value = (c00 * r0 + c01 * r1 + c02 * r2) / det
    slope = (c01 * r0 + c11 * r1 + c12 * r2) / det / size
    u_value = np.sqrt(np.maximum(c00 / det, 0.0) / m0)
    u_slope = np.sqrt(np.maximum(c11 / det, 0.0) / m0) / size
    return _Parabolas(
        value, np.where(sound, u_value, np.inf), slope, np.where(sound, u_slope, np.inf)
    )
