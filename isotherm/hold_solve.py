"""Level and drop of one law in closed form, at many shapes and noise covariances at once.

With the shape of g and the covariance C fixed, y = y0 - b g is linear: generalised least squares
(Seber & Wild, Nonlinear Regression, Wiley 1989, sec. 2.1.4). Constraints are met by solving on the bound
that the free solution oversteps.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_blocks import RESOLUTION, Blocks
from isotherm.hold_models import Law, growth
from isotherm.hold_noise import NoiseGrid

__all__ = ["Nodes", "WhitenedHold", "solve_nodes", "whiten_hold"]

FloatArray = NDArray[np.float64]

# Three-point Gauss-Legendre nodes and weights on [-1, 1] (exact to order 5): the mean of g over a block.
_GAUSS_NODES = np.array([-np.sqrt(0.6), 0.0, np.sqrt(0.6)])
_GAUSS_WEIGHTS = np.array([5.0, 8.0, 5.0]) / 18.0
# g flatter than this (relative variance over the hold) cannot be told from the level itself.
_FLAT = 1e-9
_TINY = 1e-300


@dataclass(frozen=True)
class WhitenedHold:
    """A hold's blocks seen through every candidate covariance.

    y : (j, m) whitened level / scale - 1.  one : (j, m) whitened ones.  scale : unit of the level.
    """

    blocks: Blocks
    grid: NoiseGrid
    y: FloatArray
    one: FloatArray
    scale: float


@dataclass(frozen=True)
class Nodes:
    """Fits of one law at k shapes and j covariances, in units of the hold's scale; (j, k) unless noted.

    time_constant, exponent : (k,) shapes.  which : (j,) index into the noise grid.
    level : y0.  drop : b.  deviance : -2 ln(maximum likelihood).
    log_weight : ln of the restricted likelihood (level and drop integrated out).
    covariance : (j, k, 3) var(y0), cov(y0, b), var(b).  variance : s^2 of the noise.
    """

    time_constant: FloatArray
    exponent: FloatArray
    which: NDArray[np.int64]
    level: FloatArray
    drop: FloatArray
    deviance: FloatArray
    log_weight: FloatArray
    covariance: FloatArray
    variance: FloatArray


def whiten_hold(blocks: Blocks, grid: NoiseGrid) -> WhitenedHold:
    """Whiten a hold's level with every candidate covariance of `grid`."""
    scale = float(np.mean(blocks.level)) or 1.0
    y = blocks.level / scale - 1.0
    return WhitenedHold(blocks, grid, grid.whitener @ y, grid.whitener.sum(axis=2), scale)


def _block_growth(law: Law, blocks: Blocks, tau: FloatArray, exponent: FloatArray) -> FloatArray:
    """Mean of g over every block, (m, k)."""
    parts = [
        weight * growth(law.name, blocks.time + node * blocks.half_width, tau, exponent)
        for node, weight in zip(_GAUSS_NODES, _GAUSS_WEIGHTS, strict=True)
    ]
    return np.asarray(sum(parts))


def _few_observations(effective: FloatArray, parameters: int) -> FloatArray:
    """Widening of a variance estimated from few independent observations: nu / (nu - 2).

    JCGM 101:2008, 6.4.9.4: the standard uncertainty of a quantity known by a t-distribution. Below three
    degrees of freedom the ratio is held at 3, where the distribution has no variance any more.
    """
    freedom = np.maximum(effective - parameters, 3.0)
    return np.asarray(freedom / (freedom - 2.0))


def solve_nodes(
    law: Law,
    hold: WhitenedHold,
    tau: FloatArray,
    exponent: FloatArray,
    which: NDArray[np.int64],
) -> Nodes:
    """Solve for level and drop at every shape and every chosen covariance.

    Parameters
    ----------
    law : Law
        Which g.
    hold : WhitenedHold
        The data.
    tau, exponent : (k,) arrays
        Shapes: time constant in s, exponent.
    which : (j,) int array
        Covariances of `hold.grid` to use.

    Returns
    -------
    Nodes
    """
    n = hold.blocks.time.size
    y, one = hold.y[which], hold.one[which]
    s11 = np.einsum("jm,jm->j", one, one)[:, None]
    s1y = np.einsum("jm,jm->j", one, y)[:, None]
    syy = np.einsum("jm,jm->j", y, y)[:, None]
    log_det = hold.grid.log_det[which][:, None]
    mean = s1y / s11
    few = _few_observations(hold.grid.effective[which], law.parameters)[:, None]
    if law.name == "constant":
        rss = np.maximum(syy - s1y * mean, n * RESOLUTION**2)
        variance = rss / max(n - 1, 1)
        zero = np.zeros_like(mean)
        covariance = np.stack([few * variance / s11, zero, zero], axis=-1)
        weight = -0.5 * (log_det + np.log(s11) + (n - 1) * np.log(rss))
        deviance = n * np.log(rss / n) + log_det
        return Nodes(tau, exponent, which, mean + 1.0, zero, deviance, weight, covariance, variance)
    g = _block_growth(law, hold.blocks, tau, exponent)
    size = np.maximum(np.abs(g).max(axis=0), _TINY)
    g = g / size  # the g of desorption and dissolution are not of order one
    gw = hold.grid.whitener[which] @ g
    s1g = np.einsum("jm,jmk->jk", one, gw)
    sgg = np.einsum("jmk,jmk->jk", gw, gw)
    sgy = np.einsum("jm,jmk->jk", y, gw)
    spread = np.einsum("mk,mk->k", g, g) / n - (g.sum(axis=0) / n) ** 2
    det = s11 * sgg - s1g**2
    usable = (spread > _FLAT) & (det > _FLAT * s11 * sgg)
    det = np.where(usable, det, 1.0)
    drop = np.where(usable, (s1g * s1y - s11 * sgy) / det, 0.0)
    level = np.where(usable, (s1y + drop * s1g) / s11, mean)
    if not law.signed:
        gain = drop < 0
        drop, level = np.where(gain, 0.0, drop), np.where(gain, mean, level)
    if law.bounded:
        # no more than all there is can go: y = y0 (1 - g) where the free drop passes y0
        over = drop > (level + 1.0) * size
        shrunk = s11 - 2.0 * size * s1g + size**2 * sgg
        all_gone = (s1y + s11 - size * (sgy + s1g)) / np.maximum(shrunk, _TINY)
        drop, level = np.where(over, all_gone * size, drop), np.where(over, all_gone - 1.0, level)
    least = n * RESOLUTION**2
    rss = syy + level**2 * s11 + drop**2 * sgg
    rss = np.maximum(rss - 2 * level * s1y + 2 * drop * sgy - 2 * level * drop * s1g, least)
    variance = rss / max(n - law.parameters, 1)
    spread_of = few * variance / det
    covariance = np.stack(
        [spread_of * sgg, spread_of * s1g / size, spread_of * s11 / size**2], axis=-1
    )
    # the information of independent noise is divided out: g's own scale must not favour a shape
    information = np.log(det / n**2) - np.log(np.where(usable, spread, 1.0))
    weight = -0.5 * (log_det + information + (n - 2) * np.log(rss))
    return Nodes(
        tau, exponent, which, level + 1.0, drop / size,
        n * np.log(rss / n) + log_det, np.where(usable, weight, -np.inf), covariance, variance,
    )  # fmt: skip
