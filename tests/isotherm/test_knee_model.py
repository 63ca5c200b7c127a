"""The branch model against numerical derivatives, the judge and the partition against plain least squares."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable

import numpy as np
import pytest
from numpy.typing import NDArray

from isotherm.knee_evidence import INDIFFERENT, judge_knee, rounding_floor, with_slopes
from isotherm.knee_fit import _median, choose_degrees, fit_knees
from isotherm.knee_model import (
    KneeModel,
    coordinates,
    correlation_gain,
    design_matrix,
    model_terms,
    scales_of,
)
from isotherm.partition import StretchCosts, best_subset

Array = NDArray[np.float64]

X = np.linspace(-0.7, 1.3, 90)
KNOTS = np.array([-0.1, 0.6])
WIDTHS = np.array([0.04, 0.02])
DEGREES = (2, 3, 1)


def model_of(knots: Array, widths: Array, coefficients: Array) -> KneeModel:
    """A model of the degrees and scales above, whatever its parameters."""
    size = coefficients.size + 2 * knots.size
    return KneeModel(
        knots, widths, DEGREES, scales_of(X, KNOTS), coefficients, np.eye(size), 0.0, 1, 1.0,
        float(X[0]), float(X[-1]),
    )  # fmt: skip


COEFFICIENTS = np.array([3.0, 0.4, 1.5, 12.0, -4.0, 2.5, 40.0])
MODEL = model_of(KNOTS, WIDTHS, COEFFICIENTS)


def differences(value: Callable[[Array], Array], at: Array, step: float = 1e-6) -> Array:
    """Central differences of `value` against each of the parameters, a column each."""
    columns = []
    for i in range(at.size):
        move = np.zeros(at.size)
        move[i] = step
        columns.append((value(at + move) - value(at - move)) / (2.0 * step))
    return np.stack(columns, axis=-1)


def moved(parameters: Array) -> KneeModel:
    p, k = COEFFICIENTS.size, KNOTS.size
    return model_of(parameters[p : p + k], np.exp(parameters[p + k :]), parameters[:p])


PARAMETERS = np.concatenate([COEFFICIENTS, KNOTS, np.log(WIDTHS)])


def test_the_jacobian_is_that_of_numerical_differences() -> None:
    found = differences(lambda q: moved(q).pressure(X), PARAMETERS)
    np.testing.assert_allclose(model_terms(MODEL, X).jacobian, found, rtol=1e-5, atol=1e-6)


def test_the_modulus_is_the_slope_of_the_pressure() -> None:
    step = 1e-6
    slope = (MODEL.pressure(X + step) - MODEL.pressure(X - step)) / (2.0 * step)
    np.testing.assert_allclose(MODEL.modulus(X), slope, rtol=1e-6, atol=1e-6)


@pytest.mark.parametrize("knee", [0, 1])
def test_the_gradients_at_a_knee_are_those_of_numerical_differences(knee: int) -> None:
    value, gradient = MODEL.knee_pressure(knee)
    found = differences(lambda q: np.array([moved(q).knee_pressure(knee)[0]]), PARAMETERS)[0]
    np.testing.assert_allclose(gradient, found, rtol=1e-6, atol=1e-7)
    by_step = differences(lambda q: np.array([moved(q).slope_step(knee)[0]]), PARAMETERS)[0]
    step, u = MODEL.slope_step(knee)  # its covariance is the unit matrix
    assert u == pytest.approx(float(np.linalg.norm(by_step)), rel=1e-6)
    # without rounding, the model itself passes through the knee and bends there by the step
    sharp = model_of(KNOTS, np.full(2, 1e-9), COEFFICIENTS)
    at, near = float(KNOTS[knee]), 1e-6
    assert sharp.pressure(np.array([at]))[0] == pytest.approx(value, abs=1e-6)
    before, after = sharp.modulus(np.array([at - near, at + near]))
    assert after - before == pytest.approx(step, rel=1e-3)


@pytest.mark.parametrize("stretch", [0, 1, 2])
def test_moduli_of_a_stretch_are_those_of_the_model_far_from_its_knees(stretch: int) -> None:
    sharp = model_of(KNOTS, np.full(2, 1e-9), COEFFICIENTS)
    bounds = np.array([X[0], *KNOTS, X[-1]])
    start, stop = float(bounds[stretch]), float(bounds[stretch + 1])
    inside = np.array([start + 1e-7, 0.5 * (start + stop), stop - 1e-7])
    np.testing.assert_allclose(
        sharp.stretch_modulus(stretch), sharp.modulus(inside), rtol=1e-4, atol=1e-5
    )


def test_a_straight_line_needs_no_knee() -> None:
    g, rise, broaden = coordinates(X, np.empty(0), np.empty(0), 0.3)
    np.testing.assert_allclose(g[0], X - 0.3)
    assert rise.shape == broaden.shape == (0, X.size)
    design = design_matrix(g, (3,), np.array([2.0]))
    np.testing.assert_allclose(design, np.stack([((X - 0.3) / 2.0) ** m for m in range(4)], axis=1))


def test_far_tails_are_numbers() -> None:
    g, rise, broaden = coordinates(X, np.array([0.1]), np.array([1e-6]), 0.0)
    assert np.isfinite(g).all()
    assert np.isfinite(broaden).all()
    np.testing.assert_allclose(rise[0], X > 0.1, atol=1e-12)


@pytest.mark.parametrize("rho", [0.0, 0.3, 0.6])
def test_correlated_residuals_widen_by_the_known_factor(rho: float) -> None:
    """AR(1): the variance of a mean grows by (1 + rho)/(1 - rho) (textbook; from memory)."""
    random = np.random.default_rng(3)
    noise = random.normal(size=40_000)
    series = np.zeros(noise.size)
    for i in range(1, noise.size):
        series[i] = rho * series[i - 1] + noise[i]
    assert correlation_gain(series) == pytest.approx((1 + rho) / (1 - rho), rel=0.05)
    assert correlation_gain(np.zeros(5)) == 1.0


def test_the_fit_recovers_what_made_the_curve() -> None:
    random = np.random.default_rng(8)
    x = np.linspace(X[0], X[-1], 500)
    sigma = np.full(x.size, 0.01)
    y = MODEL.pressure(x) + sigma * random.standard_normal(x.size)
    found = fit_knees(x, y, sigma, KNOTS + 0.05, WIDTHS * 1.5, DEGREES)
    assert found.knots == pytest.approx(KNOTS, abs=0.02)
    u = np.sqrt(np.diag(found.covariance))
    n = COEFFICIENTS.size
    assert np.abs(found.pressure(x) - MODEL.pressure(x)).max() < 4.0 * 0.01 * math.sqrt(11 / 90)
    assert np.abs((found.knots - KNOTS) / u[n : n + 2]).max() < 4.0
    assert found.rss / found.dof == pytest.approx(1.0, abs=0.2)


def test_degrees_grow_only_where_the_curve_bends() -> None:
    random = np.random.default_rng(4)
    x = np.linspace(0.0, 2.0, 300)
    sigma = np.full(x.size, 0.02)
    y = 5.0 * x + np.where(x > 1.0, 30.0 * (x - 1.0) ** 2 + 20.0 * (x - 1.0) ** 3, 0.0)
    y = y + sigma * random.standard_normal(x.size)
    assert choose_degrees(x, y, sigma, np.array([1.0]), np.array([0.001]), (5, 5)) == (1, 3)
    assert choose_degrees(x, y, sigma, np.array([1.0]), np.array([0.001]), (0, 1)) == (0, 1)


def _by_least_squares(x: Array, y: Array, sigma: Array, at: float, width: float) -> float:
    """Lowest BIC of polynomials of degree 1 to 3 beside one hinge, alone and with its square."""
    t = (x - 0.5 * (x[0] + x[-1])) / (0.5 * (x[-1] - x[0]))
    h = 0.5 * ((t - at) + np.sqrt((t - at) ** 2 + 4.0 * width**2))
    best = math.inf
    for degree, curved in itertools.product((1, 2, 3), (False, True)):
        columns = [t**m for m in range(degree + 1)] + [h] + ([h * h] if curved else [])
        design = np.stack(columns, axis=1) / sigma[:, None]
        residual = y / sigma - design @ np.linalg.lstsq(design, y / sigma, rcond=None)[0]
        floor = float(np.sum(sigma**-2.0)) * (INDIFFERENT * float(np.ptp(y))) ** 2
        bic = x.size * math.log(float(residual @ residual) + floor)
        best = min(best, bic + (degree + 4 + curved) * math.log(x.size))
    return best


@pytest.mark.parametrize("seed", range(4))
def test_the_judge_agrees_with_plain_least_squares(seed: int) -> None:
    random = np.random.default_rng(seed)
    x = np.linspace(0.0, 1.0, 80) ** 1.2
    sigma = np.full(x.size, 0.05) * (1.0 + x)
    y = 3.0 * x + 2.0 * x**2 + 25.0 * np.maximum(x - 0.45, 0.0) + sigma * random.standard_normal(80)
    verdict = judge_knee(x, y, sigma)
    assert verdict is not None
    assert verdict.x == pytest.approx(0.45, abs=0.03)
    assert verdict.evidence > 10.0
    again = _by_least_squares(x, y, sigma, verdict.hinge.at, verdict.hinge.width)
    assert verdict.hinge.bic == pytest.approx(again, abs=1e-6)
    t = (x - 0.5) / 0.5
    smooth = []
    for degree in range(1, 7):
        c = np.polynomial.chebyshev.chebfit(t, y, degree, w=1.0 / sigma)
        r = (y - np.polynomial.chebyshev.chebval(t, c)) / sigma
        floor = rounding_floor(y, float(np.sum(sigma**-2.0)))
        bic = 80 * math.log(float(r @ r) + floor) + (degree + 1) * math.log(80)
        smooth.append((bic, float(r @ r)))
    assert verdict.evidence == pytest.approx(min(smooth)[0] - verdict.hinge.bic, abs=1e-6)
    assert verdict.smooth_rss == pytest.approx(min(smooth)[1], rel=1e-9)
    knee = with_slopes(verdict, x, y, sigma)
    assert knee.after - knee.before == pytest.approx(25.0, rel=0.25)
    assert (knee.x, knee.width, knee.evidence) == (verdict.x, verdict.width, verdict.evidence)


@pytest.mark.parametrize("seed", range(3))
def test_a_smooth_curve_has_no_knee(seed: int) -> None:
    random = np.random.default_rng(seed)
    x = np.linspace(0.0, 1.0, 120)
    y = 20.0 * x**3 + 4.0 * x + 0.05 * random.standard_normal(120)
    verdict = judge_knee(x, y, np.full(120, 0.05))
    assert verdict is not None
    assert verdict.evidence < 10.0


def test_too_few_nodes_or_no_extent_tell_nothing() -> None:
    x = np.arange(5.0)
    assert judge_knee(x, x, np.ones(5)) is None
    assert judge_knee(np.zeros(8), np.arange(8.0), np.ones(8)) is None


@pytest.mark.parametrize("seed", range(5))
def test_costs_are_those_of_fitted_parabolas(seed: int) -> None:
    random = np.random.default_rng(seed)
    x = np.sort(random.uniform(-3.0, 2.0, 60))
    sigma = random.uniform(0.02, 0.2, 60)
    y = 10.0 * np.sin(x) + sigma * random.standard_normal(60)
    cost = StretchCosts(x, y, sigma)
    a = random.integers(0, 50, 30)
    b = np.minimum(a + random.integers(4, 60, 30), 60)
    for i, j, found in zip(a, b, cost(a, b), strict=True):
        fit = np.polynomial.Polynomial.fit(x[i:j], y[i:j], 2, w=1.0 / sigma[i:j])
        rss = float(np.sum(((y[i:j] - fit(x[i:j])) / sigma[i:j]) ** 2))
        assert found == pytest.approx(rss, rel=1e-6, abs=1e-6)


def test_short_stretches_cost_nothing() -> None:
    x = np.array([0.0, 0.5, 1.0, 1.0, 2.0])
    cost = StretchCosts(x, x**3, np.ones(5))
    np.testing.assert_allclose(
        cost(np.array([0, 1, 0, 2]), np.array([1, 3, 3, 4])), 0.0, atol=1e-12
    )


@pytest.mark.parametrize("seed", range(6))
def test_the_cheapest_partition_is_that_of_trying_all(seed: int) -> None:
    random = np.random.default_rng(seed)
    edges = np.concatenate([[0], np.sort(random.choice(np.arange(1, 30), 6, replace=False)), [30]])
    costs = random.uniform(0.0, 10.0, (8, 8))
    penalty, shortest = 2.0, 3
    best = math.inf
    chosen: tuple[int, ...] = ()
    for count in range(7):
        for inner in itertools.combinations(range(1, 7), count):
            stops = (0, *inner, 7)
            if any(edges[q] - edges[p] < shortest for p, q in itertools.pairwise(stops)):
                continue
            total = sum(costs[p, q] + penalty for p, q in itertools.pairwise(stops))
            if total < best:
                best, chosen = total, inner
    assert best_subset(costs, edges, penalty, shortest) == [int(edges[i]) for i in chosen]


@pytest.mark.parametrize("size", [1, 2, 3, 8, 101])
def test_the_quick_median_is_the_median(size: int) -> None:
    values = np.random.default_rng(size).normal(size=size)
    assert _median(values) == np.median(values)
