"""What each audit rule finds, rule by rule, on small builds made up for it."""

from __future__ import annotations

from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

from isotherm.quantity import Quantity
from isotherm.sheet import Dipping, Stack, StackFilm, Trough
from tests.transfer.audit_example import context, row, said, stroke, strokes
from transfer import (
    rule_drift,
    rule_evidence,
    rule_layers,
    rule_mean,
    rule_plan,
    rule_pressure,
    rule_ratio,
    rule_renewals,
    rule_speed,
    rule_strokes,
    rule_thickness,
    rule_type,
)
from transfer.audit_remedy import REMEDIES
from transfer.result import Deposition, Drift, Renewal, UnjudgedCrossing


@pytest.mark.parametrize(
    ("type_", "ways", "status"),
    [
        ("Y", "dudu", "pass"),
        ("Y", "dud", "fail"),
        ("XY", "dudu", "pass"),
        (None, "dudu", "pass"),
        ("X", "dudududu", "pass"),
        ("X", "dudud", "fail"),
        ("Z", "dudududu", "pass"),
        ("Z", "dudududud", "pass"),
    ],
)
def test_strokes_are_counted_by_the_way_of_their_type(
    type_: str | None, ways: str, status: str
) -> None:
    found = rule_strokes.check(context(strokes(ways), design=Stack(layers=4, type=type_)))
    assert said(found) == [(None, "strokes", status)]


def test_an_empty_first_dip_is_no_layer() -> None:
    made = (stroke(1, "down", 0.0, counted=False), *strokes("dudu")[1:], stroke(5, "down"))
    found = rule_strokes.check(context(made, design=Stack(layers=4, type="Y")))
    assert said(found) == [(None, "strokes", "pass")]


def test_the_first_stroke_goes_as_designed() -> None:
    for first, status in (("down", "pass"), ("up", "fail")):
        found = rule_strokes.check(context(strokes("du"), design=Stack(first_stroke=first)))
        assert said(found) == [(1, "first stroke", status)]
        assert found[0].allowed == first
    assert rule_strokes.check(context((), design=Stack(first_stroke="up"))) == []


def test_two_strokes_the_same_way_want_a_reason() -> None:
    made = strokes("duu")
    found = rule_strokes.check(context(made))
    assert said(found) == [(3, "stroke order", "fail")]
    assert found[0].found == "up after up"
    back = UnjudgedCrossing(270.0, 290.0, "during a renewal of the film")
    found = rule_strokes.check(context(made, unjudged=(back,)))
    assert said(found) == [(3, "stroke order", "pass")]
    assert "crossed during a renewal" in found[0].found
    elsewhere = replace(back, from_s=20.0, to_s=40.0)
    assert rule_strokes.check(context(made, unjudged=(elsewhere,)))[0].status == "fail"


@pytest.mark.parametrize(
    ("wanted", "found", "decided", "status"),
    [
        ("Y", "Y", True, "pass"),
        ("Y", "Y", False, "pass"),
        ("Y", "X", True, "fail"),
        ("Y", "XY", False, "undecided"),
        ("Y", None, False, "undecided"),
    ],
)
def test_the_type_against_the_design(
    wanted: str, found: str | None, decided: bool, status: str
) -> None:
    ratio = Quantity(0.97, 0.01, "1") if found else None
    deposition = Deposition(found, ratio, None, None, "", decided)
    out = rule_type.check(context(design=Stack(type=wanted), deposition=deposition))
    assert said(out) == [(None, "deposition type", status)]
    assert out[0].allowed == wanted
    assert bool(out[0].decide) is (status == "undecided")
    assert ("up/down 0.97" in out[0].found) is (found is not None)
    assert rule_type.check(context(deposition=deposition)) == []


def test_ratios_of_the_ways_that_should_take_film() -> None:
    made = (stroke(1, "down", 1.0), stroke(2, "up", 0.1), stroke(3, "down", 0.955))
    found = rule_ratio.check(context(made, design=Stack(type="X")))
    assert said(found) == [(1, "transfer ratio", "pass"), (3, "transfer ratio", "undecided")]
    assert found[1].decide == REMEDIES["contact"]
    both = rule_ratio.check(context(made))
    assert said(both)[1] == (2, "transfer ratio", "fail")


def test_a_stroke_without_a_ratio_is_undecided() -> None:
    found = rule_ratio.check(context((stroke(1, "down", None),)))
    assert said(found) == [(1, "transfer ratio", "undecided")]
    assert "dwell" in found[0].decide


def test_the_mean_keeps_what_the_strokes_share() -> None:
    """Four of 0.965, u 0.01 each: 0.005 of the mean if independent (pass), 0.01 if common (undecided)."""
    made = strokes("dudu", 0.965)
    apart = rule_mean.check(context(made, ratio_covariance=np.eye(4) * 1e-4))
    common = rule_mean.check(context(made, ratio_covariance=np.full((4, 4), 1e-4)))
    assert said(apart) == [(None, "mean ratio", "pass")]
    assert said(common) == [(None, "mean ratio", "undecided")]
    assert said(rule_mean.check(context(made, design=Stack(accept_mean=(0.98, 1.02))))) == [
        (None, "mean ratio", "fail")
    ]
    assert rule_mean.check(context((stroke(1, "down", None),))) == []


@pytest.mark.parametrize(
    ("slope", "limit", "status"),
    [
        (-0.001, 0.01, "pass"),
        (-0.02, 0.01, "fail"),
        (0.02, 0.01, "fail"),
        (0.009, 0.01, "undecided"),
    ],
)
def test_the_drift_against_its_limit(slope: float, limit: float, status: str) -> None:
    drift = Drift(Quantity(slope, 0.002, "1"), (slope, slope), (7,), 10)
    found = rule_drift.check(context(strokes("dudu"), design=Stack(drift_limit=limit), drift=drift))
    assert said(found) == [(None, rule_drift.RULE, status), (7, "sudden change", "fail")]


def test_the_drift_may_use_half_the_band_over_the_strokes() -> None:
    """0.95 to 1.05 and ten strokes: 0.005 a stroke."""
    drift = Drift(Quantity(0.0, 1e-4, "1"), (0.0, 0.0), (), 10)
    found = rule_drift.check(context(drift=drift))
    assert found[0].allowed == "at most 0.005 per stroke"
    assert rule_drift.check(context()) == []


@pytest.mark.parametrize(
    ("mean", "probe", "tolerance", "status"),
    [
        (30.3, None, None, "pass"),  # half a mN/m where nothing is said
        (30.6, None, None, "fail"),
        (29.85, 0.1, 0.2, "undecided"),
        (28.9, 0.1, 0.2, "fail"),
        (29.9, None, 0.2, "pass"),
    ],
)
def test_the_pressure_held(
    mean: float, probe: float | None, tolerance: float | None, status: str
) -> None:
    def mn(value: float | None) -> Quantity | None:
        return None if value is None else Quantity(value, None, "mN/m")

    made = (stroke(1, pressure_mean=mean),)
    dipping = Dipping(pressure=mn(30.0), tolerance=mn(tolerance))
    found = rule_pressure.check(
        context(made, dipping=dipping, trough=Trough(pressure_uncertainty=mn(probe)))
    )
    assert said(found) == [(1, "pressure held", status)]
    assert rule_pressure.check(context(made)) == []


@pytest.mark.parametrize(
    ("speed", "tolerance", "status"),
    [(0.102, None, "pass"), (0.15, None, "fail"), (0.12, 0.03, "pass"), (0.11, None, "undecided")],
)
def test_the_dipping_speed(speed: float, tolerance: float | None, status: str) -> None:
    made = (stroke(1, speed_mm_per_s=speed), stroke(2, "up", speed_mm_per_s=float("nan")))
    dipping = Dipping(
        speed=Quantity(0.1, None, "mm/s"),
        speed_tolerance=None if tolerance is None else Quantity(tolerance, None, "mm/s"),
    )
    found = rule_speed.check(context(made, dipping=dipping))
    assert said(found) == [(1, "dipping speed", status)]
    assert rule_speed.check(context(made)) == []


def test_renewals_and_crossings_without_a_film() -> None:
    two = (Renewal(1.0, 2.0), Renewal(5.0, 6.0))
    for most, status in ((2, "pass"), (1, "fail"), (0, "fail")):
        found = rule_renewals.check(context(renewals=two, design=Stack(renewals=most)))
        assert said(found) == [(None, "renewals", status)]
        assert found[0].allowed == f"at most {most}"
    lost = UnjudgedCrossing(12.0, 72.0, "while the pressure was not held")
    found = rule_renewals.check(context(renewals=two, unjudged=(lost,)))
    assert said(found) == [(None, "crossing outside a held film", "undecided")]
    assert found[0].found == "12-72 s, while the pressure was not held"
    assert found[0].decide


@pytest.mark.parametrize(
    ("layers", "u", "status"), [(19.8, 0.1, "pass"), (17.9, 0.1, "fail"), (19.05, 0.1, "undecided")]
)
def test_the_layers_add_up(layers: float, u: float, status: str) -> None:
    stack = SimpleNamespace(layers=Quantity(layers, u, "1"), thickness=None)
    made = strokes("dudu")
    found = rule_layers.check(context(made, design=Stack(layers=20), stack=stack))
    assert said(found) == [(None, "layers", status)]
    assert found[0].allowed == "19 to 21"
    assert rule_layers.check(context(made, stack=stack)) == []
    assert rule_layers.check(context((), design=Stack(layers=20), stack=stack)) == []


def nm(value: float, u: float | None = None, random: float = 0.0) -> Quantity:
    return Quantity(value, u, "nm", u_random=random, u_systematic=u)


@pytest.mark.parametrize(
    ("found", "tolerance", "allowed", "status"),
    [
        (49.6, None, "47.5 to 52.5 nm", "pass"),
        (44.1, None, "47.5 to 52.5 nm", "fail"),
        (47.9, None, "47.5 to 52.5 nm", "undecided"),
        (49.0, 0.1, "49.9 to 50.1 nm", "undecided"),
        (46.0, 5.0, "45 to 55 nm", "undecided"),
    ],
)
def test_the_thickness(found: float, tolerance: float | None, allowed: str, status: str) -> None:
    design = Stack(
        layers=20,
        layer_thickness=nm(2.5),
        thickness_tolerance=None if tolerance is None else nm(tolerance),
    )
    stack = SimpleNamespace(layers=Quantity(20.0, 0.1, "1"), thickness=nm(found, 0.8))
    out = rule_thickness.check(context(design=design, stack=stack))
    assert said(out) == [(None, "thickness", status)]
    assert out[0].allowed == allowed
    assert ("layer_thickness" in out[0].decide) is (status == "undecided")


def test_the_thickness_is_left_alone_where_it_is_not_designed() -> None:
    stack = SimpleNamespace(layers=Quantity(20.0, 0.1, "1"), thickness=nm(50.0, 0.8))
    for design in (
        Stack(layers=20),
        Stack(layer_thickness=nm(2.5)),
        Stack(layers=20, layer_thickness=nm(2.5), films=(StackFilm("a", layer_thickness=nm(3.0)),)),
    ):
        assert rule_thickness.check(context(design=design, stack=stack)) == []
    none = SimpleNamespace(layers=stack.layers, thickness=None)
    full = Stack(layers=20, layer_thickness=nm(2.5))
    assert rule_thickness.check(context(design=full, stack=none)) == []
    # what the strokes leave open is decided by the strokes
    loose = SimpleNamespace(layers=stack.layers, thickness=Quantity(47.9, 0.8, "nm", 0.7, 0.3))
    assert "transfer ratios" in rule_thickness.check(context(design=full, stack=loose))[0].decide


def test_strokes_against_the_plan() -> None:
    made = (stroke(1, "down", 1.0), stroke(2, "up", 0.8), stroke(3, "down", 0.955), stroke(4, "up"))
    plan = (row(1), row(2, "up"), row(3), row(4, "down"), row(9))
    found = rule_plan.check(context(made, plan=plan))
    assert said(found) == [
        (1, "film against plan", "pass"),
        (2, "film against plan", "fail"),
        (3, "film against plan", "undecided"),
        (4, "film against plan", "fail"),
    ]
    assert found[0].allowed == "9.5 to 10.5 cm^2"
    assert (found[3].found, found[3].allowed) == ("up", "down")


def test_a_plan_says_nothing_of_strokes_it_lacks_or_that_should_take_none() -> None:
    made = (stroke(1, "down", 0.0, counted=False), stroke(2, "up"), stroke(3), stroke(4, "up"))
    plan = (row(1), row(3, None, 0.0), {"stroke": 4, "film_removed": None})
    assert rule_plan.check(context(made, plan=plan)) == []
    assert rule_plan.check(context(made)) == []


def test_evidence_is_taken_over() -> None:
    def kind(label: str, layers: Quantity | None, good: bool) -> SimpleNamespace:
        return SimpleNamespace(label=label, layers=layers, consistent=good)

    kinds = (kind("a", Quantity(19.7, 0.3, "1"), True), kind("b", None, False))
    found = rule_evidence.check(context(evidence=SimpleNamespace(kinds=kinds)))
    assert said(found) == [(None, "evidence: a", "pass"), (None, "evidence: b", "fail")]
    assert found[1].found == "no layer count"
    assert rule_evidence.check(context()) == []


def test_an_undecided_sum_asks_for_what_the_widest_stroke_lacks() -> None:
    """Of four strokes the third has the widest ratio, for want of long dwells; one has no ratio at all."""
    made = (
        stroke(1, "down", 0.955),
        stroke(2, "up", 0.955),
        replace(
            stroke(3, "down", 0.955, budget={"dwells": 0.04}), ratio=Quantity(0.955, 0.04, "1")
        ),
        stroke(4, "up", None, budget={"position": 0.5}),
    )
    stack = SimpleNamespace(layers=Quantity(19.05, 0.1, "1"), thickness=None)
    layers = rule_layers.check(context(made, design=Stack(layers=20), stack=stack))
    mean = rule_mean.check(context(made))
    assert [f.decide for f in layers + mean] == [REMEDIES["dwells"]] * 2


def test_the_mean_takes_the_covariance_of_its_own_strokes() -> None:
    """Down-strokes 1 and 3 of three: (1e-4 + 9e-4) / 4 is 0.0158 squared, whatever the up-stroke's."""
    made = strokes("dud", 1.0)
    covariance = np.diag([1e-4, 25.0, 9e-4])
    found = rule_mean.check(context(made, design=Stack(type="X"), ratio_covariance=covariance))
    assert said(found) == [(None, "mean ratio", "pass")]
    assert found[0].found == "1.00 ± 0.03"
