"""Turning points, pauses and jitter."""

from dataclasses import replace

import numpy as np
import pytest

from isotherm.branches import find_branches, quantum, robust_noise, steady_area, uneven
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


@pytest.mark.parametrize("noise", [0.0, 0.001])
def test_pauses_are_left_out_to_the_row(noise: float) -> None:
    """The barrier stands still twice; what moves stays, but for a window beside each pause."""
    parts = [np.linspace(2.0, 1.5, 2000), np.full(500, 1.5), np.linspace(1.5, 0.8, 2800),
             np.full(300, 0.8), np.linspace(0.8, 0.5, 1200)]  # fmt: skip
    area = np.concatenate(parts)
    area = area + noise * np.random.default_rng(6).standard_normal(area.size)
    (branch,) = find_branches(make_trace(area, 1 / area))
    assert branch.paused == pytest.approx(800, abs=10 if noise == 0 else 160)
    assert branch.rows.size + branch.paused == branch.rows[-1] - branch.rows[0] + 1
    left_out = np.setdiff1d(np.arange(area.size), branch.rows)
    within = ((left_out >= 1990) & (left_out <= 2510)) | ((left_out >= 5290) & (left_out <= 5610))
    assert within[(left_out > 100) & (left_out < 6700)].mean() > 0.95


def test_a_steady_barrier_never_pauses() -> None:
    area = np.linspace(2.0, 0.5, 6000) + 0.004 * np.random.default_rng(7).standard_normal(6000)
    (branch,) = find_branches(make_trace(area, 1 / area))
    assert branch.paused == 0
    assert np.array_equal(np.diff(branch.rows), np.ones(branch.rows.size - 1))


@pytest.mark.parametrize("backwards", [False, True])
def test_a_run_without_time_is_a_compression_whichever_end_comes_first(backwards: bool) -> None:
    area = np.linspace(2.0, 0.5, 300)
    if backwards:
        area = area[::-1].copy()
    trace = make_trace(area, 1 / area)
    trace = replace(trace, time=None)
    (branch,) = find_branches(trace)
    assert (branch.direction, branch.cycle, branch.paused) == ("compression", 1, 0)
    assert branch.rows.tolist() == (list(range(300))[::-1] if backwards else list(range(300)))


def test_a_run_that_begins_with_an_expansion() -> None:
    down = np.linspace(2.0, 0.5, 400)
    area = np.concatenate([down[::-1], down, down[::-1]])
    branches = find_branches(make_trace(area, 1 / area))
    assert [(b.direction, b.cycle) for b in branches] == [
        ("expansion", 1), ("compression", 2), ("expansion", 2)
    ]  # fmt: skip


def test_reversals_are_branches_from_two_per_cent_of_the_range() -> None:
    """Our own bound, stated in the module."""
    for share, count in ((0.015, 1), (0.025, 3)):
        back = share * 1.5
        area = np.concatenate(
            [np.linspace(2.0, 1.0, 4000), np.linspace(1.0, 1.0 + back, 100),
             np.linspace(1.0 + back, 0.5, 3000)]
        )  # fmt: skip
        assert len(find_branches(make_trace(area, 1 / area))) == count


def test_turning_points_are_those_rows_in_a_long_run() -> None:
    """Searched on block means, placed on rows."""
    area = np.concatenate([np.linspace(2.0, 0.5, 30_001), np.linspace(0.5, 1.9, 20_000)[1:]])
    first, second = find_branches(make_trace(area, 1 / area))
    assert (int(first.rows[0]), int(first.rows[-1])) == (0, 30_000)
    assert (int(second.rows[0]), int(second.rows[-1])) == (30_000, 49_999)


def test_few_values_have_no_scatter_and_no_step() -> None:
    assert robust_noise(np.array([1.0, 2.0])) == 0.0
    assert quantum(np.array([1.0])) == 0.0
    assert quantum(np.array([1.0, 1.0, 1.1, 1.1, 1.2, 1.2])) == 0.0  # too few to tell


def test_steady_area_is_a_running_mean_of_jitter() -> None:
    random = np.random.default_rng(11)
    line = np.linspace(2.0, 0.5, 2000)
    step = 1.5 / 1999
    noise = 2.0 * step
    area = line + noise * random.standard_normal(2000)
    smooth = steady_area(area)
    half = int(np.ceil(3.0 * robust_noise(area) / step))
    inner = slice(half, -half)
    by_hand = np.convolve(area, np.full(2 * half + 1, 1.0 / (2 * half + 1)), mode="valid")
    np.testing.assert_allclose(smooth[inner], by_hand, rtol=1e-12)
    assert smooth[0] == area[0]
    assert smooth[1] == pytest.approx(area[:3].mean())
    assert np.std(smooth[inner] - line[inner]) < 0.5 * noise
    assert steady_area(line) is line


def test_odd_moments_are_told_from_jitter() -> None:
    random = np.random.default_rng(12)
    line = np.linspace(2.0, 0.5, 3000)
    step = 1.5 / 2999
    odd = np.sort(random.uniform(0.5, 2.0, 3000))[::-1]
    assert uneven(odd)
    assert uneven(odd + 0.3 * step * random.standard_normal(3000))
    assert not uneven(line)
    assert not uneven(line + step * random.standard_normal(3000))
    # a barrier that changes its speed is even in between; so is a quantised reading
    speeds = np.concatenate([np.linspace(2.0, 1.0, 500), np.linspace(1.0, 0.5, 2500)])
    assert not uneven(speeds + 0.2 * step * random.standard_normal(3000))
    assert not uneven(np.round(line / (3.0 * step)) * 3.0 * step)
    assert steady_area(odd) is odd
