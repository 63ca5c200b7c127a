"""Rule `renewals`: the film was made anew no more often than allowed, and nothing happened meanwhile."""

from __future__ import annotations

from transfer.audit_finding import AuditContext, Finding, judge_count

__all__ = ["RULE", "check"]

RULE = "renewals"


def check(context: AuditContext) -> list[Finding]:
    """Count renewals against `stack.renewals`; name crossings outside a held film.

    Default: any number of renewals where the sheet gives none; a crossing outside a held film is undecided.
    Reason: every renewal is another film, with its own impurities and relaxation. Substrate that crosses a
    surface without a held film may pick up or lose anything.
    Passes: 1 renewal, at most 2 allowed. Fails: 3 renewals, at most 2 allowed.
    """
    out: list[Finding] = []
    count, most = len(context.result.renewals), context.sheet.stack.renewals
    if most is not None:
        out.append(judge_count(RULE, count, f"at most {most}", count <= most))
    for crossing in context.result.unjudged:
        out.append(
            Finding(
                None,
                "crossing outside a held film",
                f"{crossing.from_s:.0f}-{crossing.to_s:.0f} s, {crossing.why}",
                "none",
                "undecided",
                "evidence from the substrate itself (--evidence)",
            )
        )
    return out
