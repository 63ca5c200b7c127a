"""Rule `evidence`: what the sample shows agrees with what left the water."""

from __future__ import annotations

from transfer.audit_finding import AuditContext, Finding

__all__ = ["RULE", "check"]

RULE = "evidence"


def check(context: AuditContext) -> list[Finding]:
    """Take over the judgement of every kind of independent evidence.

    Default: each kind as `transfer.evidence` judges it (chi-squared, levels stated there).
    Reason: a ratio says what left the water, the sample says what arrived.
    Passes: absorbance implies 19.7 ± 0.6 layers, ledger 19.8. Fails: resonator implies 15.1 ± 0.4.
    """
    if context.evidence is None:
        return []
    out = []
    for kind in context.evidence.kinds:
        implied = "no layer count" if kind.layers is None else f"{kind.layers} layers"
        ledger = f"{context.result.stack.layers} layers"
        status = "pass" if kind.consistent else "fail"
        out.append(Finding(None, f"{RULE}: {kind.label}", implied, ledger, status))
    return out
