"""Rule `layers`: the layers add up to the design."""

from __future__ import annotations

from transfer.audit_finding import AuditContext, Finding, judge_between
from transfer.audit_remedy import remedy_for

__all__ = ["RULE", "check"]

RULE = "layers"


def check(context: AuditContext) -> list[Finding]:
    """Hold the sum of ratios against `stack.layers` within the accepted mean ratio.

    Default: layers times `stack.accept_mean`, else `stack.accept`; nothing without `stack.layers`.
    Reason: the sum decides thickness and mass, whichever strokes made it.
    Passes: 19.8 ± 0.1 of 20 (19 to 21). Fails: 17.9 ± 0.1 of 20. Undecided: 19.05 ± 0.10 of 20.
    """
    design = context.sheet.stack
    if design.layers is None or not context.result.strokes:
        return []
    low, high = design.accept_mean or design.accept
    widest = max(context.result.strokes, key=lambda s: (s.ratio.u or 0.0) if s.ratio else 0.0)
    return [
        judge_between(
            RULE,
            context.result.stack.layers,
            low * design.layers,
            high * design.layers,
            decide=remedy_for(widest),
        )
    ]
