"""Fit Volmer's equation of state and judge whether it describes the points."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity

__all__ = [
    "FEWEST_POINTS",
    "Misfit",
    "VolmerParameters",
    "fit_volmer",
    "runs_test",
    "smooth_misfit",
    "with_systematic",
]

FloatArray = NDArray[np.float64]

FEWEST_POINTS: Final = 10
_SMOOTH_TERMS: Final = 3  # bends a smooth misfit may have: enough for a wrong law, few for noise
_STEPS: Final = 60


@dataclass(frozen=True)
class VolmerParameters:
    """ω (nm^2), Π_coh (mN/m), factor of kT, their covariance (3, 3), residuals over σ (n,)."""

    co_area: float
    cohesion: float
    factor: float
    covariance: FloatArray
    residual: FloatArray
    chi2: float
    freedom: int


def fit_volmer(
    area: FloatArray,
    pressure: FloatArray,
    sigma: FloatArray,
    thermal: float,
    *,
    free_factor: bool = False,
) -> VolmerParameters:
    """Weighted least squares of Π = q kT/(A - ω) - Π_coh.

    Parameters
    ----------
    area : (n,) nm^2
    pressure, sigma : (n,) mN/m
    thermal : float
        kT, mN/m nm^2.
    free_factor : bool
        Fit q as well; it is 1 otherwise.

    Returns
    -------
    VolmerParameters
        The covariance comes from `sigma`, enlarged by χ²/ν where that exceeds one.

    Raises
    ------
    UpstrokeError
        For fewer than ten points.

    Notes
    -----
    Volmer, Z. Phys. Chem. 1925, 115, 253 (from memory). For a given ω the model is linear; ω alone is
    searched (variable projection, Golub & Pereyra, SIAM J. Numer. Anal. 1973, 10, 413).
    """
    from scipy.optimize import minimize_scalar

    n = len(area)
    if n < FEWEST_POINTS:
        raise UpstrokeError(
            f"the fluid branch has {n} points; {FEWEST_POINTS} are needed",
            remedy="record it more densely, or compress more slowly there",
        )
    w = 1.0 / sigma
    smallest = float(area.min())

    def solve(log_gap: float) -> tuple[FloatArray, FloatArray]:
        """Linear part for ω = smallest area - exp(log_gap): coefficients and weighted residuals."""
        volmer = thermal / (area - smallest + math.exp(log_gap))
        if free_factor:
            design = np.column_stack([volmer, -np.ones(n)]) * w[:, None]
            coefficients = np.asarray(np.linalg.lstsq(design, pressure * w, rcond=None)[0], float)
            return coefficients, pressure * w - design @ coefficients
        cohesion = float(((volmer - pressure) * w) @ w / (w @ w))
        return np.array([1.0, cohesion]), (pressure - volmer + cohesion) * w

    def cost(log_gap: float) -> float:
        return float(np.sum(solve(log_gap)[1] ** 2))

    # from a gap of a thousandth of the smallest area to far more than a molecule: bracket, then refine
    gaps = np.linspace(math.log(1e-3 * smallest), math.log(30.0 * smallest), _STEPS)
    costs = np.array([cost(g) for g in gaps])
    best = int(np.argmin(costs))
    low, high = gaps[max(best - 1, 0)], gaps[min(best + 1, _STEPS - 1)]
    found = minimize_scalar(cost, bounds=(low, high), method="bounded", options={"xatol": 1e-10})
    gap = float(found.x) if found.fun <= costs[best] else float(gaps[best])
    coefficients, residual = solve(gap)
    omega = smallest - math.exp(gap)
    factor, cohesion = float(coefficients[0]), float(coefficients[1])
    volmer = thermal / (area - omega)
    columns = [factor * volmer**2 / thermal, -np.ones(n)]
    if free_factor:
        columns.append(volmer)
    jacobian = np.column_stack(columns) * w[:, None]
    covariance = np.zeros((3, 3))
    k = len(columns)
    chi2, freedom = float(residual @ residual), n - k
    covariance[:k, :k] = np.linalg.pinv(jacobian.T @ jacobian) * max(1.0, chi2 / freedom)
    return VolmerParameters(omega, cohesion, factor, covariance, residual, chi2, freedom)


@dataclass(frozen=True)
class Misfit:
    """rms of the smooth part of the residuals (mN/m) and its probability by chance."""

    rms: float
    p: float


def smooth_misfit(
    area: FloatArray, sigma: FloatArray, fit: VolmerParameters, thermal: float
) -> Misfit:
    """Whether a smooth curve takes more out of the residuals than chance allows.

    Legendre polynomials of ln A, orthogonal to what the model's own parameters can do, are added; an
    F test compares them with what scatter is left, so that noise larger than stated is no misfit. `fit`
    is the one with a free factor of kT: an error of the area scale is one of that factor, and no fault
    of the model.
    """
    from scipy.special import fdtrc

    n = len(area)
    w = 1.0 / sigma
    x = np.log(area)
    x = 2.0 * (x - x.min()) / float(np.ptp(x)) - 1.0
    volmer = thermal / (area - fit.co_area)
    own = np.column_stack([volmer**2, np.ones(n), volmer]) * w[:, None]
    more = np.polynomial.legendre.legvander(x, _SMOOTH_TERMS + 2)[:, 1:] * w[:, None]
    basis, _ = np.linalg.qr(own)
    rest = more - basis @ (basis.T @ more)
    left, size, _ = np.linalg.svd(rest, full_matrices=False)
    extra = left[:, size > 1e-9 * size[0]]
    taken = extra.T @ fit.residual
    k = extra.shape[1]
    freedom = n - 3 - k
    gained = float(taken @ taken)
    scatter = max(fit.chi2 - gained, 0.0) / freedom
    smooth = (extra @ taken) * sigma
    rms = float(np.sqrt(np.mean(smooth**2)))
    if scatter <= 0:
        return Misfit(rms, 1.0 if gained <= 0 else 0.0)
    return Misfit(rms, float(fdtrc(k, freedom, gained / k / scatter)))


def runs_test(residual: FloatArray) -> float:
    """Two-sided probability of so few or many runs of sign (Wald & Wolfowitz 1940, normal form)."""
    from scipy.special import ndtr

    sign = residual[residual != 0] > 0
    above, below = int(sign.sum()), int((~sign).sum())
    n = above + below
    if above == 0 or below == 0:
        return 1.0 if n < 2 else 2.0 ** (1 - n)
    runs = 1 + int(np.count_nonzero(sign[1:] != sign[:-1]))
    mean = 1.0 + 2.0 * above * below / n
    variance = (mean - 1.0) * (mean - 2.0) / (n - 1)
    if variance <= 0:
        return 1.0
    # half a run of continuity correction
    z = max(abs(runs - mean) - 0.5, 0.0) / math.sqrt(variance)
    return float(2.0 * ndtr(-z))


def with_systematic(value: float, unit: str, random: float, shifts: list[float]) -> Quantity:
    """A fitted value with the changes that each systematic error of one u brings."""
    return Quantity.combine(value, unit, u_random=random, u_systematic=math.hypot(*shifts, 0.0))
