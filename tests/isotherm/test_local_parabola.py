"""The local parabola against NumPy's weighted polynomial fit, which is made in another way."""

from __future__ import annotations

import numpy as np
import pytest

from isotherm.modulus import _parabola


@pytest.mark.parametrize(("points", "degree"), [(3, 1), (4, 1), (5, 2), (6, 2), (40, 2)])
def test_value_slope_and_both_uncertainties(points: int, degree: int) -> None:
    """Uneven weights and offsets that are not centred, so that every cofactor counts."""
    random = np.random.default_rng(points)
    t = np.sort(random.uniform(-0.1, 0.3, points))
    sigma = random.uniform(0.02, 0.2, points)
    y = 3.0 + 20.0 * t + 80.0 * t**2 + 0.1 * random.normal(size=points)
    fit = _parabola(t[None], y[None], 1.0 / sigma[None] ** 2, np.array([points]))
    coefficients, covariance = np.polyfit(t, y, degree, w=1.0 / sigma, cov="unscaled")
    u = np.sqrt(np.diag(covariance))
    assert fit.value[0] == pytest.approx(coefficients[-1], rel=1e-8)
    assert fit.slope[0] == pytest.approx(coefficients[-2], rel=1e-8)
    assert fit.u_value[0] == pytest.approx(u[-1], rel=1e-8)
    assert fit.u_slope[0] == pytest.approx(u[-2], rel=1e-8)


@pytest.mark.parametrize("t", [[0.0, 0.1], [0.2, 0.2, 0.2], [0.0, 0.0, 0.0, 0.0, 0.0]])
def test_what_gives_no_slope_has_no_finite_uncertainty(t: list[float]) -> None:
    points = len(t)
    fit = _parabola(
        np.array([t]), np.arange(points)[None] * 1.0, np.ones((1, points)), np.array([points])
    )
    assert np.isinf(fit.u_slope[0])
    assert np.isinf(fit.u_value[0])
