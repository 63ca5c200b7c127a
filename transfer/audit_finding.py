"""What an audit rule sees and what it says."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from isotherm.quantity import COVERAGE_FACTOR, Quantity, format_quantity
from isotherm.sheet import RunSheet
from transfer.evidence_result import EvidenceResult
from transfer.result import TransferResult

__all__ = ["AuditContext", "Finding", "judge_between", "judge_count"]


@dataclass(frozen=True)
class AuditContext:
    """All a rule may look at. plan : rows of a target's plan (JSON), evidence : what the sample shows."""

    result: TransferResult
    sheet: RunSheet
    plan: tuple[dict[str, Any], ...] = ()
    evidence: EvidenceResult | None = None


@dataclass(frozen=True)
class Finding:
    """One thing judged. stroke None: the whole build. status: "pass", "fail" or "undecided".

    decide : what measurement would decide an undecided finding; empty otherwise.
    """

    stroke: int | None
    rule: str
    found: str
    allowed: str
    status: str
    decide: str = ""

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "stroke": self.stroke,
            "rule": self.rule,
            "found": self.found,
            "allowed": self.allowed,
            "status": self.status,
            "decide": self.decide or None,
        }


def judge_between(
    rule: str,
    quantity: Quantity,
    low: float | None,
    high: float | None,
    *,
    stroke: int | None = None,
    decide: str = "",
    unit: str = "",
    digits: str = "g",
) -> Finding:
    """Judge a value with uncertainty against limits: undecided where ±2u straddles one.

    Parameters
    ----------
    rule : str
    quantity : Quantity
    low, high : float or None
        Limits, in the quantity's unit; None leaves that side open.
    stroke : int or None
    decide : str
        What would decide it.
    unit : str
        Unit to print.
    digits : str
        Format of the limits.

    Returns
    -------
    Finding
    """
    half = COVERAGE_FACTOR * (quantity.u or 0.0)
    below = low is not None and quantity.value + half < low
    above = high is not None and quantity.value - half > high
    inside = (low is None or quantity.value - half >= low) and (
        high is None or quantity.value + half <= high
    )
    status = "fail" if below or above else "pass" if inside else "undecided"
    tail = f" {unit}" if unit else ""
    if low is None:
        allowed = f"at most {high:{digits}}{tail}"
    elif high is None:
        allowed = f"at least {low:{digits}}{tail}"
    else:
        allowed = f"{low:{digits}} to {high:{digits}}{tail}"
    found = f"{format_quantity(quantity)}{tail}"
    return Finding(stroke, rule, found, allowed, status, decide if status == "undecided" else "")


def judge_count(rule: str, found: int, allowed: str, good: bool) -> Finding:
    """Judge a whole number, which has no uncertainty."""
    return Finding(None, rule, str(found), allowed, "pass" if good else "fail")
