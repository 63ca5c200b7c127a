"""Members of the joint statement: shared inputs, best estimate, who disagrees."""

import numpy as np
import pytest

from isotherm.quantity import Quantity
from transfer.evidence_joint import Member, combine, judge

NONE = np.zeros((1, 1))


def member(name, value, u, powers=None, counts=1.0):
    return Member(name, value, counts, u, np.zeros(1), powers or {})


def test_independent_members_give_the_weighted_mean():
    found = combine([member("a", 10.0, 0.1), member("b", 10.3, 0.2)], {}, NONE, 10.0)
    # by hand: weights 100 and 25
    assert found.value == pytest.approx((100 * 10.0 + 25 * 10.3) / 125)
    assert found.u == pytest.approx(125**-0.5)


def test_shared_input_is_not_averaged_down():
    inputs = {"layer thickness": Quantity(2.5, 0.1, "nm")}
    shared = [member(n, 20.0, 0.01, {"layer thickness": -1.0}) for n in "abcd"]
    found = combine(shared, inputs, NONE, 20.0)
    assert found.u == pytest.approx(20.0 * 0.04, rel=1e-3)


def test_shared_scale_does_not_pull_the_estimate_below_its_data():
    # two values 5 % apart under a common 20 % uncertainty: with errors taken at the measured values the
    # estimate would lie below both (Peelle's puzzle)
    inputs = {"scale": Quantity(1.0, 0.2, "1")}
    found = combine(
        [member("a", 10.0, 0.2, {"scale": -1.0}), member("b", 10.5, 0.21, {"scale": -1.0})],
        inputs,
        NONE,
        10.0,
    )
    assert 10.0 < found.value < 10.5


def test_spacing_corrects_the_thickness_it_shares():
    # thickness of a layer wrong by +8 % (2 u): thickness implies too few layers; the spacing says so
    inputs = {"layer thickness": Quantity(2.5, 0.1, "nm")}
    thickness = member("thickness", 20.0 / 1.08, 0.02, {"layer thickness": -1.0})
    spacing = member("spacing", 1 / 1.08 - 1, 0.002, {"layer thickness": -1.0}, counts=0.0)
    alone = combine([thickness], inputs, NONE, 20.0)
    both = combine([thickness, spacing], inputs, NONE, 20.0)
    assert abs(alone.value - 20.0) > 1.0
    assert both.value == pytest.approx(20.0, abs=0.15)
    assert both.u < 0.1 * alone.u


def test_order_does_not_matter():
    inputs = {"d": Quantity(2.5, 0.05, "nm"), "area": Quantity(0.2, 0.004, "nm^2")}
    members = [
        member("a", 20.0, 0.1, {"d": -1.0}),
        member("b", 20.4, 0.2, {"area": 1.0}),
        member("c", 24.0, 0.1, {"d": -1.0, "area": 1.0}),
        member("e", 20.1, 0.1),
    ]
    first = judge(members, inputs, NONE, 20.0, level=0.025)
    second = judge(members[::-1], inputs, NONE, 20.0, level=0.025)
    assert first.disagrees == second.disagrees == ("c",)
    assert first.chi_square == pytest.approx(second.chi_square)
    assert first.estimate.value == pytest.approx(second.estimate.value)


def test_two_that_differ_are_both_named_as_undecided():
    joint = judge([member("a", 20.0, 0.1), member("b", 25.0, 0.1)], {}, NONE, 20.0, level=0.025)
    assert not joint.agree
    assert joint.disagrees == ()
    assert set(joint.undecided) == {"a", "b"}
    assert joint.estimate is None


def test_a_shared_input_is_named_when_it_explains_everything():
    # three kinds lean on d, two do not; d is wrong by 20 %
    inputs = {"layer thickness": Quantity(2.5, 0.025, "nm")}
    leaning = [member(n, 24.0, 0.1, {"layer thickness": -1.0}) for n in "abc"]
    free = [member(n, 20.0, 0.1) for n in "ef"]
    joint = judge([*leaning, *free], inputs, NONE, 20.0, level=0.025)
    assert joint.disagrees == ("layer thickness",)
    assert joint.estimate.value == pytest.approx(20.0, abs=0.2)


def test_false_alarms_are_as_rare_as_stated():
    rng = np.random.default_rng(4)
    inputs = {"d": Quantity(2.5, 0.05, "nm")}
    alarms = 0
    for _ in range(300):
        d = rng.normal(0, 0.02)
        members = [
            member("a", 20 * (1 - d) + rng.normal(0, 0.2), 0.2, {"d": -1.0}),
            member("b", 20 * (1 - d) + rng.normal(0, 0.3), 0.3, {"d": -1.0}),
            member("c", 20 + rng.normal(0, 0.2), 0.2),
            member("e", 20 + rng.normal(0, 0.4), 0.4),
        ]
        alarms += not judge(members, inputs, NONE, 20.0, level=0.05).agree
    # 5 % of 300 is 15 ± 3.8
    assert 3 <= alarms <= 27
