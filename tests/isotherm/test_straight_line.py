"""The line against NumPy's, and on points that give none."""

from __future__ import annotations

import numpy as np
import pytest

from isotherm.straight_line import straight_line


@pytest.mark.parametrize("seed", range(4))
def test_it_is_the_least_squares_line(seed: int) -> None:
    random = np.random.default_rng(seed)
    x = random.uniform(-3.0, 9.0, 30) * 10.0**seed
    y = 2.0 - 0.4 * x + random.standard_normal(30)
    assert straight_line(x, y) == pytest.approx(tuple(np.polyfit(x, y, 1)), rel=1e-9)


@pytest.mark.parametrize("x", [[5.0], [5.0, 5.0, 5.0], [0.0, 0.0], [0.1 + 0.2, 0.3, 0.3]])
def test_points_at_one_place_have_a_mean_and_no_slope(x: list[float]) -> None:
    y = np.arange(len(x)) * 1.0
    assert straight_line(np.array(x), y) == (0.0, y.mean())
