"""Rule `transfer ratio`: every stroke that should take film takes as much as it coats."""

from __future__ import annotations

from transfer.audit_finding import AuditContext, Finding, judge_between
from transfer.audit_remedy import remedy_for
from transfer.result import Stroke

__all__ = ["RULE", "check", "judged_strokes"]

RULE = "transfer ratio"


def judged_strokes(context: AuditContext) -> list[Stroke]:
    """Strokes that the design expects to take film: X down, Z up, Y and XY both; not an empty first dip."""
    ways = {"X": ("down",), "Z": ("up",)}.get(context.sheet.stack.type or "", ("down", "up"))
    return [s for s in context.result.strokes if s.direction in ways and s.counted]


def check(context: AuditContext) -> list[Finding]:
    """Hold each stroke's ratio against `stack.accept`.

    Default: 0.95 to 1.05, common practice without a single source.
    Reason: below, bare or thinned substrate; above, film lost elsewhere or folded.
    A stroke whose ratio ± 2u straddles a limit is undecided, and the largest part of its uncertainty says
    what to measure.
    Passes: 0.99 ± 0.01. Fails: 0.91 ± 0.01. Undecided: 0.955 ± 0.010.
    """
    low, high = context.sheet.stack.accept
    out: list[Finding] = []
    for stroke in judged_strokes(context):
        if stroke.ratio is None:
            out.append(
                Finding(
                    stroke.number,
                    RULE,
                    "cannot be judged",
                    f"{low:g} to {high:g}",
                    "undecided",
                    "a dwell with the film held before and after the stroke",
                )
            )
            continue
        out.append(
            judge_between(
                RULE, stroke.ratio, low, high, stroke=stroke.number, decide=remedy_for(stroke)
            )
        )
    return out
