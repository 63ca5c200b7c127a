"""A branch as smooth stretches that meet at rounded knees: one continuous function, fitted jointly.

Each stretch j has its own coordinate g_j(x): the distance travelled inside it, zero before it begins
and constant after it ends, with both ends rounded by a softplus of the knee's width. The pressure is a
constant plus one polynomial of each g_j. Two neighbouring polynomials, extended past their knee, meet
exactly at the knee's x: the trade's tangent construction is a parameter of the fit, with a covariance.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "KneeModel",
    "ModelTerms",
    "coordinates",
    "correlation_gain",
    "design_matrix",
    "jacobian_of",
    "model_terms",
    "scales_of",
    "slopes_of",
]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class KneeModel:
    """A fitted branch.

    knots, widths : (K,) knee positions and rounding widths in x = -ln A.
    degrees : K + 1 polynomial degrees. scales : (K + 1,) lengths that scale g_j.
    coefficients : constant first, then the polynomials in order, mN/m.
    covariance : (p + 2K, p + 2K) of coefficients, knots, ln widths, scaled to the residuals.
    rss : weighted sum of squares; dof : n - parameters; inflation : factor put on the covariance.
    start, stop : first and last x of the fit. prior_precision : of the ln widths.
    knot_doubt : (K,) standard uncertainty of each knee's x beyond the covariance, as a convention.
    roles : what each knee is, where that was told before the fit (few points); else None.
    knot_precision : (K,) precision of what was known of the knots' x beforehand; else None.
    """

    knots: FloatArray
    widths: FloatArray
    degrees: tuple[int, ...]
    scales: FloatArray
    coefficients: FloatArray
    covariance: FloatArray
    rss: float
    dof: int
    inflation: float
    start: float
    stop: float
    prior_precision: float = 0.0
    knot_doubt: FloatArray | None = None
    roles: tuple[str, ...] | None = None
    knot_precision: FloatArray | None = None

    def pressure(self, x: FloatArray) -> FloatArray:
        """Fitted pressure at (n,) x, mN/m."""
        g, _, _ = coordinates(x, self.knots, self.widths, self._origin(0))
        return np.asarray(design_matrix(g, self.degrees, self.scales) @ self.coefficients)

    def modulus(self, x: FloatArray) -> FloatArray:
        """Fitted dΠ/dx at (n,) x, mN/m."""
        g, rise, _ = coordinates(x, self.knots, self.widths, self._origin(0))
        design = design_matrix(g, self.degrees, self.scales)
        slopes = slopes_of(design, self.degrees, self.scales, self.coefficients)
        inside = np.diff(np.vstack([np.ones_like(x), rise, np.zeros_like(x)]), axis=0) * -1.0
        return np.asarray(np.sum(slopes * inside, axis=0))

    def stretch_modulus(self, j: int) -> FloatArray:
        """Moduli of stretch j's own polynomial at its start, middle and end, mN/m."""
        start = self.start if j == 0 else float(self.knots[j - 1])
        stop = self.stop if j == len(self.knots) else float(self.knots[j])
        at = np.array([start, 0.5 * (start + stop), stop])
        g = at - (float(self.knots[0]) if j == 0 and len(self.knots) else self._origin(j))
        first = 1 + sum(self.degrees[:j])
        out = np.zeros(3)
        for m in range(1, self.degrees[j] + 1):
            power = m * (g / self.scales[j]) ** (m - 1) / self.scales[j]
            out += self.coefficients[first + m - 1] * power
        return out

    def slope_step(self, k: int) -> tuple[float, float]:
        """Step of the modulus at knee k, mN/m, between the extended neighbours, and its u."""
        n_linear = self.coefficients.size
        gradient = np.zeros(self.covariance.shape[0])
        step = 0.0
        for j, sign in ((k, -1.0), (k + 1, 1.0)):
            first = 1 + sum(self.degrees[:j])
            # the stretch before a knee is measured at its end, the one after at its start
            inner = sign < 0 and j > 0
            g = (self.knots[j] - self.knots[j - 1]) / self.scales[j] if inner else 0.0
            for m in range(1, self.degrees[j] + 1):
                power = m * g ** (m - 1) / self.scales[j]
                step += sign * float(self.coefficients[first + m - 1]) * power
                gradient[first + m - 1] += sign * power
                if inner and m > 1:
                    bend = m * (m - 1) * g ** (m - 2) / self.scales[j] ** 2
                    change = sign * float(self.coefficients[first + m - 1]) * bend
                    gradient[n_linear + k] += change
                    gradient[n_linear + k - 1] -= change
        variance = float(gradient @ self.covariance @ gradient)
        return step, float(np.sqrt(max(variance, 0.0)))

    def _origin(self, j: int) -> float:
        if len(self.knots) == 0:
            return 0.5 * (self.start + self.stop)
        return float(self.knots[max(j - 1, 0)])

    def knee_pressure(self, k: int) -> tuple[float, FloatArray]:
        """Pressure where the extended neighbours of knee k meet, mN/m, and its gradient.

        The gradient is taken against the parameters in the order of `covariance`.
        """
        gradient = np.zeros(self.covariance.shape[0])
        gradient[0] = 1.0
        value = float(self.coefficients[0])
        position = 1 + self.degrees[0]
        n_linear = self.coefficients.size
        for j in range(1, k + 1):
            length = (self.knots[j] - self.knots[j - 1]) / self.scales[j]
            for m in range(1, self.degrees[j] + 1):
                b = self.coefficients[position]
                value += float(b * length**m)
                gradient[position] = length**m
                by_length = b * m * length ** (m - 1) / self.scales[j]
                gradient[n_linear + j] += by_length
                gradient[n_linear + j - 1] -= by_length
                position += 1
        return value, gradient


def coordinates(
    x: FloatArray, knots: FloatArray, widths: FloatArray, centre: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """g (K+1, n); rise (K, n) = dh_k/dx; broaden (K, n) = dh_k/d ln w_k; `centre` serves K = 0."""
    if knots.size == 0:
        return (x - centre)[None, :], np.empty((0, x.size)), np.empty((0, x.size))
    broad = widths[:, None]
    z = (x - knots[:, None]) / broad
    # at most 1: a tail below e^-700 is none, and spares the slow path of numbers too small to normalise
    tail = np.exp(np.maximum(-np.abs(z), -700.0))
    plus = np.log1p(tail)
    plus += np.maximum(z, 0.0)
    rise = np.where(z >= 0, 1.0, tail)
    rise /= 1.0 + tail
    h = broad * plus
    broaden = h - broad * z * rise
    g = np.empty((knots.size + 1, x.size))
    g[0] = x - knots[0] - h[0]
    g[1:-1] = h[:-1] - h[1:]
    g[-1] = h[-1]
    return g, rise, broaden


def design_matrix(g: FloatArray, degrees: tuple[int, ...], scales: FloatArray) -> FloatArray:
    """Columns of the fit, (n, p): ones, then the powers of each stretch's scaled coordinate."""
    rows = np.empty((1 + sum(degrees), g.shape[1]))  # a column is a row here: filled in one piece
    rows[0] = 1.0
    scaled = g / scales[:, None]
    position = 1
    for j, degree in enumerate(degrees):
        for m in range(degree):
            if m:
                np.multiply(rows[position - 1], scaled[j], out=rows[position])
            else:
                rows[position] = scaled[j]
            position += 1
    return rows.T


def slopes_of(
    design: FloatArray, degrees: tuple[int, ...], scales: FloatArray, coefficients: FloatArray
) -> FloatArray:
    """dp_j/dg_j of every stretch, (K+1, n), from the columns of the fit: a power slopes as the one below."""
    by_column = np.zeros((len(degrees), coefficients.size))
    position = 1
    for j, degree in enumerate(degrees):
        for m in range(1, degree + 1):
            below = position - 1 if m > 1 else 0
            by_column[j, below] = m * coefficients[position] / scales[j]
            position += 1
    return by_column @ design.T


@dataclass(frozen=True)
class ModelTerms:
    """A model's pieces at (n,) x: g (K+1, n), parts (K+1, n) mN/m, design (n, p), jacobian (n, p + 2K).

    jump : (K, n) difference of the slopes of the two neighbours of each knee. z : (K, n) distance from
    each knee in widths.
    """

    g: FloatArray
    parts: FloatArray
    design: FloatArray
    jacobian: FloatArray
    jump: FloatArray
    z: FloatArray


def model_terms(model: KneeModel, x: FloatArray) -> ModelTerms:
    """Evaluate a model with its derivatives against coefficients, knots and ln widths."""
    g, rise, broaden = coordinates(x, model.knots, model.widths, 0.5 * (model.start + model.stop))
    design = design_matrix(g, model.degrees, model.scales)
    slopes = slopes_of(design, model.degrees, model.scales, model.coefficients)
    jacobian, jump = jacobian_of(design, slopes, rise, broaden)
    parts = np.zeros_like(g)
    first = 1
    for j, degree in enumerate(model.degrees):
        parts[j] = design[:, first : first + degree] @ model.coefficients[first : first + degree]
        first += degree
    z = (x[None, :] - model.knots[:, None]) / model.widths[:, None]
    return ModelTerms(g, parts, design, jacobian, jump, z)


def jacobian_of(
    design: FloatArray, slopes: FloatArray, rise: FloatArray, broaden: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Derivatives of the pressure against coefficients, knots and ln widths, (n, p + 2K), and the jump."""
    p, k = design.shape[1], rise.shape[0]
    jump = slopes[1:] - slopes[:-1]
    rows = np.empty((p + 2 * k, design.shape[0]))
    rows[:p] = design.T
    if k:
        np.multiply(jump, -rise, out=rows[p : p + k])
        rows[p] -= slopes[0]
        np.multiply(jump, broaden, out=rows[p + k :])
    return rows.T, jump


def correlation_gain(residual: FloatArray) -> float:
    """Factor on a variance for neighbouring (n,) residuals that are correlated: AR(1), (1+ρ)/(1-ρ)."""
    total = float(residual @ residual)
    if total <= 0:
        return 1.0
    lag = float(residual[1:] @ residual[:-1]) / total
    lag = min(max(lag - 1.0 / max(residual.size, 1), 0.0), 0.9)
    return (1.0 + lag) / (1.0 - lag)


def scales_of(x: FloatArray, knots: FloatArray) -> FloatArray:
    return np.maximum(np.diff(np.concatenate([[x[0]], knots, [x[-1]]])), 1e-9)
