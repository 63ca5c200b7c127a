"""Name the features of every run so that the same one is compared with the same one."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from isotherm.quantity import Quantity
from isotherm.result import Branch, Transition

__all__ = ["MatchedFeatures", "match_features"]

# Two transitions further apart than this are different ones. Practice: replicate films on one trough
# agree within about 1 mN/m, and distinct transitions of one film lie several mN/m apart.
_SAME_TRANSITION: Final = 3.0  # mN/m


@dataclass(frozen=True)
class MatchedFeatures:
    """values: one dict a run, feature name -> quantity. odd: one tuple a run, what it lacks or has alone."""

    values: tuple[dict[str, Quantity], ...]
    odd: tuple[tuple[str, ...], ...]


def _plain(branch: Branch) -> dict[str, Quantity]:
    """Features that need no matching, by name."""
    found: dict[str, Quantity] = {}
    if branch.lift_off is not None:
        found["lift_off_area"] = branch.lift_off
    if branch.limiting_area is not None:
        found["limiting_area"] = branch.limiting_area
    if branch.collapse is not None:
        found["collapse_pressure"] = branch.collapse.pressure
        found["collapse_area"] = branch.collapse.area
    found["highest_pressure"] = branch.highest_pressure
    if branch.modulus_max is not None:
        found["modulus_max"] = branch.modulus_max.modulus
        found["modulus_max_pressure"] = branch.modulus_max.pressure
    for at in branch.area_at:
        if at.area is not None:
            found[f"area_at_{at.pressure:g}"] = at.area
        if at.modulus is not None:
            found[f"modulus_at_{at.pressure:g}"] = at.modulus
    return found


def _pressure(transition: Transition) -> float:
    point = transition.at if transition.kind == "kink" else transition.onset
    return float("nan") if point is None else point.pressure.value


def _named(transition: Transition, name: str) -> dict[str, Quantity]:
    found: dict[str, Quantity] = {}
    places = (("", transition.at), ("_onset", transition.onset), ("_end", transition.end))
    for suffix, point in places:
        if point is not None:
            found[f"{name}{suffix}_pressure"] = point.pressure
            found[f"{name}{suffix}_area"] = point.area
    return found


def _pairs(found: Sequence[float], reference: Sequence[float]) -> list[tuple[int, int]]:
    """Match found pressures to reference ones, nearest overall, none further than allowed."""
    from scipy.optimize import linear_sum_assignment

    if not found or not reference:
        return []
    cost = np.abs(np.subtract.outer(np.asarray(found), np.asarray(reference)))
    # a forbidden pair costs more than any sum of allowed ones
    rows, columns = linear_sum_assignment(np.where(cost <= _SAME_TRANSITION, cost, 1e6))
    return [
        (int(i), int(j))
        for i, j in zip(rows, columns, strict=True)
        if cost[i, j] <= _SAME_TRANSITION
    ]


def match_features(branches: Sequence[Branch]) -> MatchedFeatures:
    """Collect the features of each branch, transitions paired by kind and pressure.

    The commonest number of transitions of a kind sets the reference positions (their medians); the
    transitions of every run are then assigned to them.

    Parameters
    ----------
    branches : sequence of Branch
        The branch of each run that is compared.

    Returns
    -------
    MatchedFeatures
        `odd` is filled only for three runs or more, where at least two thirds agree on having a feature.
    """
    values = [_plain(b) for b in branches]
    odd: list[list[str]] = [[] for _ in branches]
    runs = len(branches)
    for kind in ("coexistence", "kink"):
        every = [
            sorted((t for t in b.transitions if t.kind == kind), key=_pressure) for b in branches
        ]
        counts = Counter(len(ts) for ts in every)
        usual = max(counts, key=lambda c: (counts[c], c))
        settled = runs >= 3 and 3 * counts[usual] >= 2 * runs
        typical = [[_pressure(t) for t in ts] for ts in every if len(ts) == usual]
        reference = [float(np.median(column)) for column in zip(*typical, strict=True)]
        for i, transitions in enumerate(every):
            pairs = _pairs([_pressure(t) for t in transitions], reference)
            for found, known in pairs:
                name = kind if usual == 1 else f"{kind}_{known + 1}"
                values[i].update(_named(transitions[found], name))
            if not settled:
                continue
            matched = {found for found, _ in pairs}
            known_ones = {known for _, known in pairs}
            reached = branches[i].highest_pressure.value
            odd[i].extend(
                f"no {kind} near {p:.1f} mN/m, which the others show"
                for j, p in enumerate(reference)
                if j not in known_ones and reached > p + _SAME_TRANSITION
            )
            odd[i].extend(
                f"a {kind} at {_pressure(t):.1f} mN/m, which the others do not show"
                for j, t in enumerate(transitions)
                if j not in matched
            )
    _collapse_odd(branches, odd)
    return MatchedFeatures(tuple(values), tuple(tuple(o) for o in odd))


def _collapse_odd(branches: Sequence[Branch], odd: list[list[str]]) -> None:
    """Note a run that collapses alone, or goes past the others' collapse without one."""
    pressures = [b.collapse.pressure.value for b in branches if b.collapse is not None]
    runs = len(branches)
    if runs < 3:
        return
    if 3 * len(pressures) >= 2 * runs:
        usual = float(np.median(pressures))
        for i, branch in enumerate(branches):
            passed = branch.highest_pressure.value > usual + _SAME_TRANSITION
            if branch.collapse is None and passed:
                odd[i].append(f"no collapse, though it passes {usual:.1f} mN/m where the others do")
    else:
        others = [b.highest_pressure.value for b in branches if b.collapse is None]
        for i, branch in enumerate(branches):
            collapse = branch.collapse
            if collapse is not None and 3 * len(others) >= 2 * runs:
                found = collapse.pressure.value
                if sum(v > found + _SAME_TRANSITION for v in others) == len(others):
                    odd[i].append(
                        f"a collapse at {found:.1f} mN/m, which the others pass without one"
                    )
