"""Shapes of collapse and travel that a smooth model does not expect, from closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from isotherm_traces import make_trace
from numpy.typing import NDArray

from isotherm.analysis import analyse
from isotherm.dips import with_yield
from isotherm.knee_evidence import Candidate
from isotherm.result import Branch
from isotherm.trace import Trace

FloatArray = NDArray[np.float64]

COLLAPSE = (0.2, 50.0)  # nm^2, mN/m
LIFT_OFF = 0.28  # nm^2


def _branch(trace: Trace) -> Branch:
    return analyse(trace).branches[0]


def _condensed(area: FloatArray) -> FloatArray:
    """A gas-like level, then a straight rise in ln A to the collapse."""
    modulus = COLLAPSE[1] / np.log(LIFT_OFF / COLLAPSE[0])
    return np.asarray(np.maximum(0.0, modulus * np.log(LIFT_OFF / area)))


@pytest.mark.parametrize("rows", [600, 4000])
@pytest.mark.parametrize("share", [0.004, 0.012])
def test_a_peak_that_falls_at_once_to_a_level_is_a_collapse(rows: int, share: float) -> None:
    """Pressure drops by 12 mN/m within a few parts in a thousand of area and stays there."""
    area = np.linspace(0.4, 0.17, rows)
    beyond = np.clip((COLLAPSE[0] - area) / COLLAPSE[0], 0.0, None)
    fall = 12.0 * (1.0 - np.exp(-beyond / share))
    branch = _branch(make_trace(area, np.minimum(_condensed(area), COLLAPSE[1]) - fall, noise=0.04))
    assert branch.collapse is not None
    assert branch.collapse.kind == "constant-area"
    assert branch.collapse.area.value == pytest.approx(COLLAPSE[0], rel=0.01)
    pressure = branch.collapse.pressure
    # the peak lies between two rows, some 0.3 mN/m apart before it and more after it
    assert pressure.value == pytest.approx(COLLAPSE[1], abs=1.0)
    assert (pressure.u or 0.0) < 1.5


def test_a_slow_roll_over_is_a_collapse() -> None:
    """Modulus falls along a straight line from full to none over the last tenth of the area."""
    area = np.linspace(0.4, 0.18, 5000)
    x = -np.log(area)
    modulus = COLLAPSE[1] / np.log(LIFT_OFF / COLLAPSE[0])
    onset, end = -np.log(0.21), -np.log(0.19)
    soft = np.clip((x - onset) / (end - onset), 0.0, 1.0)
    slope = np.where(area < LIFT_OFF, modulus * (1.0 - soft), 0.0)
    pressure = np.concatenate([[0.0], np.cumsum(0.5 * (slope[1:] + slope[:-1]) * np.diff(x))])
    branch = _branch(make_trace(area, pressure, noise=0.05))
    assert branch.collapse is not None
    assert branch.collapse.kind == "constant-pressure"
    # somewhere within the softening: the trade has no sharper meaning for it
    assert 0.188 < branch.collapse.area.value < 0.212
    assert branch.collapse.pressure.value == pytest.approx(pressure[-1], abs=1.5)


def test_a_branch_that_ends_stiff_is_not_given_a_collapse() -> None:
    x = np.linspace(0.0, 1.0, 200)
    sigma = np.full(200, 0.05)
    assert with_yield([], x, 30.0 * x**2, sigma) == []
    assert with_yield([], x[:5], x[:5], sigma[:5]) == []
    rolled = 40.0 * (x - 0.5 * x**2)
    (knee,) = with_yield([], x, rolled, sigma)
    assert knee.before > 20.0
    assert 0.5 < knee.x < 0.9
    # a knee well before stays, one beside it is the same
    early, beside = (
        Candidate(0.2, 0.01, 30.0, 35.0, 50.0),
        Candidate(knee.x, 0.01, 30.0, 20.0, 50.0),
    )
    assert with_yield([early, beside], x, rolled, sigma) == [early, knee]


def test_rows_at_random_moments_are_read_like_even_ones() -> None:
    random = np.random.default_rng(6)
    area = np.sort(random.uniform(0.18, 0.4, 1500))[::-1]
    pressure = np.minimum(_condensed(area), COLLAPSE[1])
    branch = _branch(make_trace(area, pressure, noise=0.05))
    assert branch.collapse is not None
    assert branch.transitions == ()
    assert branch.collapse.pressure.value == pytest.approx(COLLAPSE[1], abs=0.3)
    assert branch.lift_off is not None
    assert branch.lift_off.value == pytest.approx(LIFT_OFF, rel=0.003)


def test_a_kink_a_few_rows_before_the_run_stops_is_found() -> None:
    area = np.linspace(0.6, 0.215, 700)
    pressure = np.maximum(0.0, 400.0 * (0.27 - area)) + 2600.0 * np.maximum(0.222 - area, 0.0)
    branch = _branch(make_trace(area, pressure, noise=0.03))
    (kink,) = branch.transitions
    assert kink.kind == "kink"
    assert kink.at is not None
    assert kink.at.area.value == pytest.approx(0.222, rel=0.003)


def test_two_bends_within_a_hundredth_are_one_kink() -> None:
    area = np.linspace(0.35, 0.19, 3000)
    x = -np.log(area)
    first, second = -np.log(0.2300), -np.log(0.2290)
    pressure = 80.0 * np.maximum(x + np.log(0.29), 0.0)
    pressure = pressure + 150.0 * np.maximum(x - first, 0.0) + 150.0 * np.maximum(x - second, 0.0)
    branch = _branch(make_trace(area, pressure, noise=0.01))
    assert [t.kind for t in branch.transitions] == ["kink"]
    (kink,) = branch.transitions
    assert kink.at is not None
    assert kink.at.area.value == pytest.approx(0.2295, rel=0.003)


def test_an_open_coexistence_is_called_on_fluid_films_only() -> None:
    """A condensed film that softens in two steps has collapsed, though its last rise is soft."""
    area = np.linspace(0.4, 0.15, 4000)
    x = -np.log(area)
    pressure = 100.0 * np.clip(x + np.log(0.29), 0.0, np.log(0.29 / 0.17))
    pressure = pressure + 48.0 * np.clip(x + np.log(0.17), 0.0, np.log(0.17 / 0.163))
    pressure = pressure + 2.0 * np.clip(x + np.log(0.163), 0.0, None)
    branch = _branch(make_trace(area, pressure, noise=0.03))
    assert branch.collapse is not None
    assert branch.transitions == ()


@pytest.mark.parametrize("rows", [8, 20])
def test_a_collapse_a_few_rows_before_the_run_stops_is_called(rows: int) -> None:
    """The barrier is stopped as soon as the pressure no longer rises."""
    step = (0.4 - COLLAPSE[0]) / 1500
    area = np.concatenate(
        [np.linspace(0.4, COLLAPSE[0], 1501), COLLAPSE[0] - step * np.arange(1, rows + 1)]
    )
    branch = _branch(make_trace(area, np.minimum(_condensed(area), COLLAPSE[1]), noise=0.03))
    assert branch.collapse is not None
    assert branch.collapse.pressure.value == pytest.approx(COLLAPSE[1], abs=0.3)
    assert branch.collapse.area.value == pytest.approx(COLLAPSE[0], rel=0.002)
