"""A slice of the target programme, on the report half: never in a coexistence, never near collapse."""

from __future__ import annotations

from functools import cache

from isotherm_truth import TrueCollapse, TruePoint, TrueTransition, Truth
from target_score import FAMILIES_SCORED, Verdict, fault_of, verdict_of

TRACES = 30


@cache
def verdicts() -> tuple[Verdict, ...]:
    families = FAMILIES_SCORED
    return tuple(verdict_of(2 * i + 1, families[i % len(families)]) for i in range(TRACES))


def test_recommendation_is_never_in_a_coexistence_nor_near_a_true_feature() -> None:
    assert [v for v in verdicts() if v.wrong] == []


def test_a_pressure_is_found_for_every_film_but_a_gas() -> None:
    assert {v.family for v in verdicts() if v.recommended is None} <= {"gas"}
    assert sum(v.recommended is not None for v in verdicts()) >= 0.85 * TRACES


def test_the_judge_finds_fault() -> None:
    truth = Truth(
        family="coexistence", generator="by hand",
        collapse=TrueCollapse("constant-area", 0.2, 50.0),
        transitions=(
            TrueTransition("coexistence", onset=TruePoint(0.6, 8.0), end=TruePoint(0.3, 10.0)),
            TrueTransition("kink", at=TruePoint(0.25, 30.0)),
        ),
        lift_off=None, limiting_area=None, area_at={}, highest_pressure=50.0, knees=(), foot=1.0,
    )  # fmt: skip
    found = {
        p: fault_of(truth, p) for p in (5.0, 7.5, 9.0, 10.3, 20.0, 29.5, 30.3, 40.0, 49.5, 55.0)
    }
    assert found == {
        5.0: "", 7.5: "guard", 9.0: "coexistence", 10.3: "guard", 20.0: "", 29.5: "guard", 30.3: "guard",
        40.0: "", 49.5: "collapse", 55.0: "collapse",
    }  # fmt: skip
