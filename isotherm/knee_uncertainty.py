"""How far the knees may be off: noise as it is in each stretch, and shapes the model does not have.

The covariance of the fit alone would be honest only if the film followed the model exactly. Two doubts
are added as nuisance parameters with priors: the shape of each rounding (softplus, Gaussian or hyperbolic:
nobody knows), and one more polynomial degree in each stretch. They widen the covariance by as much as
the data leave open (Kennedy & O'Hagan, J. R. Stat. Soc. B 2001, 63, 425, for the principle).
"""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.knee_model import KneeModel, correlation_gain, model_terms

__all__ = ["with_model_doubt"]

FloatArray = NDArray[np.float64]

SHAPE_SIGMA: Final = 0.5  # of the mixture between softplus (0) and the other roundings (about ±1)
# of the next polynomial term, as a share of the pressure that the stretch covers
DEGREE_SIGMA: Final = 0.1
LEVEL: Final = 5.0  # mN/m; modulus that a stretch taken for level may have
# A rounded knee's place is a convention: extended how far, from where? Our choice, a standard uncertainty
# of this share of the rounding's width, on its area alone (the pressure there carries its own).
WIDTH_SHARE: Final = 0.25
FEWEST: Final = 6  # points from which a stretch has a scatter of its own


def with_model_doubt(
    model: KneeModel,
    x: FloatArray,
    y: FloatArray,
    sigma: FloatArray,
    *,
    last_bend: float | None = None,
) -> KneeModel:
    """The model with its covariance widened by nuisance parameters.

    Parameters
    ----------
    x, y, sigma : (n,) the points `model` was fitted to.
    last_bend : prior of the last stretch's next polynomial term, where it is not `DEGREE_SIGMA`.
    """
    terms = model_terms(model, x)
    residual = y - terms.design @ model.coefficients
    local = _local_sigma(model, x, residual, sigma)
    weight = 1.0 / local
    scaled = residual * weight
    huber = np.minimum(1.0, 3.0 / np.maximum(np.abs(scaled), 1e-12))
    root = weight * np.sqrt(huber)
    p, k = model.coefficients.size, model.knots.size
    shapes = (
        terms.jump * model.widths[:, None] * _other_shape(terms.z) if k else np.empty((0, x.size))
    )
    lengths = np.diff(np.concatenate([[model.start], model.knots, [model.stop]]))
    extra = []
    for j, degree in enumerate(model.degrees):
        along = terms.g[j] / max(float(lengths[j]), 1e-12)
        # zero at both ends of the stretch: it bends the branch and leaves its meeting points alone
        extra.append(along ** (degree + 1) - along**degree if degree else along)
    cover = [max(float(np.ptp(terms.parts[j])), 1e-6) for j in range(k + 1)]
    jacobian = np.concatenate([terms.jacobian, shapes.T, np.stack(extra, axis=1)], axis=1)
    jacobian *= root[:, None]
    normal = jacobian.T @ jacobian
    prior = np.zeros(normal.shape[0])
    if model.knot_precision is not None:
        prior[p : p + k] = model.knot_precision
    prior[p + k : p + 2 * k] = model.prior_precision
    prior[p + 2 * k : p + 3 * k] = 1.0 / SHAPE_SIGMA**2
    share = np.full(k + 1, DEGREE_SIGMA)
    if last_bend is not None:
        share[-1] = last_bend
    extent = np.where(np.array(model.degrees) > 0, share * np.array(cover), LEVEL * lengths)
    prior[p + 3 * k :] = extent**-2.0
    normal[np.diag_indices_from(normal)] += prior
    unit = 1.0 / np.sqrt(np.maximum(np.diag(normal), 1e-300))
    inverse = np.linalg.pinv(normal * unit[:, None] * unit, rcond=1e-12, hermitian=True)
    inverse = inverse * unit[:, None] * unit
    gain = correlation_gain(scaled * np.sqrt(huber))
    n = p + 2 * k
    covariance = inverse[:n, :n] * gain
    return replace(
        model,
        covariance=covariance,
        knot_doubt=WIDTH_SHARE * model.widths,
        inflation=gain,
    )


def _other_shape(z: FloatArray) -> FloatArray:
    """Gaussian-smoothed minus hyperbolic hinge, both with the softplus's curvature at z = 0.

    Softplus'' (0) = 1/4. A hinge smoothed by a Gaussian of width s has 1/(s sqrt(2 pi)), a hyperbola
    (z + sqrt(z^2 + c^2))/2 has 1/(2 c): s = 1.596, c = 2.
    """
    from scipy.special import ndtr

    s = 4.0 / np.sqrt(2.0 * np.pi)
    gaussian = z * ndtr(z / s) + s / np.sqrt(2.0 * np.pi) * np.exp(-0.5 * (z / s) ** 2)
    hyperbola = 0.5 * (z + np.sqrt(z**2 + 4.0))
    return np.asarray(gaussian - hyperbola)


def _local_sigma(
    model: KneeModel, x: FloatArray, residual: FloatArray, sigma: FloatArray
) -> FloatArray:
    """`sigma` times the scatter actually seen in each stretch (never below 1)."""
    stretch = np.searchsorted(model.knots, x)
    out = sigma.copy()
    for j in range(model.knots.size + 1):
        inside = stretch == j
        count = int(inside.sum())
        if count < FEWEST:
            continue
        free = max(count - model.degrees[j] - 1, 1)
        r = residual[inside] / sigma[inside]
        r = np.clip(r, -4.0 * np.median(np.abs(r)) - 1.0, 4.0 * np.median(np.abs(r)) + 1.0)
        out[inside] *= max(1.0, float(np.sqrt((r @ r) / free)))
    return out
