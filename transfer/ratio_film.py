"""Creep and pressure coefficient of the floating film, in one least-squares fit over all dwells."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.ratio_nodes import Nodes

__all__ = ["FilmFit", "fit_film"]

FloatArray = NDArray[np.float64]

# Prior of the creep rate, 1/s: zero, give or take 18 % an hour. A film that creeps faster is still fitted,
# since a minute's dwell fixes its own slope far better than this.
_CREEP_PRIOR = 5e-5
# How much the rate may change from one dwell to the next, 1/s: the value most likely given the dwells' own
# slopes is taken from this grid. It may change more across a renewal, where the film is another one.
_CREEP_STEPS = (3e-8, 1e-7, 3e-7, 1e-6, 3e-6, 1e-5, 3e-5)
_CREEP_STEP_SCALE = 1e-6
_RENEWAL_FACTOR = 3.0
# Dwells used to choose that value at most (its cost grows with the cube).
_MOST_DWELLS = 250


@dataclass(frozen=True)
class FilmFit:
    """What the dwells say of the film.

    creep : (k,) rate of loss at each node, 1/s. compressibility : C_s = -(1/A) dA/dPi, m/mN.
    covariance : (k + 1, k + 1) of (creep, compressibility), random part.
    row_variance : variance of ln(area) of one row about the fit, with correlation between rows allowed for
        in `inflation`, the factor by which the variance of a long mean exceeds that of independent rows.
    mean_variance : (k,) variance of each node's mean ln(area).
    """

    creep: FloatArray
    compressibility: float
    covariance: FloatArray
    row_variance: float
    inflation: float
    mean_variance: FloatArray
    creep_step: float
    own_compressibility: float | None
    own_u: float | None


def fit_film(nodes: Nodes, *, prior: float, prior_u: float, inflation: float = 1.0) -> FilmFit:
    """Fit ln A = level - creep (t - t_k) - C_s (Pi - Pi_target) over all dwells together.

    Levels are free. Creep follows from dwell to dwell as a random walk whose step the data choose.
    C_s is common; noise in the recorded pressure would pull it towards zero, so the pressure a moment
    earlier and later serves as its instrument (Reiersol 1941; Durbin, Rev. Int. Stat. Inst. 1954, 22, 23).

    Parameters
    ----------
    nodes : Nodes
    prior, prior_u : float
        What is known of C_s beforehand and its standard uncertainty, m/mN.
    inflation : float
        Variance factor for correlated rows, from the residuals of an earlier pass.

    Returns
    -------
    FilmFit
    """
    creep_step = _CREEP_STEP_SCALE
    variance = _row_variance(nodes, np.zeros(nodes.size), prior)
    solution, covariance = np.zeros(nodes.size + 1), np.zeros((nodes.size + 1, nodes.size + 1))
    for _ in range(3):
        walk = _walk_precision(nodes, creep_step)
        solution, covariance = _solve(nodes, walk, variance * inflation, prior, prior_u)
        creep_step = _choose_step(nodes, float(solution[-1]), variance * inflation)
        variance = _row_variance(nodes, solution[:-1], float(solution[-1]))
    own, own_u = _own(solution, covariance, prior, prior_u)
    return FilmFit(
        creep=solution[:-1],
        compressibility=float(solution[-1]),
        covariance=covariance,
        row_variance=variance,
        inflation=inflation,
        mean_variance=variance * _mean_inflation(nodes, inflation) * nodes.weight,
        creep_step=creep_step,
        own_compressibility=own,
        own_u=own_u,
    )


def _mean_inflation(nodes: Nodes, inflation: float) -> FloatArray:
    """Inflation applies to means of many rows; a mean of one row has the row's own variance."""
    return 1.0 + (inflation - 1.0) * (1.0 - 1.0 / np.maximum(nodes.rows, 1))


def _walk_precision(nodes: Nodes, step: float) -> FloatArray:
    """Precision matrix of the creep rates before the data: a random walk from a broad start."""
    size = nodes.size
    out = np.zeros((size, size))
    out[np.diag_indices(size)] += 1.0 / (_CREEP_PRIOR**2 * size)
    steps = np.where(np.diff(nodes.hold) != 0, _RENEWAL_FACTOR * step, step)
    weight = 1.0 / steps**2
    index = np.arange(size - 1)
    out[index, index] += weight
    out[index + 1, index + 1] += weight
    out[index, index + 1] -= weight
    out[index + 1, index] -= weight
    return out


def _solve(
    nodes: Nodes, walk: FloatArray, variance: float, prior: float, prior_u: float
) -> tuple[FloatArray, FloatArray]:
    """Solve the instrument's normal equations with priors; return the solution and its covariance."""
    size = nodes.size
    left = np.zeros((size + 1, size + 1))
    gram = np.zeros_like(left)
    precision = np.zeros_like(left)
    index = np.arange(size)
    # first stage: how much of the wander the instrument carries; none, and the prior stands alone
    power = float(nodes.zz.sum())
    carried = max(float(nodes.zw.sum()), 0.0) / power if power > 0 else 0.0
    left[index, index] = nodes.tt
    left[index, size] = nodes.tw
    left[size, index] = carried * nodes.zt
    left[size, size] = carried * carried * power
    gram[index, index] = nodes.tt
    gram[index, size] = gram[size, index] = carried * nodes.zt
    gram[size, size] = carried * carried * power
    precision[:size, :size] = walk
    precision[size, size] = 1.0 / prior_u**2
    right = np.concatenate([-nodes.ty, [-carried * float(nodes.zy.sum())]]) / variance
    right[size] += prior / prior_u**2
    matrix = left / variance + precision
    inverse = np.linalg.inv(matrix)
    solution = inverse @ right
    covariance = inverse @ (gram / variance + precision) @ inverse.T
    return solution, covariance


def _choose_step(nodes: Nodes, compressibility: float, variance: float) -> float:
    """Most likely change of the creep rate from dwell to dwell, given the dwells' own slopes."""
    known = np.flatnonzero(nodes.tt > 0)[:_MOST_DWELLS]
    if known.size < 3:
        return _CREEP_STEP_SCALE
    slope = -(nodes.ty[known] + compressibility * nodes.tw[known]) / nodes.tt[known]
    noise = variance / nodes.tt[known]
    factor = np.where(np.diff(nodes.hold) != 0, _RENEWAL_FACTOR, 1.0)
    distance = np.concatenate([[0.0], np.cumsum(factor**2)])[known]
    shared = np.minimum(distance[:, None], distance[None, :])
    best, chosen = -np.inf, _CREEP_STEP_SCALE
    for step in _CREEP_STEPS:
        total = _CREEP_PRIOR**2 + step**2 * shared + np.diag(noise)
        factorised = np.linalg.cholesky(total)
        white = np.linalg.solve(factorised, slope)
        score = -0.5 * float(white @ white) - float(np.log(np.diag(factorised)).sum())
        score -= step / _CREEP_STEP_SCALE * 0.5
        if score > best:
            best, chosen = score, step
    return chosen


def _row_variance(nodes: Nodes, creep: FloatArray, compressibility: float) -> float:
    """Variance of one row's ln(area) about its dwell's line."""
    rest = (
        nodes.yy
        + creep**2 * nodes.tt
        + compressibility**2 * nodes.ww
        + 2.0 * creep * nodes.ty
        + 2.0 * compressibility * nodes.wy
        + 2.0 * creep * compressibility * nodes.tw
    )
    freedom = float(np.maximum(nodes.rows - 1, 0).sum()) - 1.0
    return max(float(rest.sum()) / max(freedom, 1.0), 1e-14)


def _own(
    solution: FloatArray, covariance: FloatArray, prior: float, prior_u: float
) -> tuple[float | None, float | None]:
    """What the dwells alone say of C_s: the fitted value with the prior taken out again."""
    total = 1.0 / covariance[-1, -1]
    data = total - 1.0 / prior_u**2
    if data <= 0.01 * total:
        return None, None
    value = (solution[-1] * total - prior / prior_u**2) / data
    return float(value), float(data**-0.5)
