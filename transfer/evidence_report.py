"""Wording and numbers of each kind's result, and the joint statement in a sentence."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from transfer.evidence_implied import (
    LEDGER,
    expected_quantity,
    implied_input,
    layers_quantity,
)
from transfer.evidence_joint import Joint, Member, pair_probability
from transfer.evidence_ledger import LedgerView
from transfer.evidence_line import KindLine, scatter_inflation
from transfer.evidence_result import BendResult, JointResult, KindResult

__all__ = ["kind_result", "statement_of"]

FloatArray = NDArray[np.float64]


def kind_result(
    line: KindLine,
    member: Member | None,
    anchor: Member,
    inputs: Mapping[str, Quantity],
    ledger: LedgerView,
    joint: Joint,
    named: Sequence[str],
    level: float,
) -> KindResult:
    """Put together what one kind says.

    `level` is the probability below which a bend or a scatter is not put down to chance.
    """
    reading = line.reading
    bend = _bend(line, ledger, level / 2.0)
    layers = ratio = None
    p_value = None
    if member is not None and line.ratio is not None:
        if member.counts:
            layers = layers_quantity(member, inputs, ledger)
            p_value = pair_probability(member, anchor, inputs, ledger.covariance, anchor.value)
        else:
            p_value = _spacing_probability(line, reading.inputs)
        ratio = _ratio(line, member, inputs, ledger)
    reason = _reason(line, bend, p_value, joint, named, level)
    fit = line.line
    drawn = expected = None
    increment = intercept = None
    if fit is not None:
        grow = math.sqrt(min(scatter_inflation(fit), 1e6))
        increment = Quantity(fit.slope, fit.u_slope * grow, reading.unit)
        if fit.free_intercept:
            intercept = Quantity(
                fit.intercept, math.sqrt(float(fit.covariance[0, 0])) * grow, reading.unit
            )
        shown = line.bend.fit if bend is not None and line.bend is not None else fit
        ends = {0.0, float(np.max(line.x))} | ({bend.layers} if bend is not None else set())
        at = np.array(sorted(ends))
        drawn = np.column_stack([at, shown.line(at)])
        if line.ratio is not None and line.expected_increment is not None:
            expected = np.column_stack([at, shown.intercept + line.expected_increment * at])
    scale = 1.0 if fit is None or fit.noise_scale is None else fit.noise_scale
    return KindResult(
        kind=reading.kind,
        label=reading.label,
        symbol=reading.symbol,
        unit=reading.unit,
        x=line.x,
        u_x=line.u_x,
        y=reading.y,
        u=reading.u * scale,
        intercept=intercept,
        increment=increment,
        expected_increment=expected_quantity(reading, line),
        chi_square=None if fit is None or fit.noise_scale is not None else fit.chi_square,
        dof=len(reading.y) - 1 if fit is None else fit.dof,
        lack_of_fit=line.lack_of_fit,
        bend=bend,
        layers=layers,
        ratio=ratio,
        p_value=p_value,
        consistent=reason == "",
        reason=reason,
        implied={} if bend is not None else implied_input(reading, line, ledger),
        details=reading.details,
        drawn=drawn,
        expected=expected,
    )


def _bend(line: KindLine, ledger: LedgerView, below: float) -> BendResult | None:
    found = line.bend
    if found is None or not line.bends(below):
        return None
    fit = found.fit
    first = fit.slope_index
    u_after = math.sqrt(
        float(np.array([1.0, 1.0]) @ fit.covariance[first:, first:] @ np.array([1.0, 1.0]))
    )
    unit = line.reading.unit
    return BendResult(
        after_stroke=int(ledger.strokes[found.index - 1]),
        layers=float(fit.hinge or 0.0),
        strokes=(
            int(ledger.strokes[found.index_range[0] - 1]),
            int(ledger.strokes[found.index_range[1] - 1]),
        ),
        increment_before=Quantity(fit.slope, fit.u_slope, unit),
        increment_after=Quantity(fit.slope + float(fit.parameters[first + 1]), u_after, unit),
        p_value=found.p_value,
    )


def _ratio(
    line: KindLine, member: Member, inputs: Mapping[str, Quantity], ledger: LedgerView
) -> Quantity:
    ratio = line.ratio or 0.0
    row = member.ledger_row - member.counts / ledger.total.value
    relative = float(row @ ledger.covariance @ row) + sum(
        (p * (inputs[n].u or 0.0) / inputs[n].value) ** 2 for n, p in member.powers.items()
    )
    return Quantity(ratio, math.hypot(line.u_ratio_values, ratio * math.sqrt(relative)), "1")


def _spacing_probability(line: KindLine, inputs: Mapping[str, Quantity]) -> float:
    relative = sum(
        (p * (inputs[n].u or 0.0) / inputs[n].value) ** 2 for n, p in line.powers.items()
    )
    u = math.hypot(line.u_ratio_values, math.sqrt(relative))
    return math.erfc(abs((line.ratio or 1.0) - 1.0) / max(u, 1e-300) / math.sqrt(2.0))


def _reason(
    line: KindLine,
    bend: BendResult | None,
    p_value: float | None,
    joint: Joint,
    named: Sequence[str],
    level: float,
) -> str:
    """Why a kind does not agree; "" when it does."""
    label = line.reading.label
    if bend is not None:
        return f"its line bends after stroke {bend.after_stroke}"
    if line.lack_of_fit is not None and 2.0 * line.lack_of_fit < level:
        return _scatter(line)
    if label in named:
        return (
            "it implies another number of layers than the rest"
            if line.counts_layers
            else ("it contradicts the layer thickness the rest lean on")
        )
    if label in joint.undecided and not joint.disagrees:
        return "it and the transfer ratios differ, and nothing else tells which is right"
    if not joint.agree and p_value is not None and p_value < level:
        return "it implies another number of layers than the transfer ratios"
    return ""


def _scatter(line: KindLine) -> str:
    """Whether one point or all of them spoil the fit."""
    fit = line.line
    if fit is None:
        return "its values scatter more than their u allows"
    from scipy.special import gammaincc

    if fit.dof > 1:
        rest = float(
            gammaincc((fit.dof - 1) / 2.0, max(fit.chi_square - line.worst_fall, 0.0) / 2.0)
        )
        if rest > 0.05:
            return f"the value at {line.x[line.worst]:.3g} layers lies off its line"
    return "its values scatter about the line more than their u allows"


def statement_of(joint: JointResult, kinds: Sequence[KindResult], bent_together: bool) -> str:
    """The joint statement in one or two sentences."""
    counted = [k for k in kinds if k.layers is not None]
    if not counted:
        return (
            "No kind of evidence implies a number of layers; see what is missing in the warnings."
        )
    if bent_together:
        where = next(k.bend for k in kinds if k.bend is not None)
        head = (
            f"Most kinds bend after about {where.layers:.3g} layers: the transfer ratios count film that is"
            " not on the substrate."
        )
    elif joint.agree:
        head = "All kinds agree with the transfer ratios."
    elif joint.disagrees:
        also = [n for n in joint.undecided if n not in joint.disagrees]
        doubt = f" ({', '.join(also)} cannot be ruled out instead)" if also else ""
        why = {k.label: f" ({k.reason})" for k in kinds if k.bend is not None and k.reason}
        which = ", ".join(f"{name}{why.get(name, '')}" for name in joint.disagrees)
        head = f"Disagrees with the rest: {which}{doubt}."
    else:
        head = f"{' and '.join(joint.undecided)} disagree, and nothing else tells which is right."
    if joint.layers is None:
        return head
    who = " without the transfer ratios" if LEDGER in joint.disagrees else ""
    return f"{head} Best estimate{who}: {joint.layers} layers."
