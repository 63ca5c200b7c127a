"""Local polynomial regression: exact on parabolas, honest in its uncertainty, blind across knees."""

import numpy as np
import pytest

from isotherm.modulus import local_regression


def test_a_parabola_comes_back_exactly() -> None:
    x = np.linspace(-0.2, 1.3, 120)
    fit = local_regression(x, 3 + 4 * x + 5 * x**2, np.full(120, 0.1), np.array([0, 120]))
    assert fit.pressure == pytest.approx(3 + 4 * x + 5 * x**2, abs=1e-6)
    assert fit.modulus[2:-2] == pytest.approx((4 + 10 * x)[2:-2], abs=1e-4)


def test_the_step_at_a_knee_is_not_smeared() -> None:
    x = np.linspace(0, 1, 200)
    y = 20 * x + 180 * np.maximum(x - 0.5, 0)
    fit = local_regression(x, y, np.full(200, 0.05), np.array([0, 100, 200]))
    assert fit.modulus[80:99] == pytest.approx(20.0, abs=2.0)
    assert fit.modulus[101:120] == pytest.approx(200.0, abs=6.0)


def test_u_covers_the_scatter() -> None:
    x = np.linspace(0, 1, 250)
    inside = []
    for seed in range(40):
        random = np.random.default_rng(seed)
        y = 30 * x + 60 * x**2 + 0.1 * random.standard_normal(250)
        fit = local_regression(x, y, np.full(250, 0.1), np.array([0, 250]))
        inside.append(np.abs(fit.modulus - 30 - 120 * x) < 2 * fit.u_modulus)
    assert 0.88 < float(np.mean(inside)) < 0.999


def test_two_points_have_no_modulus() -> None:
    x = np.array([0.0, 0.1])
    fit = local_regression(x, x, np.full(2, 0.1), np.array([0, 2]))
    assert np.all(np.isinf(fit.u_modulus))
