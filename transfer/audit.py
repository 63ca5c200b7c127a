"""The build against its design: every rule asked, one verdict."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from isotherm.sheet import RunSheet
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
from transfer.audit_finding import AuditContext, Finding
from transfer.evidence_result import EvidenceResult
from transfer.result import TransferResult

__all__ = ["AuditResult", "audit"]

# In the order a reader asks: what was done, how well, held how, what it adds up to, who else says so.
_RULES = (
    rule_strokes,
    rule_type,
    rule_ratio,
    rule_mean,
    rule_drift,
    rule_pressure,
    rule_speed,
    rule_renewals,
    rule_layers,
    rule_thickness,
    rule_plan,
    rule_evidence,
)


@dataclass(frozen=True)
class AuditResult:
    """The verdict on one build. findings : everything judged, in the order of the rules."""

    result: TransferResult
    findings: tuple[Finding, ...]
    evidence: EvidenceResult | None = None

    @property
    def verdict(self) -> str:
        """ "reject" when any finding fails, else "accept" (undecided findings are named beside it)."""
        return "reject" if self.failed else "accept"

    @property
    def failed(self) -> tuple[Finding, ...]:
        """Findings outside their limits."""
        return tuple(f for f in self.findings if f.status == "fail")

    @property
    def undecided(self) -> tuple[Finding, ...]:
        """Findings whose uncertainty straddles a limit, or that could not be judged."""
        return tuple(f for f in self.findings if f.status == "undecided")

    @property
    def to_decide(self) -> tuple[str, ...]:
        """What to measure to decide the undecided, each once, the most often needed first."""
        counts: dict[str, int] = {}
        for finding in self.undecided:
            if finding.decide:
                counts[finding.decide] = counts.get(finding.decide, 0) + 1
        return tuple(sorted(counts, key=lambda text: -counts[text]))

    def to_json(self) -> dict[str, Any]:
        """Return the transfer result's JSON with verdict, findings and evidence added.

        findings lists what fails and what is undecided; checks lists everything judged.
        """
        out = self.result.to_json()
        out["schema"] = "upstroke.audit/1"
        out["verdict"] = self.verdict
        out["undecided"] = len(self.undecided)
        out["findings"] = [f.to_json() for f in (*self.failed, *self.undecided)]
        out["checks"] = [f.to_json() for f in self.findings]
        out["to_decide"] = list(self.to_decide)
        out["evidence"] = []
        if self.evidence is not None:
            out.update(self.evidence.to_json())
            out["warnings"] = [*out["warnings"], *self.evidence.warnings]
        return out


def audit(
    result: TransferResult,
    sheet: RunSheet,
    *,
    plan: dict[str, Any] | None = None,
    evidence: EvidenceResult | None = None,
) -> AuditResult:
    """Judge a build against the sheet's design.

    Parameters
    ----------
    result : TransferResult
    sheet : RunSheet
        [stack] is the design; [dipping] what was to be held.
    plan : dict or None
        JSON of `upstroke target`, whose "plan" each stroke is compared with.
    evidence : EvidenceResult or None
        What the sample itself shows.

    Returns
    -------
    AuditResult
    """
    rows: tuple[dict[str, Any], ...] = ()
    if plan is not None:
        found = plan.get("plan") or (plan.get("budget") or {}).get("plan") or []
        rows = tuple(row for row in found if isinstance(row, dict) and "stroke" in row)
    context = AuditContext(result, sheet, rows, evidence)
    findings = [finding for rule in _RULES for finding in rule.check(context)]
    return AuditResult(result, tuple(findings), evidence)
