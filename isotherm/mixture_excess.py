"""Excess area and excess Gibbs energy of every mixture at one pressure, with their covariance."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import AVOGADRO, GAS_CONSTANT
from isotherm.mixture_areas import Composition, CompositionAreas
from isotherm.quantity import Quantity

__all__ = ["Excess", "IdealMixing", "Interaction", "excess_at", "ideal_mixing", "regular_solution"]

FloatArray = NDArray[np.float64]

# 1 nm^2 mN/m = 1e-21 J, times N_A: J/mol.
_JOULE_PER_MOLE: Final = AVOGADRO * 1e-21


@dataclass(frozen=True)
class Excess:
    """Arrays over the m mixtures, at one pressure.

    area_ideal, area_excess nm^2, gibbs J/mol, (m,); cov_area, cov_gibbs: their covariance for films
    without excess, (m, m); u_*: standard uncertainties with the common factor, (m,), and u_area (c,)
    of every composition; freedom: (m,) degrees of freedom.
    """

    area_ideal: FloatArray
    area_excess: FloatArray
    gibbs: FloatArray
    cov_area: FloatArray
    cov_gibbs: FloatArray
    u_area: FloatArray
    u_ideal: FloatArray
    u_excess: FloatArray
    u_gibbs: FloatArray
    freedom: FloatArray


@dataclass(frozen=True)
class IdealMixing:
    """R T Σ x ln x (J/mol) and its uncertainty from that of the mole fractions."""

    value: float
    u: float


@dataclass(frozen=True)
class Interaction:
    """ω of a regular solution, J/mol, and the lack-of-fit probability (None with one mixture)."""

    value: Quantity
    p: float | None


def _fraction_variance(mixed: FloatArray, u_x: FloatArray, parts: FloatArray) -> FloatArray:
    """Variance of Σ x_i parts_i from the u of the fractions, which must go on adding up to one."""
    if mixed.shape[1] == 2:  # one free fraction; both sheets' u describe it
        return np.asarray((u_x.max(axis=1) * (parts[0] - parts[1])) ** 2)
    about = parts[None, :] - (mixed @ parts)[:, None]
    k = mixed.shape[1]
    return np.asarray(((about * u_x) ** 2).sum(axis=1) * k / (k - 1))


def excess_at(compositions: Sequence[Composition], areas: CompositionAreas, column: int) -> Excess:
    """Subtract the components from the mixtures at one pressure.

    Parameters
    ----------
    compositions : pure ones first, in component order, as `areas` has them
    areas : CompositionAreas
    column : which of `areas.pressure`

    Returns
    -------
    Excess
        A_ex = L A, so cov(A_ex) = L var(A) Lᵀ: mixtures share the errors of the pure components. A
        scale factor common to every run only multiplies A_ex and is left out of the null covariance.
    """
    weights = np.array([c.fractions for c in compositions])
    k = weights.shape[1]
    mixed = weights[k:]
    u_x = np.array([c.u_fractions for c in compositions[k:]])
    pick = np.hstack([-mixed, np.eye(len(mixed))])
    area, integral = areas.area[:, column], _JOULE_PER_MOLE * areas.integral[:, column]
    var_area = areas.var_area[:, column]
    excess, gibbs, ideal = pick @ area, pick @ integral, mixed @ area[:k]
    by_x = _fraction_variance(mixed, u_x, area[:k])
    cov = pick @ np.diag(var_area) @ pick.T + np.diag(by_x)
    # The stretch below the lowest pressure is extrapolated: as uncertain as it is large.
    below = _JOULE_PER_MOLE * areas.lowest * (pick @ areas.area_lowest)
    cov_gibbs = (
        _JOULE_PER_MOLE**2 * (pick @ np.diag(areas.var_integral[:, column]) @ pick.T)
        + np.diag(_fraction_variance(mixed, u_x, integral[:k]))
        + np.diag(below**2)
    )
    common = areas.common
    scattered = pick**2 @ (areas.scatter_share[:, column] * var_area) / np.diag(cov)
    with np.errstate(divide="ignore"):
        # Welch-Satterthwaite with one part of finite freedom
        freedom = np.where(scattered > 0, areas.freedom / scattered**2, math.inf)
    return Excess(
        area_ideal=ideal,
        area_excess=excess,
        gibbs=gibbs,
        cov_area=cov,
        cov_gibbs=cov_gibbs,
        u_area=np.sqrt(var_area + (common * area) ** 2),
        u_ideal=np.sqrt(mixed**2 @ var_area[:k] + by_x + (common * ideal) ** 2),
        u_excess=np.sqrt(np.diag(cov) + (common * excess) ** 2),
        u_gibbs=np.sqrt(np.diag(cov_gibbs) + (common * gibbs) ** 2),
        freedom=freedom,
    )


def ideal_mixing(composition: Composition, kelvin: float) -> IdealMixing:
    """R T Σ x ln x of one mixture at `kelvin`."""
    x = np.array(composition.fractions)
    present = x > 0
    logs = np.log(x[present])
    u_x = np.array(composition.u_fractions)[present]
    value = GAS_CONSTANT * kelvin * float(x[present] @ logs)
    # d/dx_i = R T ln x_i relative to the mean, since fractions add up to one
    variance = _fraction_variance(x[present][None, :], u_x[None, :], logs) if len(logs) > 1 else 0.0
    return IdealMixing(value, GAS_CONSTANT * kelvin * math.sqrt(float(np.sum(variance))))


def regular_solution(fraction: FloatArray, excess: Excess, common: float) -> Interaction:
    """Fit ΔG_ex = ω x (1 - x) by generalised least squares.

    Parameters
    ----------
    fraction : (m,) mole fraction of one component
    excess : Excess
    common : relative uncertainty every run shares, 1

    Returns
    -------
    Interaction
        ω/(R T) is the interaction parameter of Joos & Demel, Biochim. Biophys. Acta 1969, 183, 447
        (from memory); above 2 a regular solution separates.
    """
    from scipy.special import chdtrc

    shape = fraction * (1.0 - fraction)
    inverse = np.linalg.pinv(excess.cov_gibbs, hermitian=True)
    information = float(shape @ inverse @ shape)
    value = float(shape @ inverse @ excess.gibbs) / information
    rest = excess.gibbs - value * shape
    m = len(fraction)
    p = float(chdtrc(m - 1, float(rest @ inverse @ rest))) if m > 1 else None
    u = math.sqrt(1.0 / information + (common * value) ** 2)
    return Interaction(Quantity(value, u, "J/mol"), p)
