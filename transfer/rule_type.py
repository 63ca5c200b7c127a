"""Rule `deposition type`: the strokes took film the way the design says."""

from __future__ import annotations

from transfer.audit_finding import AuditContext, Finding

__all__ = ["RULE", "check"]

RULE = "deposition type"


def check(context: AuditContext) -> list[Finding]:
    """Compare the type found with `stack.type`.

    Default: nothing is compared without `stack.type`.
    Reason: X, Y and Z stacks of the same thickness are different solids: chains and head groups meet
    differently at every layer.
    Passes: designed Y, found Y. Fails: designed Y, found X. Undecided: only strokes of one direction.
    """
    wanted = context.sheet.stack.type
    if wanted is None:
        return []
    found = context.result.deposition
    ratio = found.up_down_ratio
    text = found.type or "not decided"
    if ratio is not None:
        text += f" (up/down {ratio})"
    if found.type is None:
        decide = "strokes of both directions through the held film"
        return [Finding(None, RULE, text, wanted, "undecided", decide)]
    if found.type == wanted:
        return [Finding(None, RULE, text, wanted, "pass")]
    if not found.decided:
        return [Finding(None, RULE, text, wanted, "undecided", "more strokes of both directions")]
    return [Finding(None, RULE, text, wanted, "fail")]
