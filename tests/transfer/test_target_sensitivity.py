"""How the recommendation answers to its inputs, against what a middle of a window must do."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from target_films import kink, mn, plain_film

from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet
from transfer.target import choose_target
from transfer.target_result import TargetResult
from transfer.target_sensitivity import Effect, combined_u

TOLERANCE = '[dipping]\ntolerance = "0.2 mN/m"\n'


def effects(film: IsothermResult, text: str = "") -> dict[str, Effect]:
    result = choose_target(film, parse_sheet(text) if text else RunSheet())
    return {effect.name: effect for effect in result.sensitivity}


def test_collapse_moves_the_middle_by_half() -> None:
    effect = effects(plain_film(kink(15.0, u=0.3), collapse_u=0.6), TOLERANCE)["collapse pressure"]
    assert effect.u == pytest.approx(0.6)
    assert effect.shift_up == pytest.approx(+0.3, abs=1e-6)
    assert effect.shift_down == pytest.approx(-0.3, abs=1e-6)


def test_kink_moves_the_middle_by_half() -> None:
    # the window above the kink binds when it is the wider one
    effect = effects(plain_film(kink(15.0, u=0.3), collapse_u=0.6), TOLERANCE)["kink at 15.0 mN/m"]
    assert effect.shift_up == pytest.approx(+0.15, abs=1e-6)


def test_common_zero_moves_everything_together() -> None:
    film = plain_film(kink(15.0, u=0.3))
    branch = film.branches[0]
    assert branch.collapse is not None
    common = replace(mn(40.0, 0.3), u=0.5, u_systematic=0.4)
    film = replace(
        film, branches=(replace(branch, collapse=replace(branch.collapse, pressure=common)),)
    )
    effect = effects(film, TOLERANCE)["zero and scale of pressure"]
    assert effect.u == pytest.approx(0.4)
    assert effect.shift_up == pytest.approx(+0.4, abs=1e-6)


def test_combined_u_is_the_quadrature_sum_of_half_spans() -> None:
    rows = (
        Effect("a", 1.0, "mN/m", 0.3, -0.3),
        Effect("b", 1.0, "mN/m", 0.0, -0.8),
        Effect("c", 1.0, "mN/m", None, 0.1),
    )
    assert combined_u(rows) == pytest.approx(math.sqrt(0.3**2 + 0.4**2 + 0.1**2))
    assert combined_u(()) == 0.0


def test_inputs_without_uncertainty_do_not_clutter() -> None:
    names = set(effects(plain_film(kink(20.0))))
    assert names == {"modulus (median u)"} or names == set()


def test_limit_stated_with_u_is_moved() -> None:
    text = TOLERANCE + '[target]\ncollapse_margin = "5 ± 1 mN/m"\n'
    effect = effects(plain_film(), text)["collapse margin asked for"]
    assert effect.shift_up == pytest.approx(-0.5, abs=1e-6)


def test_tolerance_and_overshoot_stated_with_u_are_moved() -> None:
    text = '[dipping]\ntolerance = "0.2 ± 0.1 mN/m"\novershoot = "0.5 ± 0.2 mN/m"\n'
    found = effects(plain_film(), text)
    assert found["overshoot"].shift_up == pytest.approx(-0.1, abs=1e-6)
    # both ends draw in by the same: the middle stays, but for the overshoot's own u in the upper guard
    assert abs(found["controller tolerance"].shift_up or 0.0) < 0.1


def test_losing_the_window_is_shown_as_none() -> None:
    text = '[dipping]\ntolerance = "0.5 ± 0.1 mN/m"\n[target]\npacking_error = "0.32 %"\n'
    # at k = 2 the error is 0.7/200 = 0.35 %: shut; with 0.4 ± 0.1: 0.6/200 = 0.30 %: open; one u more shuts
    assert choose_target(plain_film(), parse_sheet(text)).recommended is None
    open_text = text.replace("0.5 ± 0.1", "0.4 ± 0.1")
    found = effects(plain_film(), open_text)
    assert found["controller tolerance"].shift_up is None
    assert found["controller tolerance"].shift_down is not None


def test_largest_effect_comes_first() -> None:
    result: TargetResult = choose_target(
        plain_film(kink(15.0, u=0.1), collapse_u=0.6), parse_sheet(TOLERANCE)
    )
    shifts = [effect.shift for effect in result.sensitivity]
    assert shifts == sorted(shifts, reverse=True)
    assert result.recommended is not None
    assert result.recommended.u == pytest.approx(combined_u(result.sensitivity))
