"""How far the rows of a dwell are independent: the factor by which means are noisier than they seem."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from transfer.ratio_film import FilmFit
from transfer.ratio_nodes import Nodes

__all__ = ["dwell_residuals", "variance_inflation"]

FloatArray = NDArray[np.float64]

_MOST_LAGS = 60
_LONGEST_PART = 0.25


def dwell_residuals(
    nodes: Nodes, fit: FilmFit, time: FloatArray, log_area: FloatArray, pressure: FloatArray
) -> tuple[NDArray[np.intp], FloatArray]:
    """Rows in dwells and their residuals of ln(area) from the fit.

    Parameters
    ----------
    nodes : Nodes
    fit : FilmFit
    time, log_area, pressure : (n,) s, ln(cm^2), mN/m.

    Returns
    -------
    tuple of arrays
        Row numbers (r,) and residuals (r,), each dwell's own line (level and slope) removed.
    """
    rows = np.flatnonzero(nodes.row_node >= 0)
    node = nodes.row_node[rows]
    t = time[rows] - nodes.time[node]
    off = pressure[rows] - nodes.target[node] - nodes.off[node]
    y = log_area[rows] - nodes.log_area[node] + fit.compressibility * off
    slope = np.where(
        nodes.tt > 0,
        (nodes.ty + fit.compressibility * nodes.tw) / np.maximum(nodes.tt, 1e-300),
        0.0,
    )
    return rows, y - slope[node] * t


def variance_inflation(
    nodes: Nodes, fit: FilmFit, time: FloatArray, log_area: FloatArray, pressure: FloatArray
) -> float:
    """Variance of a long mean over that of independent rows: 1 + 2 sum of autocorrelations.

    The sum runs to the first lag whose autocorrelation, pooled over dwells, does not stand out of its own
    noise (initial positive sequence; Geyer, Statist. Sci. 1992, 7, 473). Each dwell's lost freedom for
    level and slope is given back.

    Parameters
    ----------
    nodes : Nodes
    fit : FilmFit
    time, log_area, pressure : (n,) s, ln(cm^2), mN/m.

    Returns
    -------
    float
        At least 1.
    """
    rows, residual = dwell_residuals(nodes, fit, time, log_area, pressure)
    node = nodes.row_node[rows]
    long_enough = nodes.rows >= 8
    keep = long_enough[node]
    rows, residual, node = rows[keep], residual[keep], node[keep]
    if rows.size < 30:
        return 1.0
    freedom = rows.size - 2.0 * np.unique(node).size
    variance = float(residual @ residual) / freedom
    usual = float(np.median(nodes.rows[long_enough]))
    total = 0.0
    for lag in range(1, min(_MOST_LAGS, int(_LONGEST_PART * usual)) + 1):
        together = (node[lag:] == node[:-lag]) & (rows[lag:] - rows[:-lag] == lag)
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
