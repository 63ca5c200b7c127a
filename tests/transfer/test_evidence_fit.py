"""Lines with errors in both variables, and their bends."""

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from transfer.evidence_bend import find_bend
from transfer.evidence_fit import fit_line, lack_of_fit


def random_walk(n: int, u: float) -> np.ndarray:
    """Covariance of a sum of independent steps."""
    return u**2 * np.minimum.outer(np.arange(1, n + 1), np.arange(1, n + 1)).astype(float)


def test_exact_points_give_the_line_itself():
    x = np.array([0.0, 1.0, 2.0, 5.0])
    fit = fit_line(x, 3.0 + 2.5 * x, np.eye(4) * 0.01, np.zeros((4, 4)))
    assert fit.intercept == pytest.approx(3.0, abs=1e-12)
    assert fit.slope == pytest.approx(2.5, abs=1e-12)
    assert fit.chi_square == pytest.approx(0.0, abs=1e-18)


def test_without_errors_of_layers_it_is_weighted_least_squares():
    # textbook formulas of the weighted line, written out
    x = np.array([1.0, 2.0, 4.0, 7.0])
    y = np.array([1.1, 2.3, 3.9, 7.4])
    u = np.array([0.1, 0.2, 0.15, 0.3])
    w = 1 / u**2
    mean_x, mean_y = np.sum(w * x) / w.sum(), np.sum(w * y) / w.sum()
    slope = np.sum(w * (x - mean_x) * (y - mean_y)) / np.sum(w * (x - mean_x) ** 2)
    fit = fit_line(x, y, np.diag(u**2), np.zeros((4, 4)))
    assert fit.slope == pytest.approx(slope, rel=1e-12)
    assert fit.intercept == pytest.approx(mean_y - slope * mean_x, rel=1e-10)
    assert fit.u_slope == pytest.approx(np.sum(w * (x - mean_x) ** 2) ** -0.5, rel=1e-12)


def test_error_common_to_all_layers_widens_the_slope_and_leaves_the_fit():
    x = np.arange(0.0, 11.0, 2.0)
    y = 2.0 * x + np.array([0.1, -0.1, 0.05, 0.1, -0.15, 0.02])
    plain = fit_line(x, y, np.eye(6) * 0.01, np.zeros((6, 6)))
    scale = 0.02
    common = fit_line(x, y, np.eye(6) * 0.01, scale**2 * np.outer(x, x))
    assert common.slope == pytest.approx(plain.slope, rel=1e-3)
    assert common.chi_square == pytest.approx(plain.chi_square, rel=1e-6)
    assert common.u_slope == pytest.approx(np.hypot(plain.u_slope, scale * plain.slope), rel=1e-3)


def test_units_of_the_values_do_not_matter():
    rng = np.random.default_rng(3)
    x = np.arange(1.0, 9.0)
    y = 4e-10 * x + rng.normal(0, 1e-11, 8)
    cov_x = random_walk(8, 0.03)
    small = fit_line(x, y, np.eye(8) * 1e-22, cov_x)
    large = fit_line(x, y * 1e15, np.eye(8) * 1e8, cov_x)
    assert small.slope * 1e15 == pytest.approx(large.slope, rel=1e-9)
    assert small.chi_square == pytest.approx(large.chi_square, rel=1e-9)


def test_inputs_are_left_alone():
    x, y = np.arange(5.0), np.arange(5.0) ** 2
    cov = np.eye(5)
    copies = x.copy(), y.copy(), cov.copy()
    fit_line(x, y, cov, cov)
    for now, before in zip((x, y, cov), copies, strict=True):
        np.testing.assert_array_equal(now, before)


@pytest.mark.parametrize("hinged", [False, True])
def test_stated_uncertainty_holds(hinged):
    # many repeats with correlated errors of layers: pulls of the parameters have unit spread
    rng = np.random.default_rng(11)
    true = np.arange(1.0, 13.0)
    cov_x = random_walk(12, 0.04) + 0.01**2 * np.outer(true, true)
    root = np.linalg.cholesky(cov_x)
    u = 0.3
    slope_change = -1.5 if hinged else 0.0
    pulls = []
    for _ in range(400):
        y = 1.0 + 2.5 * true + slope_change * np.maximum(0, true - 6.0) + rng.normal(0, u, 12)
        x = true + root @ rng.standard_normal(12)
        fit = fit_line(x, y, np.eye(12) * u**2, cov_x, hinge=6.0 if hinged else None)
        truth = np.array([1.0, 2.5, slope_change][: len(fit.parameters)])
        pulls.append((fit.parameters - truth) / np.sqrt(np.diag(fit.covariance)))
    spread = np.std(np.array(pulls), axis=0)
    # spread of 400 draws: 1 ± 0.035
    assert np.all((spread > 0.88) & (spread < 1.13))
    assert np.all(np.abs(np.mean(np.array(pulls), axis=0)) < 0.2)


def test_lack_of_fit_is_uniform_when_nothing_is_wrong():
    rng = np.random.default_rng(5)
    x = np.arange(0.0, 10.0)
    p = [
        lack_of_fit(fit_line(x, x + rng.normal(0, 0.2, 10), np.eye(10) * 0.04, np.zeros((10, 10))))
        for _ in range(400)
    ]
    assert 0.02 < np.mean(np.array(p) < 0.05) < 0.09
    assert 0.42 < np.mean(np.array(p) < 0.5) < 0.58


def test_scatter_stands_in_for_missing_u():
    rng = np.random.default_rng(8)
    x = np.arange(0.0, 40.0)
    y = 2.0 * x + rng.normal(0, 0.5, 40)
    fit = fit_line(x, y, np.eye(40), np.zeros((40, 40)), scale_from_scatter=True)
    assert fit.noise_scale == pytest.approx(0.5, rel=0.3)
    assert lack_of_fit(fit) is None


def test_one_number_of_layers_is_no_line():
    with pytest.raises(UpstrokeError, match="not determined"):
        fit_line(np.full(3, 4.0), np.arange(3.0), np.eye(3), np.zeros((3, 3)))


def test_zero_uncertainty_is_refused():
    with pytest.raises(UpstrokeError, match="without uncertainty"):
        fit_line(np.arange(3.0), np.arange(3.0), np.diag([1.0, 0.0, 1.0]), np.zeros((3, 3)))


def bent(rng: np.random.Generator, change: float):
    reached = np.arange(21.0)
    x = np.arange(0.0, 21.0, 2.0)
    y = x + change * np.maximum(0.0, x - 10.0) + rng.normal(0, 0.3, len(x))
    cov = np.eye(len(x)) * 0.09
    line = fit_line(x, y, cov, np.zeros_like(cov))
    return find_bend(x, y, cov, np.zeros_like(cov), line, reached)


def test_a_bend_is_found_where_it_is():
    found = bent(np.random.default_rng(1), -0.6)
    assert found is not None
    assert found.p_value < 1e-3
    assert found.index_range[0] <= 10 <= found.index_range[1]
    assert abs(found.index - 10) <= 1
    assert found.fit.parameters[-1] == pytest.approx(-0.6, abs=0.15)


def test_chance_bends_are_as_rare_as_stated():
    rng = np.random.default_rng(2)
    p = np.array([bent(rng, 0.0).p_value for _ in range(200)])
    assert np.mean(p < 0.05) < 0.10
    # beyond 0.05 the value is an upper bound
    assert np.mean(p < 0.5) < 0.65


def test_one_point_beyond_is_no_bend():
    x = np.array([0.0, 1.0, 2.0, 3.0, 4.0])
    y = np.array([0.0, 1.0, 2.0, 3.0, 9.0])
    line = fit_line(x, y, np.eye(5) * 0.01, np.zeros((5, 5)))
    found = find_bend(x, y, np.eye(5) * 0.01, np.zeros((5, 5)), line, np.arange(5.0))
    assert found is None or found.fit.hinge <= 2.0
