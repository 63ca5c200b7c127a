"""Rule `mean ratio`: the build as a whole takes what it coats."""

from __future__ import annotations

import numpy as np

from isotherm.quantity import Quantity
from transfer.audit_finding import AuditContext, Finding, judge_between
from transfer.audit_remedy import remedy_for
from transfer.rule_ratio import judged_strokes

__all__ = ["RULE", "check"]

RULE = "mean ratio"


def check(context: AuditContext) -> list[Finding]:
    """Hold the mean ratio of the strokes that should take film against `stack.accept_mean`.

    Default: `stack.accept`, itself 0.95 to 1.05 by common practice.
    Reason: single strokes may scatter where the mean, which sets thickness and mass, must not. Its u keeps
    what the strokes share (dimensions, contact, modulus) and averages only the rest.
    Passes: mean 0.985 ± 0.004. Fails: 0.93 ± 0.01. Undecided: 0.952 ± 0.006.
    """
    strokes = [s for s in judged_strokes(context) if s.ratio is not None]
    if not strokes:
        return []
    low, high = context.sheet.stack.accept_mean or context.sheet.stack.accept
    index = np.asarray([s.number - 1 for s in strokes])
    share = np.full(index.size, 1.0 / index.size)
    covariance = context.result.ratio_covariance[np.ix_(index, index)]
    value = float(np.mean([s.ratio.value for s in strokes if s.ratio is not None]))
    u = float(np.sqrt(max(float(share @ covariance @ share), 0.0)))
    widest = max(strokes, key=lambda s: (s.ratio.u or 0.0) if s.ratio else 0.0)
    return [judge_between(RULE, Quantity(value, u, "1"), low, high, decide=remedy_for(widest))]
