"""What the residuals of the dwells say: how independent rows are, and how long moves take to settle."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from transfer.ratio_film import FilmFit
from transfer.ratio_nodes import Nodes

__all__ = ["dwell_residuals", "variance_inflation"]

FloatArray = NDArray[np.float64]

_MOST_LAGS = 60
_LONGEST_PART = 0.25


def dwell_residuals(nodes: Nodes, fit: FilmFit) -> FloatArray:
    """Residuals of ln(area) of the kept rows, each dwell's own line (level and slope) removed.

    Parameters
    ----------
    nodes : Nodes
    fit : FilmFit

    Returns
    -------
    (r,) array
    """
    kept = nodes.kept
    node = kept.node
    t = kept.time - nodes.time[node]
    y = kept.log_area - nodes.log_area[node]
    y = y + fit.compressibility * (kept.off - nodes.off[node])
    slope = np.where(
        nodes.tt > 0,
        (nodes.ty + fit.compressibility * nodes.tw) / np.maximum(nodes.tt, 1e-300),
        0.0,
    )
    return np.asarray(y - slope[node] * t)


def variance_inflation(nodes: Nodes, fit: FilmFit) -> float:
    """Variance of a long mean over that of independent rows: 1 + 2 sum of autocorrelations.

    The sum runs to the first lag whose autocorrelation, pooled over dwells, does not stand out of its own
    noise (initial positive sequence; Geyer, Statist. Sci. 1992, 7, 473). Each dwell's lost freedom for
    level and slope is given back.

    Parameters
    ----------
    nodes : Nodes
    fit : FilmFit

    Returns
    -------
    float
        At least 1.
    """
    residual = dwell_residuals(nodes, fit)
    node = nodes.kept.node
    long_enough = nodes.rows >= 8
    keep = long_enough[node]
    residual, node = residual[keep], node[keep]
    if residual.size < 30:
        return 1.0
    freedom = residual.size - 2.0 * np.unique(node).size
    variance = float(residual @ residual) / freedom
    usual = float(np.median(nodes.rows[long_enough]))
    total = 0.0
    for lag in range(1, min(_MOST_LAGS, int(_LONGEST_PART * usual)) + 1):
        together = node[lag:] == node[:-lag]
        pairs = int(together.sum())
        if pairs < 20:
            break
        product = float((residual[lag:] * residual[:-lag])[together].mean())
        # a removed level and slope make the residuals of n rows anticorrelated by about 2 / n
        rho = product / variance + 2.0 / usual
        if rho < 2.0 / np.sqrt(pairs):
            break
        total += rho
    return 1.0 + 2.0 * total
