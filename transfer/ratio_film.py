"""Creep and pressure coefficient of the floating film, in one least-squares fit over all dwells."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.ratio_creep import CreepModel, choose_creep_model
from transfer.ratio_nodes import Nodes

__all__ = ["MOST_CHANGE", "FilmFit", "film_area", "fit_film"]

FloatArray = NDArray[np.float64]
# Largest change of ln(area) that is followed: further off, a row or a fit is astray, and its area must be
# wrong rather than infinite.
MOST_CHANGE = 50.0


@dataclass(frozen=True)
class FilmFit:
    """What the dwells say of the film.

    model, theta : the creep and its parameters. creep, u_creep, bend : (k,) rate at each node and
    its uncertainty, 1/s, and how it changes, 1/s^2.
    compressibility : C_s = -(1/A) dA/dPi, m/mN. covariance : (size + 1, size + 1) of (theta, C_s).
    row_variance : variance of ln(area) of one row about the fit; inflation : the factor by which the
    variance of a long mean exceeds that of independent rows. mean_variance : (k,) variance of each node's
    mean ln(area). own_* : what the dwells alone say of C_s.
    """

    model: CreepModel
    theta: FloatArray
    creep: FloatArray
    u_creep: FloatArray
    bend: FloatArray
    compressibility: float
    covariance: FloatArray
    row_variance: float
    inflation: float
    mean_variance: FloatArray
    own_compressibility: float | None
    own_u: float | None


def film_area(nodes: Nodes, fit: FilmFit, node: int, time: FloatArray) -> FloatArray:
    """Film area at the set point, cm^2, that a node's dwell gives at other times if nothing was taken.

    Parameters
    ----------
    nodes : Nodes
    fit : FilmFit
    node : int
    time : (n,) s.
    """
    # a dwell's mean lies below the line through its middle where the rate changes within it
    bend = float(fit.bend[node])
    spread = nodes.tt[node] / max(nodes.rows[node], 1)
    lost = np.zeros(np.size(time))
    for index, coefficient in fit.model.loss(node, time):
        lost += fit.theta[index] * coefficient
    change = fit.compressibility * nodes.off[node] + 0.5 * bend * spread - lost
    return np.asarray(np.exp(nodes.log_area[node] + np.clip(change, -MOST_CHANGE, MOST_CHANGE)))


def fit_film(
    nodes: Nodes,
    hold_start: FloatArray,
    *,
    prior: float,
    prior_u: float,
    inflation: float = 1.0,
) -> FilmFit:
    """Fit ln A = level - (integral of creep) - C_s (Pi - Pi_target) over all dwells together.

    Levels are free; the creep's form is chosen by the data (`transfer.ratio_creep`). C_s is common; noise in
    the recorded pressure would pull it towards zero, so the pressure a moment earlier and later serves as
    its instrument, in two stages (Reiersol 1941; Theil 1953; Durbin, Rev. Int. Stat. Inst. 1954, 22, 23).

    Parameters
    ----------
    nodes : Nodes
    hold_start : (h,) s, start of each hold.
    prior, prior_u : float
        What is known of C_s beforehand and its standard uncertainty, m/mN.
    inflation : float
        Variance factor for correlated rows, from the residuals of an earlier pass.

    Returns
    -------
    FilmFit
    """
    value = prior
    variance = _row_variance(nodes, np.zeros(nodes.size), prior)
    model = choose_creep_model(nodes, hold_start, value, variance * inflation)
    theta, covariance = np.zeros(model.size), np.zeros((model.size + 1, model.size + 1))
    for _ in range(2):
        solution, covariance = _solve(nodes, model, variance * inflation, prior, prior_u)
        theta, value = solution[:-1], float(solution[-1])
        variance = _row_variance(nodes, model.rates() @ theta, value)
        model = choose_creep_model(nodes, hold_start, value, variance * inflation)
    solution, covariance = _solve(nodes, model, variance * inflation, prior, prior_u)
    theta, value = solution[:-1], float(solution[-1])
    rates = model.rates()
    own, own_u = _own(value, covariance, prior, prior_u)
    u_creep = np.sqrt(((rates @ covariance[:-1, :-1]) * rates).sum(axis=1))
    return FilmFit(
        model=model,
        theta=theta,
        creep=rates @ theta,
        u_creep=u_creep,
        bend=model.rate_changes() @ theta,
        compressibility=value,
        covariance=covariance,
        row_variance=variance,
        inflation=inflation,
        mean_variance=variance * _mean_inflation(nodes, inflation) * nodes.weight,
        own_compressibility=own,
        own_u=own_u,
    )


def _mean_inflation(nodes: Nodes, inflation: float) -> FloatArray:
    """Inflation applies to means of many rows; a mean of one row has the row's own variance."""
    return 1.0 + (inflation - 1.0) * (1.0 - 1.0 / np.maximum(nodes.rows, 1))


def _solve(
    nodes: Nodes, model: CreepModel, variance: float, prior: float, prior_u: float
) -> tuple[FloatArray, FloatArray]:
    """Solve the instrument's normal equations with priors; return the solution and its covariance."""
    size = model.size
    rates = model.rates()
    # first stage: how much of the wander the instrument carries; none, and the prior stands alone
    power = float(nodes.zz.sum())
    carried = max(float(nodes.zw.sum()), 0.0) / power if power > 0 else 0.0
    left = np.zeros((size + 1, size + 1))
    gram = np.zeros_like(left)
    precision = np.zeros_like(left)
    own = rates.T @ (rates * nodes.tt[:, None])
    left[:size, :size] = own
    left[:size, size] = rates.T @ nodes.tw
    left[size, :size] = carried * (rates.T @ nodes.zt)
    left[size, size] = carried * carried * power
    gram[:size, :size] = own
    gram[:size, size] = gram[size, :size] = left[size, :size]
    gram[size, size] = left[size, size]
    precision[:size, :size] = model.precision()
    precision[size, size] = 1.0 / prior_u**2
    right = np.concatenate([-(rates.T @ nodes.ty), [-carried * float(nodes.zy.sum())]]) / variance
    right[size] += prior / prior_u**2
    # rates are some 1e-5, so the system is scaled before it is inverted
    matrix = left / variance + precision
    scale = 1.0 / np.sqrt(np.abs(np.diag(matrix)))
    inverse = scale[:, None] * np.linalg.inv(matrix * np.outer(scale, scale)) * scale[None, :]
    solution = inverse @ right
    covariance = inverse @ (gram / variance + precision) @ inverse.T
    return solution, covariance


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
    value: float, covariance: FloatArray, prior: float, prior_u: float
) -> tuple[float | None, float | None]:
    """What the dwells alone say of C_s: the fitted value with the prior taken out again."""
    total = 1.0 / float(covariance[-1, -1])
    data = total - 1.0 / prior_u**2
    if data <= 0.01 * total:
        return None, None
    return (value * total - prior / prior_u**2) / data, float(data**-0.5)
