"""The recommendation as a whole: middle of the deepest window, invariances, what binds, no window."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from target_films import TOP, coexistence, kink, plain_film

from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet
from transfer.target import choose_target
from transfer.target_choice import Choice, choose
from transfer.target_inputs import gather_inputs
from transfer.target_intervals import Interval, common, where_allowed
from transfer.target_result import TargetResult


def chosen(film: IsothermResult, text: str = "") -> TargetResult:
    return choose_target(film, parse_sheet(text) if text else RunSheet())


def window(film: IsothermResult, text: str = "") -> Choice:
    """Only the choice, without all that hangs on it: quick enough for many examples."""
    return choose(gather_inputs(film, parse_sheet(text) if text else RunSheet()))


def recommended(film: IsothermResult, text: str = "") -> float:
    found = window(film, text).recommended
    assert found is not None
    return found


def test_recommends_the_middle_between_lift_off_and_collapse() -> None:
    result = chosen(plain_film(), '[dipping]\ntolerance = "0.1 mN/m"\n')
    assert result.recommended is not None
    assert result.recommended.value == pytest.approx(TOP / 2, abs=0.05)
    assert result.binding == "below: lift-off; above: collapse margin"
    assert {limit.rule for limit in result.limits if limit.binding} == {
        "lift-off",
        "collapse margin",
    }


def test_takes_the_window_whose_middle_is_deepest() -> None:
    # 0 to 10, 12 to 28, 28 to 40: the second is the widest
    film = plain_film(coexistence(10.0, 12.0), kink(28.0))
    result = chosen(film, '[dipping]\ntolerance = "0.1 mN/m"\n')
    assert result.recommended is not None
    assert result.recommended.value == pytest.approx(20.0, abs=1e-6)
    assert result.binding == "below: coexistence at 10.0 to 12.0 mN/m; above: kink at 28.0 mN/m"
    assert len(result.windows) == 3


def test_every_limit_holds_the_recommendation_and_margins_are_distances() -> None:
    text = '[dipping]\ntolerance = "0.2 mN/m"\novershoot = "0.5 mN/m"\n'
    result = chosen(plain_film(kink(25.0, u=0.1), collapse_u=0.3), text)
    assert result.recommended is not None
    at = result.recommended.value
    margins = []
    for limit in result.limits:
        assert limit.allowed is not None
        assert limit.allowed.holds(at)
        if limit.margin is not None:
            assert limit.margin.value > 0
            margins.append(limit.margin.value)
            assert limit.normalised == pytest.approx(limit.margin.value / result.set_u)
    binding = [limit.margin for limit in result.limits if limit.binding]
    assert all(m is not None and m.value == pytest.approx(min(margins), abs=1e-6) for m in binding)


def test_margin_has_the_uncertainty_of_its_end() -> None:
    text = '[dipping]\ntolerance = "0.3 mN/m"\n'
    result = chosen(plain_film(collapse_u=0.4), text)
    margin = next(limit.margin for limit in result.limits if limit.rule == "collapse margin")
    assert margin is not None
    assert margin.u == pytest.approx(0.5, rel=1e-3)  # sqrt(0.4^2 + 0.3^2)


@given(stretch=st.floats(0.3, 30.0))
def test_recommendation_does_not_depend_on_the_area_scale(stretch: float) -> None:
    film = plain_film(kink(25.0, u=0.2), stretch=stretch, nodes=201)
    assert recommended(film) == pytest.approx(
        recommended(plain_film(kink(25.0, u=0.2), nodes=201)), abs=1e-6
    )


@given(lift=st.floats(0.0, 25.0))
def test_recommendation_moves_with_the_pressure_scale(lift: float) -> None:
    shifted = plain_film(kink(25.0 + lift, u=0.2), lift=lift, nodes=201)
    moved = recommended(shifted) - recommended(plain_film(kink(25.0, u=0.2), nodes=201))
    assert moved == pytest.approx(lift, abs=0.05)  # an interval of the curve's nodes


def test_order_of_transitions_does_not_matter() -> None:
    one = plain_film(coexistence(10.0, 12.0, u=0.1), kink(28.0, u=0.2))
    other = plain_film(kink(28.0, u=0.2), coexistence(10.0, 12.0, u=0.1))
    assert recommended(one) == recommended(other)


def test_inputs_are_not_changed() -> None:
    film = plain_film(kink(25.0, u=0.2))
    curve = film.branches[0].curve
    before = (curve.area.copy(), curve.pressure.copy(), curve.modulus.copy())
    chosen(film)
    after = (curve.area, curve.pressure, curve.modulus)
    assert all(np.array_equal(a, b) for a, b in zip(before, after, strict=True))


@given(margin=st.floats(0.1, 30.0), more=st.floats(0.1, 5.0))
def test_wider_collapse_margin_never_raises_the_window(margin: float, more: float) -> None:
    film = plain_film(nodes=201)

    def top(value: float) -> float:
        found = window(film, f'[target]\ncollapse_margin = "{value} mN/m"\n').window
        assert found is not None
        return found.high.pressure

    assert top(margin + more) == pytest.approx(top(margin) - more, abs=1e-6)


@given(tolerance=st.floats(0.01, 2.0), factor=st.floats(1.0, 2.0))
def test_worse_controller_never_widens_the_window(tolerance: float, factor: float) -> None:
    film = plain_film(kink(25.0, u=0.1), nodes=201)

    def width(value: float) -> float:
        found = window(film, f'[dipping]\ntolerance = "{value} mN/m"\n').window
        assert found is not None
        return found.width

    assert width(tolerance * factor) <= width(tolerance) + 1e-9


def test_sheets_own_pressure_is_judged_rule_by_rule() -> None:
    film = plain_film(kink(25.0, u=0.5))
    near = chosen(film, '[dipping]\npressure = "25.4 mN/m"\n').asked
    assert near is not None
    assert not near.admissible
    assert near.breaks == ("kink at 25.0 mN/m",)
    good = chosen(film, '[dipping]\npressure = "30 mN/m"\n').asked
    assert good is not None
    assert good.admissible
    assert good.breaks == ()
    beyond = chosen(film, '[dipping]\npressure = "60 mN/m"\n').asked
    assert beyond is not None
    assert "recorded range" in beyond.breaks
    assert chosen(film).asked is None


def test_no_window_names_who_excludes_what_and_the_smallest_relaxation() -> None:
    text = '[target]\nguard_band = "12 mN/m"\ncollapse_margin = "5 mN/m"\n'
    result = chosen(plain_film(coexistence(8.0, 24.0)), text)
    # kept off the coexistence: up to -4 and from 36; kept off collapse: up to 35
    assert result.recommended is None
    assert result.window is None
    assert result.to_json()["recommended"] is None
    ways = {way.changes[0].rule: way for way in result.relaxations}
    assert ways["coexistence"].changes[0].by == pytest.approx(1.0, abs=1e-6)
    assert ways["collapse margin"].changes[0].by == pytest.approx(1.0, abs=1e-6)
    # 1 of 12 mN/m is a smaller thing to give up than 1 of 5
    assert result.relaxations[0].changes[0].rule == "coexistence"
    assert "coexistence" in result.binding
    assert result.sensitivity == ()
    assert result.plan == ()


@settings(max_examples=25)
@given(guard=st.floats(9.0, 18.0), margin=st.floats(4.5, 12.0))
def test_the_smallest_relaxation_opens_a_window(guard: float, margin: float) -> None:
    film = plain_film(coexistence(8.0, 24.0), nodes=201)

    def wishes(kept: float, off: float) -> str:
        return f'[target]\nguard_band = "{kept} mN/m"\ncollapse_margin = "{max(off, 1e-9)} mN/m"\n'

    def tried(kept: float, off: float) -> Choice:
        return window(film, wishes(kept, off))

    result = chosen(film, wishes(guard, margin))
    for way in result.relaxations:
        change = way.changes[0]
        assert change.by is not None
        assert change.by < change.of
        by = change.by + 1e-4
        if change.rule == "coexistence":
            opened = tried(guard - by, margin)
            shut = tried(guard - change.by + 1e-3, margin)
        elif change.rule == "collapse margin":
            opened = tried(guard, margin - by)
            shut = tried(guard, margin - change.by + 1e-3)
        else:
            continue
        assert opened.recommended is not None
        assert any(
            w.low.pressure - 1e-3 <= way.pressure <= w.high.pressure + 1e-3 for w in opened.windows
        )
        assert shut.recommended is None
    if result.recommended is None:
        assert result.relaxations


def test_rules_that_only_break_together_are_named_together() -> None:
    text = '[dipping]\ntolerance = "0.5 mN/m"\n[target]\nphase = "solid"\npacking_error = "0.1 %"\n'
    result = chosen(plain_film(), text)
    assert result.recommended is None
    first = result.relaxations[0]
    assert {change.rule for change in first.changes} == {"phase wanted", "packing error"}


def test_json_is_strict_and_holds_the_contract() -> None:
    for text in ("", '[target]\nphase = "solid"\n'):
        result = chosen(plain_film(kink(25.0, u=0.2)), text)
        payload = json.loads(json.dumps(result.to_json(), allow_nan=False))
        assert payload["schema"] == "upstroke.target/1"
        assert {
            "recommended",
            "window",
            "binding",
            "limits",
            "strokes_possible",
            "packing_error",
        } <= set(payload)
        for limit in payload["limits"]:
            assert limit["allowed"] is None or limit["allowed"][0] <= limit["allowed"][1]
            assert limit["reason"]


def test_pressure_probe_drift_adds_to_the_tolerance() -> None:
    text = """
    [substrate]
    shape = "plate"
    width = "20 mm"
    thickness = "1 mm"
    [dipping]
    stroke_length = "25 mm"
    speed = "5 mm/min"
    tolerance = "0.3 mN/m"
    [stack]
    layers = 12
    """
    drift: Any = SimpleNamespace(
        drift_rate=Quantity(0.4 * math.sqrt(3.0), 0.0, "mN/m/h"),
        zero_offset=None,
        path="check.json",
    )
    result = choose_target(plain_film(), parse_sheet(text), check=drift)
    # one hour of dipping, rectangular: u = 0.4, with the tolerance 0.5
    assert result.set_u == pytest.approx(0.5, rel=1e-3)
    assert result.settings["check"] == "check.json"


def test_intervals_are_found_to_their_ends() -> None:
    found = where_allowed(lambda p: np.sin(p), 0.5, 9.0)
    assert [(i.low, i.high) for i in found] == [
        (pytest.approx(0.5), pytest.approx(math.pi)),
        (pytest.approx(2 * math.pi), pytest.approx(9.0)),
    ]
    assert where_allowed(lambda p: p * np.nan, 0.0, 1.0) == ()
    assert where_allowed(lambda p: p, 1.0, 1.0) == ()


def test_common_stretches_keep_who_ended_them() -> None:
    windows = common(
        [(Interval(0.0, 10.0),), (Interval(2.0, 4.0), Interval(6.0, 12.0)), (Interval(3.0, 20.0),)],
        0.0,
        10.0,
    )
    assert [(w.low.pressure, w.low.rule, w.high.pressure, w.high.rule) for w in windows] == [
        (3.0, 2, 4.0, 1),
        (6.0, 1, 10.0, 0),
    ]
    assert common([()], 0.0, 1.0) == ()


def test_hump_before_a_plateau_gives_each_pressure_one_area() -> None:
    film = plain_film()
    curve = film.branches[0].curve
    pressure = curve.pressure.copy()
    hump = (pressure > 10.0) & (pressure < 11.0)
    pressure[hump] += 3.0 * np.sin(np.linspace(0.0, math.pi, int(hump.sum())))
    bumped = replace(
        film, branches=(replace(film.branches[0], curve=replace(curve, pressure=pressure)),)
    )
    assert recommended(bumped) == pytest.approx(TOP / 2, abs=0.1)


def test_wild_nodes_do_not_move_the_recommendation() -> None:
    film = plain_film()
    curve = film.branches[0].curve
    pressure = curve.pressure.copy()
    pressure[[200, 500, 501, 830]] = [-30.0, 300.0, 300.0, -5.0]
    pressure[-1] = TOP
    wild = replace(
        film, branches=(replace(film.branches[0], curve=replace(curve, pressure=pressure)),)
    )
    wild = replace(wild, branches=(replace(wild.branches[0], collapse=film.branches[0].collapse),))
    assert recommended(wild) == pytest.approx(TOP / 2, abs=0.1)
