"""The chosen pressure in terms of every rule: limits, what binds, the sheet's own pressure, warnings."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from transfer.target_budget import Budget
from transfer.target_choice import Choice, margin_of
from transfer.target_inputs import TargetInputs
from transfer.target_intervals import Interval
from transfer.target_relax import Relaxation
from transfer.target_result import Asked, Limit

__all__ = ["binding_text", "judge_asked", "limit_rows", "packing_error", "warnings_of"]


def packing_error(inputs: TargetInputs, pressure: float) -> Quantity | None:
    """Relative error of the area per molecule, dA/A = dP / M, from the controller's tolerance."""
    tolerance = inputs.tolerance
    modulus = float(inputs.film.modulus_at(np.array([pressure]))[0])
    if tolerance is None or modulus <= 0:
        return None
    u_modulus = float(inputs.film.u_modulus_at(np.array([pressure]))[0])
    value = tolerance.value / modulus
    relative = float(np.hypot(u_modulus / modulus, (tolerance.u or 0.0) / tolerance.value))
    return Quantity(value, value * relative, "1")


def limit_rows(inputs: TargetInputs, choice: Choice) -> tuple[Limit, ...]:
    """One row a rule: what it allows, and how far the recommendation is from its end."""
    rows = []
    for rule, intervals in zip(choice.rules.applied, choice.allowed, strict=True):
        margin = None
        if choice.recommended is not None:
            found = margin_of(inputs, rule, intervals, choice.recommended)
            margin = None if found is None else Quantity(found.value, found.u, "mN/m")
        normalised = None
        if margin is not None and inputs.set_u > 0:
            normalised = margin.value / inputs.set_u
        rows.append(
            Limit(
                rule=rule.name,
                label=rule.label,
                reason=rule.reason,
                intervals=intervals,
                allowed=_around(intervals, choice.recommended),
                margin=margin,
                normalised=normalised,
                at=rule.at,
                binding=rule in choice.binding,
            )
        )
    return tuple(rows)


def _around(intervals: Sequence[Interval], pressure: float | None) -> Interval | None:
    """The stretch that holds the pressure, else the widest."""
    if pressure is not None:
        for interval in intervals:
            if interval.holds(pressure):
                return interval
    return max(intervals, key=lambda i: i.high - i.low, default=None)


def binding_text(choice: Choice, ways: Sequence[Relaxation]) -> str:
    """Name the rules that end the window, or those that shut it."""
    if choice.window is not None:
        low, high = choice.window.low.rule, choice.window.high.rule
        ends = []
        if low >= 0:
            ends.append(f"below: {choice.rules.applied[low].label}")
        if high >= 0:
            ends.append(f"above: {choice.rules.applied[high].label}")
        return "; ".join(ends)
    shut = [
        rule.label
        for rule, intervals in zip(choice.rules.applied, choice.allowed, strict=True)
        if not intervals
    ]
    if shut:
        return f"{' and '.join(shut)}: allows no pressure of this film"
    if ways:
        labels = [change.label for change in ways[0].changes]
        return (
            f"no pressure obeys all limits; {' and '.join(labels)} is nearest to opening a window"
        )
    return "no pressure obeys all limits"


def judge_asked(
    inputs: TargetInputs, choice: Choice, sheet: RunSheet, foreseen: Budget | None
) -> Asked | None:
    """The dipping pressure the sheet names, against the limits; None where it names none."""
    asked = sheet.dipping.pressure
    if asked is None:
        return None
    breaks = tuple(
        rule.label
        for rule, intervals in zip(choice.rules.applied, choice.allowed, strict=True)
        if not any(interval.holds(asked.value) for interval in intervals)
    )
    known = inputs.film.lowest <= asked.value <= inputs.film.highest
    return Asked(
        pressure=asked.value,
        admissible=not breaks,
        breaks=breaks,
        packing_error=packing_error(inputs, asked.value) if known else None,
        budget=foreseen if known else None,
    )


def warnings_of(
    result: IsothermResult,
    sheet: RunSheet,
    inputs: TargetInputs,
    choice: Choice,
    *,
    foreseen: Budget | None,
) -> tuple[str, ...]:
    """What was assumed, and what the answer would need to say more."""
    notes = [*result.warnings, *result.headline.warnings]
    if inputs.collapse is None:
        notes.append(
            f"collapse not reached: the highest pressure, {inputs.highest.value:.1f} mN/m, is a lower bound "
            "of it and stands in for it; the film may bear more"
        )
    if inputs.tolerance is None:
        notes.append(
            "dipping.tolerance not given: no packing error, and guards hold only the isotherm's own u"
        )
    if inputs.overshoot is None:
        notes.append("dipping.overshoot not given: none is kept from collapse and transitions")
    if sheet.target.loss is not None and inputs.loss is None:
        notes.append(f"target.loss cannot be judged: {inputs.no_loss}")
    if sheet.target.packing_error is not None and inputs.tolerance is None:
        notes.append("target.packing_error cannot be judged without dipping.tolerance")
    notes += _loss_notes(inputs, choice)
    if foreseen is not None:
        notes += foreseen.notes
    elif choice.recommended is not None:
        missing = _missing(sheet, inputs)
        notes.append(f"no film budget: {missing}")
    return tuple(dict.fromkeys(notes))


def _loss_notes(inputs: TargetInputs, choice: Choice) -> list[str]:
    loss, at = inputs.loss, choice.recommended
    if loss is None:
        return []
    notes = list(loss.notes)
    if at is not None and at < loss.pressure[0]:
        notes.append(
            f"film loss at {at:.1f} mN/m is taken to be no more than at {loss.pressure[0]:.1f} mN/m, the "
            "lowest pressure held"
        )
    if at is not None and at > loss.pressure[-1]:
        notes.append(
            f"film loss is not known at {at:.1f} mN/m: the highest pressure held is "
            f"{loss.pressure[-1]:.1f} mN/m; the plan takes that hold's"
        )
    return notes


def _missing(sheet: RunSheet, inputs: TargetInputs) -> str:
    lacks = []
    if inputs.film.molecules is None:
        lacks.append("the amount spread ([film] concentration, volume, molar_mass) or trough area")
    if sheet.trough.smallest_area is None:
        lacks.append("trough.smallest_area")
    if sheet.substrate is None:
        lacks.append("[substrate]")
    elif sheet.dipping.stroke_length is None and sheet.substrate.height is None:
        lacks.append("dipping.stroke_length")
    return f"the sheet lacks {', '.join(lacks)}" if lacks else "the sheet lacks what it needs"
