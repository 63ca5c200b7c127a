"""A small slice of the accuracy programme, on the report half, against the floors of the task."""

from __future__ import annotations

from functools import cache
from typing import Any

import pytest
from isotherm_score import score_seed, seeds_of
from isotherm_tables import ROWS, summarise

TRACES = 70  # ten of each film family


@cache
def figures() -> dict[str, Any]:
    return summarise([score_seed(s, family=None) for s in seeds_of("report", TRACES)])


def test_every_trace_is_analysed() -> None:
    assert figures()["failed"] == 0


@pytest.mark.parametrize(("call", "floor"), [("collapse", 97.0), ("transitions", 95.0)])
def test_calls(call: str, floor: float) -> None:
    assert figures()[call]["percent"] >= floor


@pytest.mark.parametrize("row", [r for r in ROWS if r[3] is not None], ids=lambda row: row[0])
def test_errors(row: Any) -> None:
    label, _, _, median, p90 = row
    found = figures()["errors"][label]
    assert found["n"] >= 10
    assert found["median"] <= median
    if p90 is not None:
        assert found["p90"] <= p90


def test_truth_lies_inside_two_u() -> None:
    knees = figures()["coverage"]["knees"]
    assert knees["without_u"] == 0
    # 90 % is the floor; some 200 knees leave a counting error of 2 points on either side of it
    assert knees["percent"] >= 88.0
