"""Rule `dipping speed`: the dipper went as fast as designed."""

from __future__ import annotations

from isotherm.quantity import Quantity
from transfer.audit_finding import AuditContext, Finding, judge_between

__all__ = ["DEFAULT_PART", "RULE", "check"]

RULE = "dipping speed"
# Part of the speed allowed either way where the sheet gives no tolerance (practice).
DEFAULT_PART = 0.1


def check(context: AuditContext) -> list[Finding]:
    """Hold each stroke's speed (pauses left out) within `dipping.speed_tolerance` of `dipping.speed`.

    Default: 10 % either way; nothing without `dipping.speed`.
    Reason: above a film's drainage speed water is carried up and the layer does not hold.
    Passes: 0.102 for 0.1 mm/s. Fails: 0.15 for 0.1 mm/s.
    """
    speed = context.sheet.dipping.speed
    if speed is None:
        return []
    given = context.sheet.dipping.speed_tolerance
    tolerance = given.value if given is not None else DEFAULT_PART * speed.value
    return [
        judge_between(
            RULE,
            Quantity(stroke.speed_mm_per_s, 0.002 * stroke.speed_mm_per_s, "mm/s"),
            speed.value - tolerance,
            speed.value + tolerance,
            stroke=stroke.number,
            unit="mm/s",
            decide="a finer record of position against time",
            digits=".4g",
        )
        for stroke in context.result.strokes
        if stroke.speed_mm_per_s == stroke.speed_mm_per_s
    ]
