"""Fit the laws of film loss to a condensed hold and weigh them against each other.

Every law is y(t) = y0 - b g(t; shape) with at most two shape parameters (separable least squares: Golub &
Pereyra, SIAM J. Numer. Anal. 1973, 10, 413). The shape is searched on a grid in log time and exponent that
is narrowed until it resolves the likelihood's peak: bounds and ridges, on which a start value would decide
a descent, are then no trouble, and the same grid carries the uncertainty: every quantity derived from a fit
is averaged over the nodes, weighted by their likelihood.

Choice: AICc (Hurvich & Tsai, Biometrika 1989, 76, 297) with weights exp(-Delta/2) (Burnham & Anderson,
Model Selection and Multimodel Inference, Springer 2002, sec. 2.9). Its small-sample term uses the effective
number of independent blocks, not the number of rows.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_blocks import Blocks
from isotherm.hold_models import EXPONENT_BOUNDS, LAWS, Law
from isotherm.hold_noise import NOISE_PARAMETERS, noise_grid
from isotherm.hold_solve import Nodes, WhitenedHold, solve_nodes, whiten_hold

__all__ = ["LawFit", "aicc", "fit_laws"]

FloatArray = NDArray[np.float64]

# Nodes whose -2 ln L lies further than this above the best are beyond 4 sigma and carry nothing.
_DEEPEST = 18.0
_REFINEMENTS = 12
_NOISE_SHAPES = 9
_COARSE = (41, 10)  # nodes in log time and exponent
_FINE = (31, 17)
_RESOLVED = (11, 60)  # nodes inside the peak that resolve it: one shape parameter, two
_KEPT_NODES = 4000


@dataclass(frozen=True)
class LawFit:
    """One law fitted: its likelihood and, per node of shape and noise, the level's parameters.

    name : law.  parameters : k, the noise's variance included.
    deviance : -2 ln L (constant common to all laws of one hold).  aicc : same constant.
    weight : (q,) likelihood weight of each node, sums to 1.  best : index of the most likely node.
    time_constant : (q,) s.  exponent : (q,).  level : (q,) y0.  drop : (q,) b, positive for loss.
    covariance : (q, 3) var(y0), cov(y0, b), var(b).
    noise : standard deviation of one block about the law, unit of y.
    correlation_time : s, 0 for independent noise.  share : correlated part of the noise's variance.
    effective : number of independent blocks the residuals amount to.
    """

    name: str
    parameters: int
    deviance: float
    aicc: float
    weight: FloatArray
    best: int
    time_constant: FloatArray
    exponent: FloatArray
    level: FloatArray
    drop: FloatArray
    covariance: FloatArray
    noise: float
    correlation_time: float
    share: float
    effective: float


def aicc(deviance: float, parameters: int, effective: float) -> float:
    """Small-sample criterion -2 ln L + 2 k + 2 k (k + 1)/(n - k - 1).

    Parameters
    ----------
    deviance : float
        -2 ln L.
    parameters : int
        k, the noise's variance included.
    effective : float
        n, independent observations. The last term is held at its value for n - k - 1 = 1 below that, where
        it would diverge and then change sign: correlated residuals may amount to fewer than k + 2.

    Returns
    -------
    float
    """
    left = max(effective - parameters - 1.0, 1.0)
    return deviance + 2.0 * parameters + 2.0 * parameters * (parameters + 1.0) / left


def _axes(
    law: Law, low: FloatArray, high: FloatArray, counts: tuple[int, int]
) -> tuple[FloatArray, FloatArray]:
    """Grid of shapes between the corners (log time, exponent), flattened to two (k,) arrays."""
    if law.times == 0:
        return np.ones(1), np.ones(1)
    log_time = np.linspace(low[0], high[0], counts[0])
    if not law.exponent:
        return np.exp(log_time), np.ones(counts[0])
    exponent = np.linspace(low[1], high[1], counts[1])
    mesh_time, mesh_exponent = np.meshgrid(log_time, exponent, indexing="ij")
    return np.exp(mesh_time.ravel()), mesh_exponent.ravel()


def _likely_noise(law: Law, hold: WhitenedHold, nodes: Nodes) -> NDArray[np.int64]:
    """Covariances worth keeping, judged at the likeliest shapes found so far."""
    every = np.arange(hold.grid.share.size)
    best = np.argsort(nodes.deviance.min(axis=0))[:_NOISE_SHAPES]
    tried = solve_nodes(law, hold, nodes.time_constant[best], nodes.exponent[best], every)
    profile = tried.deviance.min(axis=1)
    return np.flatnonzero(profile < profile.min() + _DEEPEST / 2.0)


def _search(law: Law, hold: WhitenedHold) -> Nodes:
    """Narrow the grid of shapes until the peak of the likelihood is resolved.

    The covariances are chosen anew at every step: on a coarse grid the misfit of the nearest shape looks
    like slow noise, and keeping what that suggests would widen every u.
    """
    blocks = hold.blocks
    every = np.arange(hold.grid.share.size)
    span = float(blocks.time[-1])
    # Faster than two blocks is not resolved; slower than thirty holds is a straight line.
    spacing = float(np.median(np.diff(blocks.time)))
    low = np.array([np.log(2.0 * spacing), EXPONENT_BOUNDS[0]])
    high = np.array([np.log(30.0 * span), EXPONENT_BOUNDS[1]])
    counts = _COARSE
    nodes = solve_nodes(law, hold, *_axes(law, low, high, counts), every)
    if law.times == 0:
        return nodes
    needed = _RESOLVED[1] if law.exponent else _RESOLVED[0]
    which = every
    for _ in range(_REFINEMENTS):
        before, which = which, _likely_noise(law, hold, nodes)
        depth = nodes.deviance.min(axis=0) - nodes.deviance.min()
        inside = depth < _DEEPEST
        resolved = int(inside.sum()) >= needed
        if resolved and np.array_equal(before, which):
            break
        if not resolved:
            at = np.stack([np.log(nodes.time_constant), nodes.exponent], axis=1)[inside]
            step = (high - low) / (np.array(counts) - 1)
            low = np.maximum(at.min(axis=0) - step, low)
            high = np.minimum(at.max(axis=0) + step, high)
            counts = _FINE
        nodes = solve_nodes(law, hold, *_axes(law, low, high, counts), which)
    return nodes


def _summary(law: Law, hold: WhitenedHold, nodes: Nodes) -> LawFit:
    """Keep the nodes that carry weight, in the hold's own unit."""
    flat = int(np.argmin(nodes.deviance))
    row, _ = np.unravel_index(flat, nodes.deviance.shape)
    j = int(nodes.which[row])
    log_weight = nodes.log_weight.ravel()
    order = np.argsort(log_weight)[::-1][:_KEPT_NODES]
    order = order[log_weight[order] > log_weight[order[0]] - _DEEPEST / 2.0]
    if flat not in order:
        order = np.append(order, flat)
    weight = np.exp(log_weight[order] - log_weight[order].max())
    columns = np.broadcast_to(np.arange(nodes.time_constant.size), nodes.deviance.shape).ravel()
    deviance = float(nodes.deviance.ravel()[flat])
    parameters = law.parameters + NOISE_PARAMETERS
    effective = float(hold.grid.effective[j])
    return LawFit(
        name=law.name,
        parameters=parameters,
        deviance=deviance,
        aicc=aicc(deviance, parameters, np.inf),
        weight=weight / weight.sum(),
        best=int(np.flatnonzero(order == flat)[0]),
        time_constant=nodes.time_constant[columns[order]],
        exponent=nodes.exponent[columns[order]],
        level=nodes.level.ravel()[order] * hold.scale,
        drop=nodes.drop.ravel()[order] * hold.scale,
        covariance=nodes.covariance.reshape(-1, 3)[order] * hold.scale**2,
        noise=float(np.sqrt(nodes.variance.ravel()[flat])) * abs(hold.scale),
        correlation_time=float(hold.grid.correlation_time[j]),
        share=float(hold.grid.share[j]),
        effective=effective,
    )


def fit_laws(blocks: Blocks) -> tuple[LawFit, ...]:
    """Fit every law of `hold_models.LAWS` to a condensed hold.

    Parameters
    ----------
    blocks : Blocks
        At least a dozen blocks; time from the moment the set point was reached.

    Returns
    -------
    tuple of LawFit
        In order of increasing AICc.
    """
    hold = whiten_hold(blocks, noise_grid(blocks.time))
    fits = [_summary(law, hold, _search(law, hold)) for law in LAWS.values()]
    # One number of independent blocks for all laws, that of the likeliest: a law that misses the trend
    # sees it as slow noise, and its own count would say more of the misfit than of the data.
    effective = min(fits, key=lambda fit: fit.aicc).effective
    scored = [replace(fit, aicc=aicc(fit.deviance, fit.parameters, effective)) for fit in fits]
    return tuple(sorted(scored, key=lambda fit: fit.aicc))
