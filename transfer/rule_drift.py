"""Rule `drift`: the ratio stays where it was along the build."""

from __future__ import annotations

from isotherm.quantity import Quantity, format_quantity
from transfer.audit_finding import AuditContext, Finding, judge_between

__all__ = ["RULE", "check"]

RULE = "drift"


def check(context: AuditContext) -> list[Finding]:
    """Hold the trend of the ratio within `stack.drift_limit`, and allow no sudden change.

    Default: the trend may carry the ratio, over the whole build, through half the width of `stack.accept`.
    Reason: a film that ages, a surface that roughens or a meniscus that fails shows first as a trend; each
    stroke may still pass.
    Passes: slope 0.0002 ± 0.0003 per stroke over 20 strokes. Fails: a drop of 20 % after stroke 10.
    """
    drift = context.result.drift
    if drift.slope is None:
        return []
    low, high = context.sheet.stack.accept
    limit = context.sheet.stack.drift_limit
    if limit is None:
        limit = 0.5 * (high - low) / max(drift.strokes, 1)
    size = Quantity(abs(drift.slope.value), drift.slope.u, "1")
    finding = judge_between(
        RULE, size, None, limit, decide="more strokes, or narrower ratios", digits=".2g"
    )
    shown = f"{format_quantity(drift.slope)} per stroke"
    out = [
        Finding(None, RULE, shown, f"{finding.allowed} per stroke", finding.status, finding.decide)
    ]
    out.extend(
        Finding(after, "sudden change", f"ratio changes after stroke {after}", "no change", "fail")
        for after in drift.changes
    )
    return out
