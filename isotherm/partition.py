"""Cutting a curve into stretches at the least total cost, exactly."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["StretchCosts", "best_subset"]

FloatArray = NDArray[np.float64]


class StretchCosts:
    """Weighted residual sums of squares of a parabola on any stretch of nodes, from running sums.

    Parameters
    ----------
    x, y, sigma : (n,) nodes.
    """

    def __init__(self, x: FloatArray, y: FloatArray, sigma: FloatArray) -> None:
        t = ((x - x[0]) / max(float(x[-1] - x[0]), 1e-12)).astype(np.longdouble)
        v = ((y - y.mean()) / max(float(np.ptp(y)), 1e-12)).astype(np.longdouble)
        w = 1.0 / sigma.astype(np.longdouble) ** 2
        powers = t[:, None] ** np.arange(5)
        self._unit = float(np.ptp(y)) ** 2
        self._sums = np.vstack([np.zeros(5), np.cumsum(w[:, None] * powers, axis=0)])
        cross = np.cumsum((w * v)[:, None] * powers[:, :3], axis=0)
        self._cross = np.vstack([np.zeros(3), cross])
        self._square = np.concatenate([[0.0], np.cumsum(w * v * v)])

    def __call__(self, a: NDArray[np.int64], b: NDArray[np.int64]) -> FloatArray:
        """Cost of the nodes a to b - 1, for index arrays a < b of one shape."""
        s = self._sums[b] - self._sums[a]
        r = self._cross[b] - self._cross[a]
        q = self._square[b] - self._square[a]
        m0 = np.where(s[:, 0] > 0, s[:, 0], 1.0)  # an empty stretch costs nothing
        # moments about the stretch's own centre keep the 3 x 3 systems well conditioned
        c = s[:, 1] / m0
        m2 = s[:, 2] - c * s[:, 1]
        m3 = s[:, 3] - 3 * c * s[:, 2] + 3 * c**2 * s[:, 1] - c**3 * s[:, 0]
        m4 = s[:, 4] - 4 * c * s[:, 3] + 6 * c**2 * s[:, 2] - 4 * c**3 * s[:, 1] + c**4 * s[:, 0]
        r1 = r[:, 1] - c * r[:, 0]
        r2 = r[:, 2] - 2 * c * r[:, 1] + c**2 * r[:, 0]
        rss = q - r[:, 0] ** 2 / m0
        sloped = m2 > 0
        slope = np.where(sloped, r1 / np.where(sloped, m2, 1.0), 0.0)
        rss = rss - slope * r1
        # the parabola's part orthogonal to constant and slope
        h = m4 - m2**2 / m0 - np.where(sloped, m3**2 / np.where(sloped, m2, 1.0), 0.0)
        g = r2 - m2 / m0 * r[:, 0] - slope * m3
        bent = h > 1e-15 * s[:, 0]
        rss = rss - np.where(bent, g**2 / np.where(bent, h, 1.0), 0.0)
        return np.asarray(np.maximum(rss, 0.0) * self._unit, dtype=np.float64)


def best_subset(
    costs: FloatArray, edges: NDArray[np.int64], penalty: float, shortest: int
) -> list[int]:
    """Inner edges of the cheapest partition: sum of costs plus `penalty` a stretch (exact)."""
    e = edges.size
    best = np.full(e, np.inf)
    best[0] = 0.0
    back = np.zeros(e, dtype=np.int64)
    for j in range(1, e):
        allowed = edges[j] - edges[:j] >= shortest
        total = np.where(allowed, best[:j] + costs[:j, j] + penalty, np.inf)
        back[j] = int(np.argmin(total))
        best[j] = total[back[j]]
    chosen = []
    j = e - 1
    while j > 0:
        j = int(back[j])
        if j > 0:
            chosen.append(int(edges[j]))
    return chosen[::-1]
