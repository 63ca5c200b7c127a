"""Slope and sudden changes of the ratio along a build: what is found, where, and how often by mistake."""

from __future__ import annotations

import numpy as np
import pytest

from transfer.drift import ratio_drift, theil_sen
from transfer.drift_changes import change_points, common_level

SCATTER = 0.012  # of the ratios, from stroke to stroke


def build(
    rng: np.random.Generator, strokes: int, *, up: float = 1.0, first: int = 1
) -> tuple[np.ndarray, np.ndarray]:
    """Ratios about 0.98 on the way down and `up` times that on the way up; 1 for down, 0 for up."""
    group = (np.arange(strokes) + 1 - first) % 2 == 0
    level = np.where(group, 0.98, 0.98 * up)
    return level + SCATTER * rng.standard_normal(strokes), group.astype(np.intp)


def changes(ratios: np.ndarray, group: np.ndarray, u: float = 0.002) -> tuple[int, ...]:
    return change_points(ratios, group, np.full(ratios.size, u))


@pytest.mark.parametrize("strokes", [4, 6, 8, 10, 12, 16, 32, 64])
def test_steady_builds_are_left_alone(strokes: int) -> None:
    """Fewer than one in a hundred, all three searches together, as is said beside the prices.

    Of 300 builds with a chance of 1/100 each, more than 9 come with a chance below 0.1 % (binomial).
    """
    rng = np.random.default_rng(strokes)
    alarms = sum(
        bool(changes(*build(rng, strokes, up=up, first=first)))
        for _ in range(75)
        for up in (1.0, 0.6)
        for first in (0, 1)
    )
    assert alarms <= 9


@pytest.mark.parametrize("side", [0, 1, None])
@pytest.mark.parametrize("strokes", [10, 14, 24, 40])
@pytest.mark.parametrize("factor", [0.8, 1.25])
def test_a_change_is_found_in_either_direction_and_in_both(
    side: int | None, strokes: int, factor: float
) -> None:
    """20 %: 14 standard deviations of the scatter; 36 of 40 found, within one stroke."""
    rng = np.random.default_rng(strokes)
    right = 0
    for _ in range(40):
        ratios, group = build(rng, strokes)
        at = strokes // 2
        if side is not None and group[at] != side:
            at += 1
        changed = (np.arange(strokes) >= at) & ((group == side) if side is not None else True)
        found = changes(np.where(changed, factor * ratios, ratios), group)
        right += len(found) == 1 and abs(found[0] - at) <= 1
    assert right >= 36


def test_a_change_in_one_direction_is_put_at_its_first_changed_stroke() -> None:
    ratios = np.tile([1.0, 0.98], 8) + 0.002 * np.sin(np.arange(16))
    group = np.tile([1, 0], 8)
    ratios[9::2] *= 0.7
    assert changes(ratios, group) == (9,)
    numbers = np.arange(1, 17)
    directions = ["down", "up"] * 8
    drift = ratio_drift(numbers, directions, ratios, np.full(16, 0.002))
    assert drift.changes == (9,)  # stroke 10 is the first that takes less


def test_two_changes_one_of_them_in_one_direction() -> None:
    """All strokes fall at 8, the down-strokes again at 24: both are told."""
    rng = np.random.default_rng(3)
    ratios, group = build(rng, 32)
    ratios[8:] *= 0.8
    ratios[24:] = np.where(group[24:] == 1, 0.6 * ratios[24:], ratios[24:])
    found = changes(ratios, group)
    assert len(found) == 2
    assert abs(found[0] - 8) <= 1
    assert abs(found[1] - 24) <= 1


@pytest.mark.parametrize("side", [0, 1, None])
@pytest.mark.parametrize("strokes", [4, 6, 12, 30])
def test_a_fade_is_a_slope_and_no_change(side: int | None, strokes: int) -> None:
    """Down to 70 %, evenly, in all strokes or those of one direction."""
    rng = np.random.default_rng(5)
    alarms = 0
    for _ in range(40):
        ratios, group = build(rng, strokes)
        fading = ratios * np.linspace(1.0, 0.7, strokes)
        mine = np.full(strokes, True) if side is None else group == side
        alarms += bool(changes(np.where(mine, fading, ratios), group))
    assert alarms <= 2


@pytest.mark.parametrize("ratio", [-0.5, 0.0, 0.6])
def test_one_odd_stroke_is_no_change(ratio: float) -> None:
    rng = np.random.default_rng(6)
    alarms = 0
    for place in range(16):
        ratios, group = build(rng, 16)
        ratios[place] = ratio
        alarms += bool(changes(ratios, group))
    assert alarms <= 1


def test_noise_that_was_stated_hides_a_small_change() -> None:
    """6 % with u of 5 %: not told; with u of 0.2 % and the scatter at hand: told."""
    rng = np.random.default_rng(8)
    ratios, group = build(rng, 16)
    ratios[8:] *= 0.94
    assert changes(ratios, group, 0.002) == (8,)
    assert changes(ratios, group, 0.05) == ()


def test_too_few_strokes_show_no_change() -> None:
    assert changes(np.asarray([1.0, 1.0, 0.2]), np.asarray([1, 0, 1])) == ()


def test_the_level_of_both_directions() -> None:
    """Up-strokes take 0.8 of what down-strokes do, on a line that falls: one line is left."""
    line = np.linspace(1.0, 0.7, 9)
    group = np.tile([1, 0], 5)[:9]
    ratios = np.where(group == 1, line, 0.8 * line)
    np.testing.assert_allclose(common_level(ratios, group), line, rtol=1e-12)


def test_the_level_of_two_strokes_and_of_one_direction() -> None:
    two = common_level(np.asarray([1.0, 0.8]), np.asarray([1, 0]))
    np.testing.assert_allclose(two, [1.0, 1.0])
    swapped = common_level(np.asarray([0.8, 1.0]), np.asarray([0, 1]))
    np.testing.assert_allclose(swapped, [1.0, 1.0])
    one = np.asarray([1.0, 0.9, 0.8])
    np.testing.assert_array_equal(common_level(one, np.ones(3, dtype=np.intp)), one)
    # no pair of neighbours took film in both directions: nothing to bring together
    none = np.asarray([1.0, 0.0, 1.0, -0.1])
    np.testing.assert_array_equal(common_level(none, np.asarray([1, 0, 1, 0])), none)


def test_slopes_are_taken_within_a_direction() -> None:
    """Down 1, 3, 5 and up 10, 8, 6 per stroke number: slopes +1 (three) and -1 (three); middle 0."""
    x = np.arange(6.0)
    y = np.asarray([1.0, 10.0, 3.0, 8.0, 5.0, 6.0])
    group = np.asarray([1, 0, 1, 0, 1, 0])
    found = theil_sen(x, y, group)
    assert found is not None
    assert found.slope == 0.0
    assert (found.low, found.high) == (-1.0, 1.0)
    assert theil_sen(x[:2], y[:2], group[:2]) is None
    assert theil_sen(x[:0], y[:0], group[:0]) is None


def test_a_direction_that_takes_nothing_says_nothing_of_drift() -> None:
    """Down 1 falling by 1 % a stroke; up about zero, of any trend."""
    n = 10
    ratios = np.where(np.arange(n) % 2 == 0, 1.0 - 0.01 * np.arange(n), 0.01 * np.arange(n))
    drift = ratio_drift(np.arange(1, n + 1), ["down", "up"] * 5, ratios, np.full(n, 0.001))
    assert drift.strokes == 5
    assert drift.slope is not None
    assert drift.slope.value == pytest.approx(-0.01)


@pytest.mark.parametrize(
    ("ratios", "count"), [([1.0, 1.0], 2), ([0.1, 0.0, 0.1, 0.0], 0), ([1.0, np.nan, 1.0], 2)]
)
def test_too_few_strokes_give_no_slope(ratios: list[float], count: int) -> None:
    directions = (["down", "up"] * 2)[: len(ratios)]
    drift = ratio_drift(
        np.arange(1, len(ratios) + 1), directions, np.asarray(ratios), np.full(len(ratios), 0.01)
    )
    assert drift.slope is None
    assert drift.changes == ()
    assert drift.strokes == count


def test_few_strokes_leave_the_slope_the_strokes_own_uncertainty() -> None:
    """Three strokes on a line: no pairs disagree, so u is 0.03 over the root of sum (x - mean)^2 = 2."""
    drift = ratio_drift(
        np.arange(1, 4), ["down"] * 3, np.asarray([1.0, 0.99, 0.98]), np.full(3, 0.03)
    )
    assert drift.slope is not None
    assert drift.slope.value == pytest.approx(-0.01)
    assert drift.slope.u == pytest.approx(0.03 / np.sqrt(2.0))


def test_half_the_interval_over_1_96_is_the_slope_s_uncertainty() -> None:
    """Where the strokes scatter more than their own u: Sen's limits, taken as two normal quantiles."""
    rng = np.random.default_rng(1)
    n = 16
    ratios = 1.0 + 0.02 * rng.standard_normal(n)
    drift = ratio_drift(np.arange(1, n + 1), ["down", "up"] * 8, ratios, np.full(n, 1e-4))
    assert drift.slope is not None
    assert drift.interval is not None
    low, high = drift.interval
    assert low < drift.slope.value < high
    assert drift.slope.u == pytest.approx((high - low) / (2.0 * 1.959964))
    # a normal slope of 16 points would have 0.02 / sqrt(sum (x - mean)^2 = 340): within a factor of two
    assert 0.5 < drift.slope.u / (0.02 / np.sqrt(340.0)) < 2.0
