"""Fit knees, roundings and polynomials of a branch together."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.knee_model import (
    KneeModel,
    coordinates,
    correlation_gain,
    design_matrix,
    jacobian_of,
    scales_of,
    slopes_of,
)
from isotherm.lapack import orthonormal, solve_positive

__all__ = ["INDIFFERENT", "WIDEST", "choose_degrees", "fit_knees"]

FloatArray = NDArray[np.float64]

MAX_ITERATIONS: Final = 14
WIDEST: Final = 0.2  # rounding width, as a share of the shorter neighbouring stretch
CONVERGED: Final = 0.01  # smallest fall of χ² worth another iteration, in units of its mean term
# Misfits below this share of the pressure range decide nothing: no rounding shape is exact (our choice).
INDIFFERENT: Final = 5e-5
# Huber's bound for the scaled residual (Huber, Robust Statistics, 1981: 1.345 for 95 % efficiency; wider
# here, since spikes are already out and only their remains matter).
HUBER: Final = 3.0
# Weak prior on ln(width / stretch): rounded by a few per cent of the neighbouring stretch, within a
# factor of e^1.5; it only matters where the data say nothing about the rounding.
PRIOR_LOG_WIDTH: Final = -3.5
PRIOR_LOG_WIDTH_SIGMA: Final = 1.5


def choose_degrees(
    x: FloatArray,
    y: FloatArray,
    sigma: FloatArray,
    knots: FloatArray,
    widths: FloatArray,
    highest: tuple[int, ...],
) -> tuple[int, ...]:
    """Raise polynomial degrees one at a time while BIC improves, all knees fixed.

    highest : largest degree allowed in each stretch.
    """
    scales = scales_of(x, knots)
    g, _, _ = coordinates(x, knots, widths, 0.5 * float(x[0] + x[-1]))
    floor = float(np.sum(sigma**-2.0)) * (INDIFFERENT * max(float(np.ptp(y)), 1e-9)) ** 2
    degrees = [min(1, h) for h in highest]
    weight = 1.0 / sigma
    n = x.size
    basis = np.empty((1 + sum(highest), n))  # orthonormal rows, `used` of them so far
    start = orthonormal(design_matrix(g, tuple(degrees), scales) * weight[:, None])
    used = start.shape[1]
    basis[:used] = start.T

    def left_of(row: FloatArray) -> FloatArray:
        for _ in range(2):  # once more for what rounding left of the first time
            row = row - (basis[:used] @ row) @ basis[:used]
        return row

    residual = left_of(y * weight)
    scaled = g / scales[:, None]
    powers = {j: scaled[j] ** (d + 1) * weight for j, d in enumerate(degrees) if d < highest[j]}
    extra = {j: left_of(row) for j, row in powers.items()}
    while extra:
        gains = {
            j: float(row @ residual) ** 2 / max(float(row @ row), 1e-300)
            for j, row in extra.items()
        }
        best = max(gains, key=gains.__getitem__)
        rss = float(residual @ residual)
        left = max(rss - gains[best], 0.0) + floor
        if n * math.log((rss + floor) / left) < math.log(n) + 2.0:
            break
        degrees[best] += 1
        new = extra.pop(best)
        basis[used] = new = new / math.sqrt(max(float(new @ new), 1e-300))
        used += 1
        residual = residual - float(new @ residual) * new
        for j, row in extra.items():
            extra[j] = row - float(new @ row) * new
        if degrees[best] < highest[best]:
            powers[best] = powers[best] * scaled[best]
            extra[best] = left_of(powers[best])
    return tuple(degrees)


def fit_knees(
    x: FloatArray,
    y: FloatArray,
    sigma: FloatArray,
    knots: FloatArray,
    widths: FloatArray,
    degrees: tuple[int, ...],
    *,
    iterations: int = MAX_ITERATIONS,
    widest: float = WIDEST,
    converged: float = CONVERGED,
    knot_u: FloatArray | None = None,
    bound: float = HUBER,
) -> KneeModel:
    """Fit knots, widths and polynomials together (Levenberg-Marquardt, Huber weights).

    Parameters
    ----------
    x, y, sigma : (n,) x = -ln A increasing; pressure and its standard uncertainty, mN/m.
    knots, widths : (K,) starting values. degrees : K + 1 polynomial degrees.
    iterations : at most so many. widest : largest rounding, a share of the shorter neighbour.
    converged : smallest fall of χ² worth another iteration.
    knot_u : (K,) standard uncertainty of `knots` where they are known beforehand (few points).
    bound : of the scaled residual, beyond which a point counts less.

    Returns
    -------
    KneeModel
        The covariance is that of the weighted fit times an inflation that covers excess scatter and
        the correlation of neighbouring residuals.
    """
    knots, widths = knots.astype(float).copy(), widths.astype(float).copy()
    k = knots.size
    scales = scales_of(x, knots)
    spacing = float(x[-1] - x[0]) / max(x.size, 1)
    gaps = np.diff(np.concatenate([[x[0]], knots, [x[-1]]]))
    closest = 0.02 * np.minimum(gaps, 1.0)
    room = np.minimum(gaps[:-1], gaps[1:])
    floor = np.maximum(np.minimum(0.1 * spacing, 0.02 * room), 1e-9)
    stride, ceiling = 0.3 * room, widest * room
    widths = np.maximum(np.minimum(widths, ceiling), floor)
    prior_mean = np.log(np.maximum(room, 1e-9)) + PRIOR_LOG_WIDTH
    known = np.zeros(k) if knot_u is None else knot_u**-2.0
    anchors = knots.copy()
    weight = 1.0 / sigma
    centre = 0.5 * float(x[0] + x[-1])
    start = coordinates(x, knots, widths, centre)[0]
    start_design = design_matrix(start, degrees, scales) * weight[:, None]
    solved = np.linalg.lstsq(start_design, y * weight, rcond=None)[0]
    coefficients = np.asarray(solved, dtype=np.float64)
    p = coefficients.size
    size = p + 2 * k
    priors = np.arange(p, size) * (size + 1)  # where knots and widths stand on the diagonal
    precision = np.concatenate([known, np.full(k, PRIOR_LOG_WIDTH_SIGMA**-2.0)])
    damping = 1e-3
    huber = np.ones_like(y)

    def evaluate(
        c: FloatArray, kn: FloatArray, w: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        g, rise, broaden = coordinates(x, kn, w, centre)
        design = design_matrix(g, degrees, scales)
        return (y - design @ c) * weight, design, rise, broaden

    def cost(residual: FloatArray, kn: FloatArray, w: FloatArray) -> float:
        misfit = float((huber * residual) @ residual)
        if not k:
            return misfit
        prior = (np.log(w) - prior_mean) / PRIOR_LOG_WIDTH_SIGMA
        return misfit + float(prior @ prior) + float(known @ (kn - anchors) ** 2)

    residual, design, rise, broaden = evaluate(coefficients, knots, widths)
    normal = np.eye(size)
    robust = False
    for _ in range(iterations):
        if robust:
            scale = max(1.0, 1.4826 * _median(np.abs(residual)))
            huber = np.minimum(1.0, bound * scale / np.maximum(np.abs(residual), 1e-12))
        slopes = slopes_of(design, degrees, scales, coefficients)
        jacobian, _ = jacobian_of(design, slopes, rise, broaden)
        jacobian *= weight[:, None]
        weighted = jacobian * huber[:, None]
        normal = weighted.T @ jacobian
        right = weighted.T @ residual
        normal.flat[priors] += precision
        if k:
            right[p : p + k] -= known * (knots - anchors)
            right[p + k :] -= (np.log(widths) - prior_mean) / PRIOR_LOG_WIDTH_SIGMA**2
        now = cost(residual, knots, widths)
        accepted = False
        # unit diagonal: the parameters differ by many orders of magnitude
        unit = 1.0 / np.sqrt(np.maximum(np.diag(normal), 1e-300))
        scaled = normal * unit[:, None] * unit
        for _ in range(6):
            trust = scaled.copy()
            trust.flat[:: trust.shape[0] + 1] += damping + 1e-10
            solved_step = solve_positive(trust, unit * right)
            if solved_step is None:
                damping *= 8.0
                continue
            step = unit * solved_step
            moved = np.maximum(np.minimum(step[p : p + k], stride), -stride)
            new_knots = knots + moved
            factor = np.exp(np.maximum(np.minimum(step[p + k :], 1.0), -1.0))
            new_widths = np.maximum(np.minimum(widths * factor, ceiling), floor)
            edges = np.concatenate([[x[0]], new_knots, [x[-1]]])
            if np.all(edges[1:] - edges[:-1] > closest):
                trial = coefficients + step[:p]
                r, d, ri, br = evaluate(trial, new_knots, new_widths)
                then = cost(r, new_knots, new_widths)
                if then <= now:
                    accepted = True
                    break
            damping *= 8.0
        if not accepted:
            if robust:
                break
            robust, damping = True, 1e-3
            continue
        gain = now - then
        coefficients, knots, widths = trial, new_knots, new_widths
        residual, design, rise, broaden = r, d, ri, br
        damping = max(damping * 0.2, 1e-9)
        if gain < converged * max(1.0, now / x.size):
            if robust:
                break
            robust = True
    rss = float(np.sum(huber * residual**2))
    dof = max(x.size - p - 2 * k, 1)
    inflation = _inflation(residual, huber, dof)
    unit = 1.0 / np.sqrt(np.maximum(np.diag(normal), 1e-300))
    inverse = np.linalg.pinv(normal * unit[:, None] * unit, rcond=1e-10, hermitian=True)
    covariance = inverse * unit[:, None] * unit * inflation
    model = KneeModel(
        knots,
        widths,
        degrees,
        scales,
        coefficients,
        covariance,
        rss,
        dof,
        inflation,
        float(x[0]),
        float(x[-1]),
        1.0 / PRIOR_LOG_WIDTH_SIGMA**2,
        knot_precision=None if knot_u is None else known,
    )
    return model


def _median(values: FloatArray) -> float:
    """The median of (n,) finite values, without the care that takes `numpy.median` most of its time."""
    half = values.size // 2
    if values.size % 2:
        return float(np.partition(values, half)[half])
    low, high = np.partition(values, (half - 1, half))[half - 1 : half + 1]
    return 0.5 * float(low + high)


def _inflation(residual: FloatArray, huber: FloatArray, dof: int) -> float:
    """Factor on the covariance: reduced χ² (never below 1) times the gain of correlated residuals."""
    r = residual * np.sqrt(huber)
    return max(float(r @ r) / dof, 1.0) * correlation_gain(r)
