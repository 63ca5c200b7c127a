"""A branch as smooth stretches that meet at rounded knees: one continuous function, fitted jointly.

Each stretch j has its own coordinate g_j(x): the distance travelled inside it, zero before it begins
and constant after it ends, with both ends rounded by a softplus of the knee's width. The pressure is a
constant plus one polynomial of each g_j. Two neighbouring polynomials, extended past their knee, meet
exactly at the knee's x: the trade's tangent construction is a parameter of the fit, with a covariance.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "INDIFFERENT",
    "WIDEST",
    "KneeModel",
    "ModelTerms",
    "choose_degrees",
    "correlation_gain",
    "fit_knees",
    "model_terms",
]

FloatArray = NDArray[np.float64]

MAX_ITERATIONS: Final = 14
WIDEST: Final = 0.5  # rounding width, as a share of the shorter neighbouring stretch
CONVERGED: Final = 1e-2  # smallest fall of χ² worth another iteration, in units of its mean term
# Misfits below this share of the pressure range decide nothing: no rounding shape is exact (our choice).
INDIFFERENT: Final = 5e-5
# Huber's bound for the scaled residual (Huber, Robust Statistics, 1981: 1.345 for 95 % efficiency; wider
# here, since spikes are already out and only their remains matter).
HUBER: Final = 3.0
# Weak prior on ln(width / stretch): rounded by a few per cent of the neighbouring stretch, within a
# factor of e^1.5; it only matters where the data say nothing about the rounding.
PRIOR_LOG_WIDTH: Final = -3.5
PRIOR_LOG_WIDTH_SIGMA: Final = 1.5


@dataclass(frozen=True)
class KneeModel:
    """A fitted branch.

    knots, widths : (K,) knee positions and rounding widths in x = -ln A.
    degrees : K + 1 polynomial degrees. scales : (K + 1,) lengths that scale g_j.
    coefficients : constant first, then the polynomials in order, mN/m.
    covariance : (p + 2K, p + 2K) of coefficients, knots, ln widths, scaled to the residuals.
    rss : weighted sum of squares; dof : n - parameters; inflation : factor put on the covariance.
    start, stop : first and last x of the fit.
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

    def pressure(self, x: FloatArray) -> FloatArray:
        """Fitted pressure at (n,) x, mN/m."""
        g, _, _ = _coordinates(x, self.knots, self.widths, self._origin(0))
        return np.asarray(_design(g, self.degrees, self.scales) @ self.coefficients)

    def modulus(self, x: FloatArray) -> FloatArray:
        """Fitted dΠ/dx at (n,) x, mN/m."""
        g, rise, _ = _coordinates(x, self.knots, self.widths, self._origin(0))
        slopes = _slopes(g, self.degrees, self.scales, self.coefficients)
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


def _coordinates(
    x: FloatArray, knots: FloatArray, widths: FloatArray, centre: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """g (K+1, n); rise (K, n) = dh_k/dx; broaden (K, n) = dh_k/d ln w_k; `centre` serves K = 0."""
    if knots.size == 0:
        return (x - centre)[None, :], np.empty((0, x.size)), np.empty((0, x.size))
    z = (x[None, :] - knots[:, None]) / widths[:, None]
    tail = np.exp(-np.abs(z))
    plus = np.maximum(z, 0.0) + np.log1p(tail)
    rise = np.where(z >= 0, 1.0, tail) / (1.0 + tail)
    h = widths[:, None] * plus
    broaden = widths[:, None] * (plus - z * rise)
    g = np.empty((knots.size + 1, x.size))
    g[0] = x - knots[0] - h[0]
    g[1:-1] = h[:-1] - h[1:]
    g[-1] = h[-1]
    return g, rise, broaden


def _design(g: FloatArray, degrees: tuple[int, ...], scales: FloatArray) -> FloatArray:
    columns = [np.ones(g.shape[1])]
    for j, degree in enumerate(degrees):
        scaled = g[j] / scales[j]
        power = scaled
        for _ in range(degree):
            columns.append(power)
            power = power * scaled
    return np.stack(columns, axis=1)


def _slopes(
    g: FloatArray, degrees: tuple[int, ...], scales: FloatArray, coefficients: FloatArray
) -> FloatArray:
    """dp_j/dg_j for every stretch, (K+1, n)."""
    out = np.zeros_like(g)
    position = 1
    for j, degree in enumerate(degrees):
        scaled = g[j] / scales[j]
        power = np.full(g.shape[1], 1.0 / scales[j])
        for m in range(1, degree + 1):
            out[j] += m * coefficients[position] * power
            power = power * scaled
            position += 1
    return out


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
    g, rise, broaden = _coordinates(x, model.knots, model.widths, 0.5 * (model.start + model.stop))
    design = _design(g, model.degrees, model.scales)
    slopes = _slopes(g, model.degrees, model.scales, model.coefficients)
    jacobian, jump = _jacobian(design, slopes, rise, broaden)
    parts = np.zeros_like(g)
    first = 1
    for j, degree in enumerate(model.degrees):
        parts[j] = design[:, first : first + degree] @ model.coefficients[first : first + degree]
        first += degree
    z = (x[None, :] - model.knots[:, None]) / model.widths[:, None]
    return ModelTerms(g, parts, design, jacobian, jump, z)


def _jacobian(
    design: FloatArray, slopes: FloatArray, rise: FloatArray, broaden: FloatArray
) -> tuple[FloatArray, FloatArray]:
    jump = slopes[1:] - slopes[:-1]
    by_knot = -jump * rise
    if jump.shape[0]:
        by_knot[0] -= slopes[0]
    return np.concatenate([design, by_knot.T, (jump * broaden).T], axis=1), jump


def correlation_gain(residual: FloatArray) -> float:
    """Factor on a variance for neighbouring (n,) residuals that are correlated: AR(1), (1+ρ)/(1-ρ)."""
    total = float(residual @ residual)
    if total <= 0:
        return 1.0
    lag = float(residual[1:] @ residual[:-1]) / total
    lag = min(max(lag - 1.0 / max(residual.size, 1), 0.0), 0.9)
    return (1.0 + lag) / (1.0 - lag)


def _scales(x: FloatArray, knots: FloatArray) -> FloatArray:
    return np.maximum(np.diff(np.concatenate([[x[0]], knots, [x[-1]]])), 1e-9)


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
    scales = _scales(x, knots)
    g, _, _ = _coordinates(x, knots, widths, 0.5 * float(x[0] + x[-1]))
    floor = float(np.sum(sigma**-2.0)) * (INDIFFERENT * max(float(np.ptp(y)), 1e-9)) ** 2
    degrees = [min(1, h) for h in highest]
    weight = 1.0 / sigma
    target = y * weight
    n = x.size
    while True:
        design = _design(g, tuple(degrees), scales) * weight[:, None]
        q, _ = np.linalg.qr(design)
        residual = target - q @ (q.T @ target)
        open_stretches = [j for j, d in enumerate(degrees) if d < highest[j]]
        if not open_stretches:
            return tuple(degrees)
        extra = np.stack(
            [(g[j] / scales[j]) ** (degrees[j] + 1) * weight for j in open_stretches], axis=1
        )
        extra -= q @ (q.T @ extra)
        size = np.maximum(np.sum(extra**2, axis=0), 1e-300)
        gain = (extra.T @ residual) ** 2 / size
        rss = float(residual @ residual)
        best = int(np.argmax(gain))
        left = max(rss - float(gain[best]), 0.0) + floor
        if n * np.log((rss + floor) / left) < np.log(n) + 2.0:
            return tuple(degrees)
        degrees[open_stretches[best]] += 1


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
) -> KneeModel:
    """Fit knots, widths and polynomials together (Levenberg-Marquardt, Huber weights).

    Parameters
    ----------
    x, y, sigma : (n,) x = -ln A increasing; pressure and its standard uncertainty, mN/m.
    knots, widths : (K,) starting values. degrees : K + 1 polynomial degrees.
    iterations : at most so many. widest : largest rounding, a share of the shorter neighbour.

    Returns
    -------
    KneeModel
        The covariance is that of the weighted fit times an inflation that covers excess scatter and
        the correlation of neighbouring residuals.
    """
    knots, widths = knots.astype(float).copy(), widths.astype(float).copy()
    k = knots.size
    scales = _scales(x, knots)
    spacing = float(x[-1] - x[0]) / max(x.size, 1)
    gaps = np.diff(np.concatenate([[x[0]], knots, [x[-1]]]))
    room = np.minimum(gaps[:-1], gaps[1:])
    floor = np.maximum(np.minimum(0.1 * spacing, 0.02 * room), 1e-9)
    widths = np.clip(widths, floor, widest * room)
    prior_mean = np.log(np.maximum(room, 1e-9)) + PRIOR_LOG_WIDTH
    weight = 1.0 / sigma
    start = _coordinates(x, knots, widths, 0.5 * float(x[0] + x[-1]))[0]
    start_design = _design(start, degrees, scales) * weight[:, None]
    solved = np.linalg.lstsq(start_design, y * weight, rcond=None)[0]
    coefficients = np.asarray(solved, dtype=np.float64)
    p = coefficients.size
    damping = 1e-3
    huber = np.ones_like(y)

    def evaluate(
        c: FloatArray, kn: FloatArray, w: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        g, rise, broaden = _coordinates(x, kn, w, 0.5 * float(x[0] + x[-1]))
        design = _design(g, degrees, scales)
        return (y - design @ c) * weight, design, rise, broaden

    def cost(residual: FloatArray, w: FloatArray) -> float:
        prior = (np.log(w) - prior_mean) / PRIOR_LOG_WIDTH_SIGMA
        return float(np.sum(huber * residual**2) + np.sum(prior**2))

    residual, design, rise, broaden = evaluate(coefficients, knots, widths)
    normal = np.eye(p + 2 * k)
    robust = False
    for _ in range(iterations):
        if robust:
            scale = max(1.0, 1.4826 * float(np.median(np.abs(residual))))
            huber = np.minimum(1.0, HUBER * scale / np.maximum(np.abs(residual), 1e-12))
        g, _, _ = _coordinates(x, knots, widths, 0.5 * float(x[0] + x[-1]))
        slopes = _slopes(g, degrees, scales, coefficients)
        jacobian, _ = _jacobian(design, slopes, rise, broaden)
        jacobian *= weight[:, None]
        weighted = jacobian * huber[:, None]
        normal = weighted.T @ jacobian
        right = weighted.T @ residual
        normal[p + k :, p + k :] += np.eye(k) / PRIOR_LOG_WIDTH_SIGMA**2
        right[p + k :] -= (np.log(widths) - prior_mean) / PRIOR_LOG_WIDTH_SIGMA**2
        now = cost(residual, widths)
        accepted = False
        # unit diagonal: the parameters differ by many orders of magnitude
        unit = 1.0 / np.sqrt(np.maximum(np.diag(normal), 1e-300))
        scaled = normal * unit[:, None] * unit
        for _ in range(6):
            trust = scaled + (damping + 1e-10) * np.eye(scaled.shape[0])
            step = unit * np.linalg.solve(trust, unit * right)
            new_knots = knots + np.clip(step[p : p + k], -0.3 * room, 0.3 * room)
            new_widths = np.clip(
                widths * np.exp(np.clip(step[p + k :], -1.0, 1.0)), floor, widest * room
            )
            edges = np.concatenate([[x[0]], new_knots, [x[-1]]])
            if np.all(np.diff(edges) > 0.02 * np.minimum(gaps, 1.0)):
                trial = coefficients + step[:p]
                r, d, ri, br = evaluate(trial, new_knots, new_widths)
                if cost(r, new_widths) <= now:
                    accepted = True
                    break
            damping *= 8.0
        if not accepted:
            if robust:
                break
            robust, damping = True, 1e-3
            continue
        gain = now - cost(r, new_widths)
        coefficients, knots, widths = trial, new_knots, new_widths
        residual, design, rise, broaden = r, d, ri, br
        damping = max(damping * 0.2, 1e-9)
        if gain < CONVERGED * max(1.0, now / x.size):
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
    )
    return model


def _inflation(residual: FloatArray, huber: FloatArray, dof: int) -> float:
    """Factor on the covariance: reduced χ² (never below 1) times the gain of correlated residuals."""
    r = residual * np.sqrt(huber)
    return max(float(r @ r) / dof, 1.0) * correlation_gain(r)
