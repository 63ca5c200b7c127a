"""Each rule alone: what it allows is worked out by hand from the film's closed formulas."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from target_films import STIFF, TOP, coexistence, kink, nm2, plain_film, steady_hold

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet
from transfer.target import choose_target
from transfer.target_result import Limit, TargetResult

STACK = """
[substrate]
shape = "plate"
width = "20 mm"
thickness = "1 mm"
[trough]
smallest_area = "60 cm^2"
[stack]
layers = 12
type = "Y"
first_stroke = "up"
"""


def limit_of(result: TargetResult, rule: str) -> Limit:
    return next(limit for limit in result.limits if limit.rule == rule)


def chosen(film: IsothermResult, text: str = "") -> TargetResult:
    return choose_target(film, parse_sheet(text) if text else RunSheet())


def pairs(limit: Limit) -> list[tuple[float, float]]:
    return [(i.low, i.high) for i in limit.intervals]


def test_collapse_margin_adds_margin_u_and_overshoot() -> None:
    text = '[dipping]\ntolerance = "0.3 mN/m"\novershoot = "0.5 mN/m"\n[target]\ncollapse_margin = "5 mN/m"\n'
    limit = limit_of(chosen(plain_film(collapse_u=0.4), text), "collapse margin")
    # 40 - 5 - 0.5 - 2 sqrt(0.4^2 + 0.3^2)
    assert limit.intervals[0].high == pytest.approx(TOP - 5 - 0.5 - 2 * 0.5, abs=1e-6)
    assert limit.at == (TOP,)


def test_collapse_margin_counts_the_overshoots_own_u() -> None:
    text = '[dipping]\novershoot = "0.5 ± 0.3 mN/m"\n'
    limit = limit_of(chosen(plain_film(collapse_u=0.4), text), "collapse margin")
    assert limit.intervals[0].high == pytest.approx(TOP - 0.5 - 2 * 0.5, abs=1e-6)


def test_collapse_not_reached_is_a_lower_bound_and_said() -> None:
    result = chosen(plain_film(reached=False))
    assert limit_of(result, "collapse margin").intervals[0].high == pytest.approx(TOP, abs=1e-6)
    assert "lower bound" in " ".join(result.warnings)
    assert "not reached" in limit_of(result, "collapse margin").reason
    reached = chosen(plain_film())
    assert "lower bound" not in " ".join(reached.warnings)


def test_tangent_above_every_reading_is_capped() -> None:
    film = plain_film()
    branch = film.branches[0]
    assert branch.collapse is not None
    above = replace(branch.collapse, pressure=replace(branch.collapse.pressure, value=TOP + 3.0))
    high = replace(film, branches=(replace(branch, collapse=above),))
    assert limit_of(chosen(high), "collapse margin").intervals[0].high == pytest.approx(TOP)


def test_coexistence_is_kept_off_on_both_sides() -> None:
    text = '[dipping]\ntolerance = "0.3 mN/m"\novershoot = "0.5 mN/m"\n'
    limit = limit_of(chosen(plain_film(coexistence(10.0, 12.0, u=0.4)), text), "coexistence")
    # below: 10 - 2*0.5 - 0.5 (overshoot reaches up); above: 12 + 2*0.5
    assert pairs(limit) == [
        (pytest.approx(0.0), pytest.approx(8.5)),
        (pytest.approx(13.0), pytest.approx(TOP)),
    ]


def test_sheets_guard_band_overrules_the_default_unless_it_is_smaller() -> None:
    film = plain_film(kink(20.0, u=0.4))
    wide = limit_of(chosen(film, '[target]\nguard_band = "2 mN/m"\n'), "kink")
    assert pairs(wide) == [
        (pytest.approx(0.0), pytest.approx(18.0)),
        (pytest.approx(22.0), pytest.approx(TOP)),
    ]
    narrow = limit_of(chosen(film, '[target]\nguard_band = "0.1 mN/m"\n'), "kink")
    assert narrow.intervals[1].low == pytest.approx(20.8)


def test_coexistence_that_the_record_never_leaves_shuts_everything_above() -> None:
    limit = limit_of(chosen(plain_film(coexistence(25.0, None, u=0.5))), "coexistence")
    assert pairs(limit) == [(pytest.approx(0.0), pytest.approx(24.0))]
    assert "stops inside" in limit.reason


def test_soft_stretch_without_knees_is_not_dipped_in() -> None:
    film = plain_film()
    curve = film.branches[0].curve
    # between 15 and 17 mN/m the modulus is 5 mN/m: d ln A = -dP/5 there
    inside = np.clip(curve.pressure - 15.0, 0.0, 2.0)
    area = curve.area * np.exp(inside / STIFF - inside / 5.0)
    branch = film.branches[0]
    collapse = replace(branch.collapse, area=nm2(float(area[-1]))) if branch.collapse else None
    soft = replace(
        film, branches=(replace(branch, curve=replace(curve, area=area), collapse=collapse),)
    )
    limit = limit_of(chosen(soft), "single phase")
    assert not any(i.holds(p) for i in limit.intervals for p in (15.0, 16.0, 17.0))
    assert any(i.holds(14.0) for i in limit.intervals)
    assert any(i.holds(18.0) for i in limit.intervals)


def test_phase_is_left_out_and_named_when_the_sheet_asks_for_none() -> None:
    result = chosen(plain_film())
    assert not [limit for limit in result.limits if limit.rule == "phase wanted"]
    left = {item.rule: item.why for item in result.left_out}
    assert "target.phase" in left["phase wanted"]
    assert {"packing error", "film loss", "enough film"} <= set(left)


@pytest.mark.parametrize("name", ["liquid-condensed", "LC", "Liquid condensed", "condensed"])
def test_phase_wanted_keeps_the_controllers_tolerance_from_its_ends(name: str) -> None:
    text = f'[dipping]\ntolerance = "0.3 mN/m"\n[target]\nphase = "{name}"\n'
    limit = limit_of(chosen(plain_film(), text), "phase wanted")
    assert pairs(limit) == [(pytest.approx(0.6), pytest.approx(TOP - 0.6))]


def test_phase_that_is_not_there_allows_nothing_and_says_what_is() -> None:
    result = chosen(plain_film(), '[target]\nphase = "liquid-expanded"\n')
    limit = limit_of(result, "phase wanted")
    assert limit.allowed is None
    assert limit.intervals == ()
    assert "liquid-condensed" in limit.reason
    assert result.recommended is None
    assert "liquid-expanded" in result.relaxations[0].text


def test_phase_named_within_its_uncertainty_counts_with_a_note() -> None:
    result = chosen(plain_film(modulus_u=30.0), '[target]\nphase = "solid"\n')
    limit = limit_of(result, "phase wanted")
    assert limit.allowed is not None
    assert "2u" in limit.reason
    assert chosen(plain_film(modulus_u=20.0), '[target]\nphase = "solid"\n').recommended is None


def test_unknown_phase_is_an_error_that_names_the_choices() -> None:
    with pytest.raises(UpstrokeError, match=r'target\.phase is "stiff".*liquid-condensed'):
        chosen(plain_film(), '[target]\nphase = "stiff"\n')


def test_packing_error_is_tolerance_over_modulus() -> None:
    text = '[dipping]\ntolerance = "0.5 ± 0.05 mN/m"\n'
    result = chosen(plain_film(modulus_u=10.0), text)
    assert result.packing_error is not None
    assert result.packing_error.value == pytest.approx(0.5 / STIFF)
    # relative u: 5 % of the modulus and 10 % of the tolerance in quadrature
    assert result.packing_error.u == pytest.approx(0.5 / STIFF * (0.05**2 + 0.10**2) ** 0.5)
    assert chosen(plain_film()).packing_error is None


def test_packing_limit_excludes_a_film_that_is_too_soft() -> None:
    # dA/A = 0.5/200 = 0.25 %
    kept = '[dipping]\ntolerance = "0.5 mN/m"\n[target]\npacking_error = "0.26 %"\n'
    broken = kept.replace("0.26", "0.24")
    assert chosen(plain_film(), kept).recommended is not None
    result = chosen(plain_film(), broken)
    assert result.recommended is None
    assert limit_of(result, "packing error").allowed is None
    assert "packing error: allow 0.25 %" in result.relaxations[0].text


def test_packing_limit_without_tolerance_is_left_out_and_warned_of() -> None:
    result = chosen(plain_film(), '[target]\npacking_error = "0.2 %"\n')
    assert "packing error" in {item.rule for item in result.left_out}
    assert "target.packing_error cannot be judged" in " ".join(result.warnings)


def test_loss_rule_ends_where_the_interpolated_loss_reaches_the_limit() -> None:
    text = (
        STACK + '[dipping]\nstroke_length = "25 mm"\nspeed = "5 mm/min"\n[target]\nloss = "4 %"\n'
    )
    # 12 strokes of 300 s: 1 h; 2 %/h at 10 mN/m and 6 %/h at 30 mN/m reach 4 % at 20 mN/m
    holds = (
        steady_hold(10.0, 0.02 / 3600, seed=1),
        steady_hold(30.0, 0.06 / 3600, seed=2),
    )
    result = choose_target(plain_film(), parse_sheet(text), holds=holds)
    limit = limit_of(result, "film loss")
    assert limit.intervals[0].high == pytest.approx(20.0, abs=0.3)
    assert limit.binding
    assert result.loss is not None
    assert result.recommended is not None
    middle = 0.5 * limit.intervals[0].high
    assert result.recommended.value == pytest.approx(middle, abs=0.1)


def test_loss_is_not_known_above_the_highest_hold_and_that_is_a_limit() -> None:
    text = (
        STACK + '[dipping]\nstroke_length = "25 mm"\nspeed = "5 mm/min"\n[target]\nloss = "4 %"\n'
    )
    holds = (steady_hold(25.0, 0.01 / 3600, seed=3),)
    result = choose_target(plain_film(), parse_sheet(text), holds=holds)
    held = holds[0].holds[0].pressure.value
    assert result.recommended is not None
    assert result.window is not None
    assert result.window.high == pytest.approx(held, abs=1e-3)
    # deepest inside all limits, the end of what is known among them
    assert result.recommended.value == pytest.approx(
        (result.window.low + result.window.high) / 2, abs=1e-4
    )
    assert "not known above" in limit_of(result, "film loss").reason


def test_isochoric_hold_loses_film_by_its_modulus() -> None:
    text = STACK + '[dipping]\nstroke_length = "25 mm"\nspeed = "5 mm/min"\n'
    holds = (steady_hold(25.0, 0.08 / 3600, kind="isochoric", seed=4),)
    result = choose_target(plain_film(), parse_sheet(text), holds=holds)
    # over 1 h the pressure falls by 8 % of 25 mN/m, the film by 2/200
    assert result.loss is not None
    assert result.loss.value == pytest.approx(0.01, rel=0.05)


def test_loss_limit_without_holds_is_left_out_and_warned_of() -> None:
    result = chosen(plain_film(), '[target]\nloss = "4 %"\n')
    assert "film loss" in {item.rule for item in result.left_out}
    assert "no hold is given" in " ".join(result.warnings)


def test_enough_film_ends_where_one_stroke_passes_the_smallest_area() -> None:
    text = STACK + '[dipping]\nstroke_length = "25 mm"\n'
    # one stroke takes 2 (20+1) 25 + 20*1 mm^2 = 10.7 cm^2; area = N A0 exp(-P/M) falls to 70.7 cm^2 there
    molecules = 70.7e14 / (0.25 * math.exp(-15.0 / STIFF))
    exact = text.replace("[stack]\n", "[stack]\naccept = [0.9999999, 1.0000001]\n")
    result = chosen(plain_film(molecules=molecules), exact)
    assert limit_of(result, "enough film").intervals[-1].high == pytest.approx(15.0, abs=1e-3)


def test_limited_renewals_ask_more_of_one_filling() -> None:
    text = STACK + '[dipping]\nstroke_length = "25 mm"\n[target]\nrenewals = 2\n'
    # 12 strokes in 3 fillings: 4 strokes of 10.7 cm^2 each
    result = chosen(plain_film(molecules=1e17), text)
    assert limit_of(result, "enough film").reason.startswith("4 strokes take 42.8 cm²")


def test_record_without_a_compression_is_an_error() -> None:
    film = plain_film()
    expansion = replace(film, branches=(replace(film.branches[0], direction="expansion"),))
    with pytest.raises(UpstrokeError, match="no compression"):
        chosen(expansion)


def test_units_of_wishes_are_quantities() -> None:
    sheet = parse_sheet('[target]\nguard_band = "0.002 N/m"\n')
    assert sheet.target.guard_band == Quantity(2.0, None, "mN/m")


def test_loss_rule_left_out_says_what_is_missing() -> None:
    holds = (steady_hold(25.0, 0.01 / 3600, seed=3),)
    sheet = parse_sheet('[target]\nloss = "4 %"\n')
    left = {
        item.rule: item.why for item in choose_target(plain_film(), sheet, holds=holds).left_out
    }
    assert "dipping time is not known" in left["film loss"]
    none = {item.rule: item.why for item in choose_target(plain_film(), sheet).left_out}
    assert none["film loss"] == "no hold is given"
