"""Correlated noise: candidate covariances of the block means, ready to whiten a fit.

Residuals of a hold are never independent: the controller hunts over seconds, temperature and level
wander over minutes. The covariance is taken as independent noise plus a first-order autoregressive part
(in continuous time, so uneven spacing is no trouble):

    C_ij / s^2 = (1 - f) delta_ij + f exp(-|t_i - t_j| / tau).

Source: the first-order autoregression of Box & Jenkins, Time Series Analysis, 1970, ch. 3; generalised
least squares with it in Seber & Wild, Nonlinear Regression, Wiley 1989, ch. 6.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["LONGEST_PART", "NOISE_PARAMETERS", "NoiseGrid", "noise_grid"]

FloatArray = NDArray[np.float64]

# s, f and tau are estimated from the data and counted in the information criterion.
NOISE_PARAMETERS = 3
# Share of correlated noise in one block's variance; fine enough that the likelihood moves by less than
# its own sampling error from node to node.
_SHARES = (0.01, 0.03, 0.1, 0.25, 0.5, 0.75, 0.9, 0.97)
# Correlation lasting longer than this part of the hold cannot be told from the film's own drift.
LONGEST_PART = 0.25
_TIMES = 7


@dataclass(frozen=True)
class NoiseGrid:
    """Candidate covariances (scale s = 1) of m block means.

    share, correlation_time : (j,) f and tau (s; 0 where f = 0).
    whitener : (j, m, m) W with W C W' = 1.
    log_det : (j,) ln det C.
    effective : (j,) effective number of independent blocks for a mean, 1' C^-1 1.
    """

    share: FloatArray
    correlation_time: FloatArray
    whitener: FloatArray
    log_det: FloatArray
    effective: FloatArray


def noise_grid(time: FloatArray) -> NoiseGrid:
    """Build the candidate covariances for block means at `time` ((m,) s, increasing)."""
    from scipy.linalg import solve_triangular

    m = time.size
    spacing = float(np.median(np.diff(time)))
    span = float(time[-1] - time[0])
    longest = max(LONGEST_PART * span, 2.0 * spacing)
    lags = np.abs(time[:, None] - time[None, :])
    pairs = [(0.0, 0.0)] + [
        (f, tau) for tau in np.geomspace(spacing, longest, _TIMES) for f in _SHARES
    ]
    whitener = np.empty((len(pairs), m, m))
    log_det = np.empty(len(pairs))
    identity = np.eye(m)
    for j, (f, tau) in enumerate(pairs):
        cov = identity if f == 0 else (1.0 - f) * identity + f * np.exp(-lags / tau)
        lower = np.linalg.cholesky(cov)
        whitener[j] = solve_triangular(lower, identity, lower=True)
        log_det[j] = 2.0 * float(np.log(np.diag(lower)).sum())
    ones = whitener.sum(axis=2)
    return NoiseGrid(
        share=np.array([p[0] for p in pairs]),
        correlation_time=np.array([p[1] for p in pairs]),
        whitener=whitener,
        log_det=log_det,
        effective=np.einsum("jm,jm->j", ones, ones),
    )
