"""Correlated noise: candidate covariances of the block means, ready to whiten a fit.

Residuals of a hold are never independent, and they remember on two scales: the controller hunts over
seconds to a minute, temperature and level wander over many minutes. The covariance is taken as independent
noise plus two first-order autoregressive parts (in continuous time, so uneven spacing is no trouble), one
as short as a block, one longer:

    C_ij / s^2 = (1 - f) [(1 - h) delta_ij + h exp(-|t_i - t_j| / d)] + f exp(-|t_i - t_j| / tau),

d being the time from block to block. With one part only, the shorter memory, which shows in every pair of
neighbours, hides the longer one, which is what limits a slope: u came out 1.5 times too small on simulated
holds that have both.

Source: the first-order autoregression of Box & Jenkins, Time Series Analysis, 1970, ch. 3; generalised
least squares with it in Seber & Wild, Nonlinear Regression, Wiley 1989, ch. 6.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["LONGEST_PART", "NOISE_PARAMETERS", "NoiseGrid", "noise_grid"]

FloatArray = NDArray[np.float64]

# Only s counts in the information criterion: the shape of the covariance (f, tau, h) is sought for every law
# alike, from all blocks, and would add the same to each.
NOISE_PARAMETERS = 1
# Share of correlated noise in one block's variance; fine enough that the likelihood moves by less than
# its own sampling error from node to node.
_SHARES = (0.01, 0.03, 0.1, 0.25, 0.5, 0.75, 0.9, 0.97)
# Correlation lasting longer than this part of the hold cannot be told from the film's own drift.
LONGEST_PART = 0.25
_TIMES = 7
_SHORT_SHARES = (0.0, 0.5, 0.9)
_SHORTEST_BLOCKS = 2.0  # times the block spacing: shorter memory is the short part's


@dataclass(frozen=True)
class NoiseGrid:
    """Candidate covariances (scale s = 1) of m block means.

    share, correlation_time : (j,) f and tau (s; 0 where f = 0).  short : (j,) h.
    whitener : (j, m, m) W with W C W' = 1.
    log_det : (j,) ln det C.
    effective : (j,) effective number of independent blocks for a mean, 1' C^-1 1.
    """

    share: FloatArray
    correlation_time: FloatArray
    short: FloatArray
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
    times = np.geomspace(min(_SHORTEST_BLOCKS * spacing, longest), longest, _TIMES)
    long = [(0.0, 0.0)] + [(f, tau) for tau in times.tolist() for f in _SHARES]
    candidates = [(f, tau, h) for f, tau in long for h in _SHORT_SHARES]
    identity = np.eye(m)
    neighbours = np.exp(-lags / spacing)
    decays = {tau: np.exp(-lags / tau) for tau in times.tolist()}
    whitener = np.empty((len(candidates), m, m))
    log_det = np.empty(len(candidates))
    for j, (f, tau, h) in enumerate(candidates):
        cov = (1.0 - f) * ((1.0 - h) * identity + h * neighbours)
        if f > 0:
            cov += f * decays[tau]
        lower = np.linalg.cholesky(cov)
        whitener[j] = solve_triangular(lower, identity, lower=True)
        log_det[j] = 2.0 * float(np.log(np.diag(lower)).sum())
    ones = whitener.sum(axis=2)
    return NoiseGrid(
        share=np.array([c[0] for c in candidates]),
        correlation_time=np.array([c[1] for c in candidates]),
        short=np.array([c[2] for c in candidates]),
        whitener=whitener,
        log_det=log_det,
        effective=np.einsum("jm,jm->j", ones, ones),
    )
