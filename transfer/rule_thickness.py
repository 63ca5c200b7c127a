"""Rule `thickness`: the stack is as thick as designed."""

from __future__ import annotations

from transfer.audit_finding import AuditContext, Finding, judge_between

__all__ = ["RULE", "check"]

RULE = "thickness"


def check(context: AuditContext) -> list[Finding]:
    """Hold the ledger's thickness against the design's within `stack.thickness_tolerance`.

    Default: the accepted mean ratio either side of layers times `stack.layer_thickness`; nothing without
    both, or where films of different thickness alternate and no tolerance about their sum can be formed.
    Reason: thickness is what most multilayers are ordered by. The layer thickness' own u is common to all
    layers and does not average out.
    Passes: 49.6 ± 0.8 nm for 50 ± 2.5 nm. Fails: 44.1 ± 0.8 nm. Undecided: 47.9 ± 0.8 nm.
    """
    design = context.sheet.stack
    found = context.result.stack.thickness
    each = design.layer_thickness
    if found is None or each is None or design.layers is None:
        return []
    if any(f.layer_thickness is not None for f in design.films):
        return []
    wanted = design.layers * each.value
    if design.thickness_tolerance is not None:
        low = wanted - design.thickness_tolerance.value
        high = wanted + design.thickness_tolerance.value
    else:
        part = design.accept_mean or design.accept
        low, high = part[0] * wanted, part[1] * wanted
    own, shared = found.u_random or 0.0, found.u_systematic or 0.0
    decide = (
        "a closer layer thickness (stack.layer_thickness), or the thickness of this sample (--evidence)"
        if shared > own
        else "narrower transfer ratios (see the strokes' budgets)"
    )
    return [judge_between(RULE, found, low, high, decide=decide, unit="nm", digits=".4g")]
