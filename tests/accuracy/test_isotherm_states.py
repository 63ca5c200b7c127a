"""A slice of `isotherm_states_score.py`, report half, with floors below what the whole measures."""

from __future__ import annotations

import numpy as np
import pytest
from isotherm_states_score import StatesMark, score_run


@pytest.fixture(scope="module")
def marks() -> list[StatesMark]:
    return [score_run(2 * i + 1) for i in range(64)]


def test_collapse_and_transitions_are_called(marks: list[StatesMark]) -> None:
    assert np.mean([m.collapse for m in marks]) >= 0.93
    assert np.mean([m.transitions for m in marks]) >= 0.90


@pytest.mark.parametrize(
    ("what", "median"), [("collapse", 0.15), ("kink", 0.15), ("plateau", 0.05)]
)
def test_pressures_are_those_of_the_equations(
    marks: list[StatesMark], what: str, median: float
) -> None:
    errors = [abs(e) for m in marks for name, e, _ in m.errors if name == what]
    assert len(errors) > 10
    assert np.median(errors) < median
