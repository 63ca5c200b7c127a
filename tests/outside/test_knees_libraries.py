"""Knees against general libraries: pwlf, piecewise-regression, and exhaustive ruptures.Dynp."""

import warnings

import numpy as np
import piecewise_regression
import pwlf
import pytest
import ruptures
from numpy.typing import NDArray

from isotherm.condense import condense, row_noise
from isotherm.knee_search import propose
from isotherm.knees import find_knees, refine_knees
from isotherm.partition import StretchCosts, best_subset

FloatArray = NDArray[np.float64]


def _bent(seed: int, n: int = 300) -> tuple[FloatArray, FloatArray, float]:
    """Two straight branches in x = -ln A that meet at a knee: rows, and the knee's x."""
    random = np.random.default_rng(seed)
    x = np.linspace(0.0, 0.5, n)
    knee = float(random.uniform(0.2, 0.35))
    y = 20.0 * x + 150.0 * np.maximum(x - knee, 0.0) + 0.1 * random.standard_normal(n)
    return x, y, knee


def _ours(x: FloatArray, y: FloatArray) -> tuple[float, float]:
    area = np.exp(-x)
    noise = row_noise(area, y)
    nodes = condense(area, y, noise)
    model = refine_knees(find_knees(nodes), nodes, area, y, float(x[-1]))
    assert model.knots.size == 1
    index = model.coefficients.size
    return float(model.knots[0]), float(np.sqrt(model.covariance[index, index]))


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_pwlf_puts_the_knee_in_the_same_place(seed: int) -> None:
    x, y, _ = _bent(seed)
    at, u = _ours(x, y)
    other = pwlf.PiecewiseLinFit(x, y, seed=seed).fit(2)
    assert at == pytest.approx(float(other[1]), abs=3 * u + 2e-4)


@pytest.mark.parametrize("seed", [4, 5, 6])
def test_piecewise_regression_agrees_on_place_and_interval(seed: int) -> None:
    x, y, _ = _bent(seed)
    at, u = _ours(x, y)
    np.random.seed(seed)  # noqa: NPY002 - the package draws from the global generator
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        fit = piecewise_regression.Fit(list(x), list(y), n_breakpoints=1, n_boot=20)
        estimate = fit.get_results()["estimates"]["breakpoint1"]
    assert at == pytest.approx(estimate["estimate"], abs=3 * u + 2e-4)
    low, high = estimate["confidence_interval"]
    # its 95 % interval spans about 4 u; ours also doubts the model, so it is no narrower
    assert 0.7 * (high - low) / 4 < u < 6 * (high - low) / 4


@pytest.mark.parametrize("seed", [7, 8])
def test_exhaustive_search_of_ruptures_agrees(seed: int) -> None:
    x, y, knee = _bent(seed, n=80)
    signal = np.column_stack([y])
    found = ruptures.Dynp(model="clinear", min_size=3, jump=1).fit(signal).predict(n_bkps=1)[0]
    at, _ = _ours(x, y)
    assert abs(at - x[found]) < 2.5 * (x[1] - x[0])
    assert abs(at - knee) < 2.5 * (x[1] - x[0])


def test_partition_is_the_exact_optimum() -> None:
    # exhaustive Dynp with ordinary polynomial costs computed by numpy.polyfit
    x, y, _ = _bent(9, n=40)
    sigma = np.full(40, 0.1)

    class Parabolas(ruptures.base.BaseCost):  # type: ignore[misc]
        model, min_size = "parabolas", 4

        def fit(self, signal: FloatArray) -> "Parabolas":
            self.signal = signal
            return self

        def error(self, start: int, end: int) -> float:
            px, py = x[start:end], y[start:end]
            residual = py - np.polyval(np.polyfit(px - px.mean(), py, 2), px - px.mean())
            return float(residual @ residual) / 0.01

    expected = ruptures.Dynp(custom_cost=Parabolas(), min_size=4, jump=1).fit(y).predict(n_bkps=1)
    cost = StretchCosts(x, y, sigma)
    edges = np.arange(41)
    costs = np.full((41, 41), np.inf)
    i, j = np.triu_indices(41, 4)
    costs[i, j] = cost(i, j)
    two = [costs[0, k] + costs[k, 40] for k in range(4, 37)]
    assert 4 + int(np.argmin(two)) == expected[0]
    # with a penalty between the gain of the first and of the second cut, the partition is that one
    assert best_subset(costs, edges, 60.0, 4) == [expected[0]]


def test_proposals_include_the_knee() -> None:
    x, y, knee = _bent(10)
    assert np.min(np.abs(x[propose(x, y)] - knee)) < 0.01
