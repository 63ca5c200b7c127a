"""Limits, remedies and the verdict of an audit."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import pytest

from isotherm.quantity import Quantity
from tests.transfer.audit_example import context, row, stroke
from transfer.audit import AuditResult, audit
from transfer.audit_finding import Finding, judge_between
from transfer.audit_remedy import REMEDIES, remedy_for


def test_the_evidence_s_warnings_join_the_build_s() -> None:
    class Build:
        def to_json(self) -> dict[str, Any]:
            return {"schema": "upstroke.transfer/1", "warnings": ["a"]}

    class Evidence:
        warnings = ("b",)

        def to_json(self) -> dict[str, Any]:
            return {"evidence": [{"kind": "absorbance"}]}

    build: Any = Build()
    evidence: Any = Evidence()
    told = AuditResult(build, (Finding(3, "x", "f", "a", "fail"),), evidence).to_json()
    assert told["schema"] == "upstroke.audit/1"
    assert (told["verdict"], told["undecided"]) == ("reject", 0)
    assert told["warnings"] == ["a", "b"]
    assert told["evidence"] == [{"kind": "absorbance"}]
    assert told["findings"] == told["checks"]
    assert told["checks"][0]["stroke"] == 3
    silent = AuditResult(build, ()).to_json()
    assert (silent["evidence"], silent["warnings"]) == ([], ["a"])


def test_the_remedy_is_that_of_the_largest_part() -> None:
    for name, text in REMEDIES.items():
        budget = dict.fromkeys(REMEDIES, 0.001) | {name: 0.002}
        assert remedy_for(stroke(1, budget=budget)) == text
    assert remedy_for(stroke(1, budget={})) == ""
    assert remedy_for(stroke(1, budget={"something else": 1.0})) == ""


@pytest.mark.parametrize(
    ("low", "high", "value", "status", "allowed"),
    [
        (None, 2.0, 1.5, "pass", "at most 2 mm"),
        (None, 2.0, 2.5, "fail", "at most 2 mm"),
        (1.0, None, 1.5, "pass", "at least 1 mm"),
        (1.0, None, 0.5, "fail", "at least 1 mm"),
        (1.0, None, 1.1, "undecided", "at least 1 mm"),
        (1.0, 2.0, 1.2, "pass", "1 to 2 mm"),  # 2 u reach the limit itself
        (1.0, 2.0, 0.81, "undecided", "1 to 2 mm"),
        (1.0, 2.0, 2.19, "undecided", "1 to 2 mm"),
    ],
)
def test_limits_may_be_open_on_one_side(
    low: float | None, high: float | None, value: float, status: str, allowed: str
) -> None:
    finding = judge_between("x", Quantity(value, 0.0999999, "mm"), low, high, unit="mm", decide="?")
    assert (finding.status, finding.allowed) == (status, allowed)
    assert finding.decide == ("?" if status == "undecided" else "")


@pytest.mark.parametrize(
    ("value", "status"),
    [(1.0, "undecided"), (1.5, "pass"), (1.75, "pass"), (2.25, "undecided"), (0.75, "undecided"),
     (0.5, "undecided"), (0.4375, "fail"), (2.75, "undecided"), (2.8125, "fail")],
)  # fmt: skip
def test_reaching_a_limit_is_not_crossing_it(value: float, status: str) -> None:
    """U = 0.5 (2 x 0.25, exact in binary) about limits of 1 and 2.25."""
    finding = judge_between("x", Quantity(value, 0.25, "1"), 1.0, 2.25, decide="a way")
    assert finding.status == status
    assert finding.to_json()["decide"] == ("a way" if finding.status == "undecided" else None)


def test_the_verdict_and_what_would_decide() -> None:
    def undecided(text: str) -> Finding:
        return Finding(None, "x", "", "", "undecided", text)

    passed, failed = Finding(1, "x", "", "", "pass"), Finding(2, "x", "", "", "fail")
    result: Any = SimpleNamespace()
    open_ = AuditResult(
        result, (passed, undecided("a"), undecided("b"), undecided("b"), undecided(""))
    )
    assert open_.verdict == "accept"
    assert open_.to_decide == ("b", "a")
    assert len(open_.undecided) == 4
    closed = AuditResult(result, (passed, failed))
    assert closed.verdict == "reject"
    assert closed.failed == (failed,)


@pytest.mark.parametrize(
    "plan",
    [
        {"plan": [row(1, "up")]},
        {"budget": {"plan": [row(1, "up"), "a stroke", {"note": "none"}, 5]}},
    ],
)
def test_the_plan_is_found_where_the_target_puts_it(plan: dict[str, Any]) -> None:
    made = context((stroke(1, "down"),))
    found = audit(made.result, made.sheet, plan=plan).findings
    assert [f.status for f in found if f.rule == "film against plan"] == ["fail"]
    for empty in (None, {}, {"budget": None}, {"plan": []}):
        found = audit(made.result, made.sheet, plan=empty).findings
        assert not [f for f in found if f.rule == "film against plan"]
