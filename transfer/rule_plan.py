"""Rule `plan`: each stroke took the film that the dipping plan set aside for it."""

from __future__ import annotations

from transfer.audit_finding import AuditContext, Finding, judge_between
from transfer.audit_remedy import remedy_for

__all__ = ["RULE", "check"]

RULE = "film against plan"


def check(context: AuditContext) -> list[Finding]:
    """Compare film removed with the plan's, stroke by stroke.

    Default: the plan's area times `stack.accept`; nothing without a plan (`--plan`).
    Reason: a plan budgets the film; strokes that take more run it out early, strokes that take less show at
    once, at the trough.
    Passes: 13.1 cm^2 for 13.0 planned. Fails: 10.2 cm^2 for 13.0 planned.
    """
    low, high = context.sheet.stack.accept
    planned = {int(row["stroke"]): row for row in context.plan if row.get("film_removed")}
    out: list[Finding] = []
    for stroke in context.result.strokes:
        row = planned.get(stroke.number)
        if row is None or not stroke.counted:
            continue
        area = float(row["film_removed"]["value"])
        if row.get("direction") not in (None, stroke.direction):
            out.append(
                Finding(stroke.number, RULE, stroke.direction, str(row["direction"]), "fail")
            )
            continue
        if area <= 0.0:
            continue
        out.append(
            judge_between(
                RULE,
                stroke.film_removed,
                low * area,
                high * area,
                stroke=stroke.number,
                decide=remedy_for(stroke),
                unit="cm^2",
                digits=".4g",
            )
        )
    return out
