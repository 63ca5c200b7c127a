"""What stretches mean, and the names of phases."""

from dataclasses import replace

import pytest
from knee_models import straight

from isotherm.phases import phase_name, read_stretches


@pytest.mark.parametrize(
    ("modulus", "name"),
    [
        # Davies & Rideal 1963, as widely quoted: 12.5-50 expanded, 50-100 intermediate,
        # 100-250 condensed; above 250 solid by practice
        (0.0, "gaseous"),
        (12.4, "gaseous"),
        (12.5, "liquid-expanded"),
        (49.0, "liquid-expanded"),
        (75.0, "intermediate"),
        (100.0, "liquid-condensed"),
        (249.0, "liquid-condensed"),
        (400.0, "solid"),
        (1500.0, "solid"),
    ],
)
def test_names_follow_the_customary_ranges(modulus: float, name: str) -> None:
    assert phase_name(modulus) == name


def test_the_model_of_legs_is_what_it_says() -> None:
    reading = read_stretches(straight((0.5, 2.0), (0.3, 80.0), (0.1, 300.0)))
    assert [s.modulus for s in reading.stretches] == pytest.approx([2.0, 80.0, 300.0])
    assert [s.first for s in reading.stretches] == pytest.approx([2.0, 80.0, 300.0])
    assert [(s.start, s.stop) for s in reading.stretches] == [
        pytest.approx(pair) for pair in ((0.0, 0.5), (0.5, 0.8), (0.8, 0.9))
    ]


@pytest.mark.parametrize(
    ("legs", "lift_off", "coexistences", "kinks", "collapse"),
    [
        # a flat start, a condensed film, a collapse that falls
        ([(0.5, 0.2), (0.2, 120.0), (0.1, -40.0)], 0, (), (), 1),
        # the first leg rises too much to be a baseline
        ([(0.5, 8.0), (0.2, 120.0)], None, (), (), None),
        # a fluid film with a coexistence, then condensed, then collapse
        ([(0.6, 0.1), (0.3, 30.0), (0.4, 3.0), (0.2, 150.0), (0.2, 1.0)], 0, ((1, 2),), (), 3),
        # a plateau in steps is one coexistence
        ([(0.3, 30.0), (0.2, 6.0), (0.2, 4.0), (0.2, 150.0)], None, ((0, 2),), (), None),
        # a step up is a kink, a step up from a gaseous film is none
        ([(0.5, 0.0), (0.1, 140.0), (0.1, 400.0)], 0, (), (1,), None),
        ([(0.5, 10.0), (0.1, 140.0), (0.1, 400.0)], None, (), (1,), None),
        # less than 1.3 times is no kink, more is
        ([(0.2, 100.0), (0.2, 128.0)], None, (), (), None),
        ([(0.2, 100.0), (0.2, 132.0)], None, (), (0,), None),
        # less than 0.7 of both neighbours is a plateau, more is none
        ([(0.2, 100.0), (0.2, 68.0), (0.2, 100.0)], None, ((0, 1),), (), None),
        ([(0.2, 100.0), (0.2, 72.0), (0.2, 100.0)], None, (), (1,), None),
        # a plateau shorter than 1 % of ln A is a glitch
        ([(0.2, 100.0), (0.009, 1.0), (0.2, 100.0)], None, (), (), None),
        ([(0.2, 100.0), (0.012, 1.0), (0.2, 100.0)], None, ((0, 1),), (), None),
        # a film that softens below 0.4 of its stiffest and stays there has collapsed
        ([(0.2, 100.0), (0.2, 38.0)], None, (), (), 0),
        ([(0.2, 100.0), (0.2, 42.0)], None, (), (), None),
        # on a fluid branch that ends on a plateau it may be a coexistence; when it falls, it is not
        ([(0.5, 0.1), (0.3, 30.0), (0.3, 1.0)], 0, ((1, None),), (), None),
        ([(0.5, 0.1), (0.3, 30.0), (0.3, -5.0)], 0, (), (), 1),
        ([(0.5, 0.1), (0.3, 30.0), (0.3, 1.0), (0.2, 2.0)], 0, (), (), 1),
    ],
)
def test_what_stretches_mean(
    legs: list[tuple[float, float]],
    lift_off: int | None,
    coexistences: tuple[tuple[int, int | None], ...],
    kinks: tuple[int, ...],
    collapse: int | None,
) -> None:
    """The bounds are the module's own choices, tried a little on either side."""
    reading = read_stretches(straight(*legs))
    assert reading.lift_off == lift_off
    assert reading.baseline == (lift_off == 0)
    assert reading.coexistences == coexistences
    assert reading.kinks == kinks
    assert reading.collapse == collapse
    falling = collapse is not None and legs[collapse + 1][1] < 0
    assert reading.falls == falling
    stops_inside = next((onset for onset, end in coexistences if end is None), len(legs) - 1)
    assert reading.last == (stops_inside if collapse is None else collapse)
    assert bool(reading.notes) == any(end is None for _, end in coexistences)


def test_a_wide_rounding_is_no_kink() -> None:
    legs = ((0.2, 100.0), (0.2, 200.0))
    assert read_stretches(straight(*legs, width=0.07)).kinks == (0,)
    assert read_stretches(straight(*legs, width=0.08)).kinks == ()


@pytest.mark.parametrize(("modulus", "baseline"), [(0.4, True), (30.0, False)])
def test_one_smooth_curve_is_a_baseline_or_a_phase(modulus: float, baseline: bool) -> None:
    reading = read_stretches(straight((1.0, modulus)))
    assert reading.baseline == baseline
    assert (reading.lift_off, reading.coexistences, reading.kinks) == (None, (), ())
    assert (reading.collapse, reading.last) == (None, 0)


@pytest.mark.parametrize(
    ("roles", "coexistences", "kinks", "collapse", "last"),
    [
        (("lift-off", "kink", "collapse"), (), (1,), 2, 2),
        (("onset", "end", "collapse"), ((0, 1),), (), 2, 2),
        (("lift-off", "onset"), ((1, None),), (), None, 1),
        (("lift-off", "onset", "end"), ((1, 2),), (), None, 3),
    ],
)
def test_knees_whose_role_was_told_keep_it(
    roles: tuple[str, ...],
    coexistences: tuple[tuple[int, int | None], ...],
    kinks: tuple[int, ...],
    collapse: int | None,
    last: int,
) -> None:
    rising = [5.0, 60.0, 10.0][: len(roles)]
    moduli = [*rising, -20.0 if collapse else 40.0]
    model = replace(straight(*((0.2, m) for m in moduli)), roles=roles)
    reading = read_stretches(model)
    assert (reading.coexistences, reading.kinks) == (coexistences, kinks)
    assert (reading.collapse, reading.last) == (collapse, last)
    assert reading.baseline == (roles[0] == "lift-off")
    assert reading.falls == (collapse is not None)
    assert bool(reading.notes) == (coexistences[-1:] != () and coexistences[-1][1] is None)
