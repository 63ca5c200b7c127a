"""Rule `pressure held`: the film was at its pressure while each stroke went through it."""

from __future__ import annotations

from isotherm.quantity import Quantity
from transfer.audit_finding import AuditContext, Finding, judge_between

__all__ = ["DEFAULT_TOLERANCE", "RULE", "check"]

RULE = "pressure held"
# mN/m; what barrier controllers in order keep to (practice).
DEFAULT_TOLERANCE = 0.5


def check(context: AuditContext) -> list[Finding]:
    """Hold each stroke's mean pressure within `dipping.tolerance` of `dipping.pressure`.

    Default: 0.5 mN/m where the sheet gives no tolerance (practice); nothing without a pressure.
    Reason: the packing laid down is the packing at that pressure. The probe's zero
    (`trough.pressure_uncertainty`) is common to all strokes and widens every one of them.
    Passes: 29.9 for 30 ± 0.2 mN/m. Fails: 28.9 for 30 ± 0.2. Undecided: 29.85 with a probe good to 0.1.
    """
    dipping = context.sheet.dipping
    if dipping.pressure is None:
        return []
    tolerance = dipping.tolerance.value if dipping.tolerance is not None else DEFAULT_TOLERANCE
    low, high = dipping.pressure.value - tolerance, dipping.pressure.value + tolerance
    probe = context.sheet.trough.pressure_uncertainty
    u = probe.value if probe is not None else 0.0
    decide = "the probe's zero and calibration on a clean surface (upstroke check)"
    return [
        judge_between(
            RULE,
            Quantity(stroke.pressure_mean, u, "mN/m"),
            low,
            high,
            stroke=stroke.number,
            decide=decide,
            unit="mN/m",
            digits=".4g",
        )
        for stroke in context.result.strokes
    ]
