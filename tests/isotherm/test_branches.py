"""Turning points, pauses and jitter."""

import numpy as np
import pytest

from isotherm.branches import find_branches, quantum, robust_noise, steady_area
from tests.support.isotherm_traces import make_trace


def test_noise_of_a_smooth_signal_with_spikes() -> None:
    random = np.random.default_rng(1)
    signal = np.linspace(0, 50, 5000) ** 1.5 / 10 + 0.2 * random.standard_normal(5000)
    signal[::500] += 30
    assert robust_noise(signal) == pytest.approx(0.2, rel=0.1)


def test_quantum_of_a_rounded_reading() -> None:
    random = np.random.default_rng(2)
    fine = np.linspace(0, 5, 3000) + 0.02 * random.standard_normal(3000)
    assert quantum(np.round(fine, 1)) == pytest.approx(0.1, rel=1e-6)
    assert quantum(fine) == 0.0
    # a reading coarser than its noise scatters by its rounding error at least
    assert robust_noise(np.round(fine, 0)) >= 1.0 / np.sqrt(12)


@pytest.mark.parametrize("legs", [1, 2, 3, 7])
def test_legs_are_counted(legs: int) -> None:
    down = np.linspace(2.0, 0.5, 400)
    area = np.concatenate([down if k % 2 == 0 else down[::-1] for k in range(legs)])
    random = np.random.default_rng(legs)
    noisy = area + 0.003 * random.standard_normal(area.size)
    branches = find_branches(make_trace(noisy, 1 / noisy))
    assert len(branches) == legs
    assert [b.direction for b in branches] == [
        "compression" if k % 2 == 0 else "expansion" for k in range(legs)
    ]
    assert [b.cycle for b in branches] == [k // 2 + 1 for k in range(legs)]
    for k, branch in enumerate(branches):
        assert branch.rows[0] == pytest.approx(400 * k, abs=8)
        assert branch.rows[-1] == pytest.approx(400 * (k + 1), abs=8)


def test_a_hold_at_the_end_belongs_to_no_branch() -> None:
    area = np.concatenate([np.linspace(2.0, 0.5, 500), np.full(1000, 0.5)])
    random = np.random.default_rng(3)
    noisy = area + 0.001 * random.standard_normal(1500)
    (branch,) = find_branches(make_trace(noisy, 1 / noisy))
    # the first row within the scatter of the smallest area is its end
    assert 490 <= branch.rows[-1] <= 515


def test_a_small_reversal_is_not_a_branch() -> None:
    area = np.linspace(2.0, 0.5, 1000)
    area[600:610] += 0.02
    assert len(find_branches(make_trace(area, 1 / area))) == 1


def test_steady_area_keeps_steady_travel() -> None:
    line = np.linspace(2.0, 0.5, 2000)
    random = np.random.default_rng(4)
    noisy = line + 0.004 * random.standard_normal(2000)
    smooth = steady_area(noisy)
    assert np.std(smooth - line) < 0.4 * 0.004
    assert abs(np.mean(smooth - line)) < 2e-4
    clean = np.linspace(2.0, 0.5, 2000)
    assert steady_area(clean) is clean
