"""How one analysed trace is marked against its truth."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from isotherm_truth import TruePoint, Truth

from isotherm.quantity import Quantity
from isotherm.result import Branch, Point

__all__ = ["COLLAPSE_WITHIN", "Feature", "Marks", "mark_trace"]

COLLAPSE_WITHIN = 4.0  # mN/m, a collapse called farther off counts as not called


@dataclass(frozen=True)
class Feature:
    """One compared number. u is None where none was given."""

    name: str
    truth: float
    found: float
    u: float | None

    @property
    def error(self) -> float:
        """Found minus true, in the feature's unit."""
        return self.found - self.truth

    @property
    def relative(self) -> float:
        """Error relative to the truth, in per cent."""
        return 100.0 * self.error / self.truth

    @property
    def covered(self) -> bool:
        """True where the truth lies inside found ± 2u."""
        return self.u is not None and abs(self.error) <= 2.0 * self.u


@dataclass(frozen=True)
class Marks:
    """The marks of one trace."""

    seed: int
    family: str
    generator: str
    collapse_right: bool
    kind_right: bool | None  # None where there is no collapse on both sides
    transitions_right: bool
    lift_off_missed: bool
    limiting_missed: bool
    area_at_missed: int
    features: tuple[Feature, ...]
    seconds: float
    called: str  # "collapse kind; transitions" as found
    expected: str
    error: str = ""  # the exception, where analysis failed

    @property
    def right(self) -> bool:
        """True where everything was called as it is."""
        return self.collapse_right and self.transitions_right and not self.error


def _feature(name: str, truth: float, found: Quantity) -> Feature:
    return Feature(name, truth, found.value, found.u)


def _point(name: str, truth: TruePoint | None, found: Point | None) -> list[Feature]:
    if truth is None or found is None:
        return []
    return [
        _feature(f"{name} area", truth.area, found.area),
        _feature(f"{name} pressure", truth.pressure, found.pressure),
    ]


def _transitions(truth: Truth, branch: Branch) -> list[Feature]:
    """Match each true transition with the nearest found one of its kind."""
    out: list[Feature] = []
    for true in truth.transitions:
        place = true.onset if true.kind == "coexistence" else true.at
        rivals = []
        for found in branch.transitions:
            at = found.onset if found.kind == "coexistence" else found.at
            if found.kind == true.kind and at is not None and place is not None:
                rivals.append((abs(at.area.value - place.area), found))
        if not rivals:
            continue
        nearest = min(rivals, key=lambda pair: pair[0])[1]
        out += _point("onset", true.onset, nearest.onset)
        out += _point("end", true.end, nearest.end)
        out += _point("kink", true.at, nearest.at)
    return out


def _say(collapse: str | None, transitions: list[str]) -> str:
    return f"{collapse or 'no collapse'}; {' + '.join(transitions) or 'no transition'}"


def mark_trace(seed: int, truth: Truth, branch: Branch, seconds: float) -> Marks:
    """Mark the headline `branch` of one analysis against `truth`."""
    features: list[Feature] = []
    true, found = truth.collapse, branch.collapse
    collapse_right = (true is None) == (found is None)
    kind_right = None
    if true is not None and found is not None:
        collapse_right = abs(found.pressure.value - true.pressure) <= COLLAPSE_WITHIN
        kind_right = found.kind == true.kind
        features += [
            _feature("collapse pressure", true.pressure, found.pressure),
            _feature("collapse area", true.area, found.area),
        ]
    features += _transitions(truth, branch)
    if truth.lift_off is not None and branch.lift_off is not None:
        features.append(_feature("lift-off area", truth.lift_off, branch.lift_off))
    if truth.limiting_area is not None and branch.limiting_area is not None:
        features.append(_feature("limiting area", truth.limiting_area, branch.limiting_area))
    missed = 0
    for pressure, area in truth.area_at.items():
        entry = next((e for e in branch.area_at if np.isclose(e.pressure, pressure)), None)
        if entry is None or entry.area is None:
            missed += 1
        else:
            features.append(_feature(f"area at {pressure:.0f}", area, entry.area))
    expected = [t.kind for t in truth.transitions]
    called = [t.kind for t in branch.transitions]
    return Marks(
        seed=seed,
        family=truth.family,
        generator=truth.generator,
        collapse_right=collapse_right,
        kind_right=kind_right,
        transitions_right=expected == called,
        lift_off_missed=truth.lift_off is not None and branch.lift_off is None,
        limiting_missed=truth.limiting_area is not None and branch.limiting_area is None,
        area_at_missed=missed,
        features=tuple(features),
        seconds=seconds,
        called=_say(found.kind if found else None, called),
        expected=_say(true.kind if true else None, expected),
    )
