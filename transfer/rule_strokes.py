"""Rule `strokes`: as many strokes as the design needs, in its order."""

from __future__ import annotations

from itertools import pairwise

from transfer.audit_finding import AuditContext, Finding, judge_count

__all__ = ["RULE", "check"]

RULE = "strokes"


def check(context: AuditContext) -> list[Finding]:
    """Count the strokes that should lay a layer, and follow their directions.

    Default: as many layers as `stack.layers`, of `stack.type` (Y and XY both ways, X down, Z up); the first
    stroke goes `stack.first_stroke`; ways alternate. Without `stack.layers` nothing is counted.
    Reason: a stroke too few is a layer missing, whatever the ratios say; two strokes the same way in a row
    mean that one was not seen or not through the film.
    Passes: Y, 4 layers, found down up down up. Fails: Y, 4 layers, found down up down.
    """
    design, strokes = context.sheet.stack, context.result.strokes
    out: list[Finding] = []
    if design.layers is not None:
        ways = {"X": ("down",), "Z": ("up",)}.get(design.type or "", ("down", "up"))
        laying = [s for s in strokes if s.direction in ways and s.counted]
        allowed = f"{design.layers} {' or '.join(ways)}"
        out.append(judge_count(RULE, len(laying), allowed, len(laying) == design.layers))
    if design.first_stroke and strokes:
        right = strokes[0].direction == design.first_stroke
        status = "pass" if right else "fail"
        out.append(Finding(1, "first stroke", strokes[0].direction, design.first_stroke, status))
    for before, after in pairwise(strokes):
        if before.direction == after.direction:
            between = [
                u for u in context.result.unjudged if before.end_s <= u.from_s <= after.start_s
            ]
            # a way back outside the film (X or Z dipping through a clean surface) explains it
            status = "pass" if between else "fail"
            found = f"{after.direction} after {before.direction}"
            if between:
                found += f" (in between: crossed {between[0].why})"
            out.append(Finding(after.number, "stroke order", found, "alternate", status))
    return out
