"""When no pressure is admissible: the smallest relaxation that would open a window."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import COVERAGE_FACTOR
from transfer.target_choice import Choice, deepest
from transfer.target_inputs import TargetInputs
from transfer.target_intervals import common
from transfer.target_limits import Rule

__all__ = ["Change", "Relaxation", "relaxations"]

FloatArray = NDArray[np.float64]

_STEPS = 2000
# The record and the lift-off are facts, not wishes; guards can be given up, but collapsed or mixed film is
# not dipped in.
_FIXED = ("record", "lift-off")
_GUARDS = ("collapse margin", "coexistence")


@dataclass(frozen=True)
class Change:
    """One rule relaxed: `by` in the rule's own unit, None where it can only be dropped."""

    rule: str
    label: str
    by: float | None
    of: float
    unit: str

    @property
    def relative(self) -> float:
        """As a part of what the rule asks."""
        return np.inf if self.by is None else self.by / max(self.of, 1e-12)

    @property
    def text(self) -> str:
        """In words."""
        if self.by is None:
            return f"drop “{self.label}”"
        if self.unit == "1":
            return f"{self.label}: allow {_up(100 * (self.of + self.by))} % instead of {100 * self.of:.3g} %"
        if self.unit == "cm^2":
            return f"{self.label}: {_up(self.by)} cm² more film (spread more, or strokes that take less)"
        if self.rule == "single phase":
            return f"{self.label}: take a film {_up(self.by)} mN/m softer"
        if self.rule == "phase wanted":
            return f"{self.label}: dip {_up(self.by)} mN/m outside it"
        return f"{self.label}: give up {_up(self.by)} of the {self.of:.3g} mN/m it keeps"


@dataclass(frozen=True)
class Relaxation:
    """Changes that together open a window, and the pressure that then opens first, mN/m."""

    changes: tuple[Change, ...]
    pressure: float

    @property
    def relative(self) -> float:
        """The largest change, as a part of what its rule asks."""
        return max(change.relative for change in self.changes)

    @property
    def text(self) -> str:
        """In words."""
        return f"{' and '.join(c.text for c in self.changes)}; opens at {self.pressure:.1f} mN/m"


def relaxations(inputs: TargetInputs, choice: Choice) -> tuple[Relaxation, ...]:
    """Ways to open a window, the smallest first.

    Each rule is tried alone, all others kept. Where no single rule does it, the pressure is sought at which
    fewest rules are broken, and of those the one whose largest relative shortfall is smallest; the rules
    broken there go together.

    Parameters
    ----------
    inputs : TargetInputs
    choice : Choice

    Returns
    -------
    tuple of Relaxation
        Empty when a window is open, or when none would open short of dipping in collapsed or mixed film.
    """
    if choice.windows:
        return ()
    ends = [end for each in choice.allowed for i in each for end in (i.low, i.high)]
    grid = np.unique(
        np.clip(
            np.concatenate([np.linspace(inputs.film.lowest, inputs.film.highest, _STEPS), ends]),
            inputs.film.lowest,
            inputs.film.highest,
        )
    )
    rules = choice.rules.applied
    slack = np.array([rule.slack(grid, COVERAGE_FACTOR) for rule in rules])
    # an end found by halving may sit a rounding error outside
    short = np.where(np.isfinite(slack), np.maximum(-slack, 0.0), np.inf)
    short[short < 1e-9] = 0.0
    sane = np.ones(grid.size, dtype=np.bool_)
    for j, rule in enumerate(rules):
        if rule.name in _FIXED:
            sane &= short[j] == 0.0
        elif rule.name in _GUARDS:
            sane &= (short[j] == 0.0) | (short[j] < rule.demand)
    if not sane.any():
        return ()
    short, grid = short[:, sane], grid[sane]
    single = []
    for j, rule in enumerate(rules):
        others = (np.delete(short, j, axis=0) == 0.0).all(axis=0)
        if not others.any():
            continue
        at = np.flatnonzero(others)[int(np.argmin(short[j, others]))]
        change, pressure = _change(rule, float(short[j, at])), float(grid[at])
        if change.by is None:
            pressure = _without(choice, j, inputs, pressure)
        single.append(Relaxation((change,), pressure))
    if single:
        return tuple(sorted(single, key=lambda r: r.relative))
    return _together(rules, short, grid)


def _without(choice: Choice, rule: int, inputs: TargetInputs, pressure: float) -> float:
    """The pressure the remaining rules would recommend."""
    allowed = [a for j, a in enumerate(choice.allowed) if j != rule]
    best = deepest(common(allowed, inputs.film.lowest, inputs.film.highest))
    return pressure if best is None else best.pressure


def _together(
    rules: tuple[Rule, ...], short: FloatArray, grid: FloatArray
) -> tuple[Relaxation, ...]:
    demand = np.array([max(rule.demand, 1e-12) for rule in rules])
    possible = np.ones(grid.size, dtype=np.bool_)
    relative = short / demand[:, None]
    # rules that can only be dropped do not say where to dip
    finite = np.where(np.isfinite(relative), relative, 0.0)
    dropped = np.isinf(relative).sum(axis=0)
    possible &= dropped == dropped[possible].min()
    broken = (short > 0).sum(axis=0)
    possible &= broken == broken[possible].min()
    worst = np.where(possible, finite.max(axis=0), np.inf)
    at = int(np.argmin(worst))
    changes = tuple(
        _change(rule, float(short[j, at])) for j, rule in enumerate(rules) if short[j, at] > 0
    )
    return (Relaxation(changes, float(grid[at])),)


def _change(rule: Rule, by: float) -> Change:
    return Change(rule.name, rule.label, by if np.isfinite(by) else None, rule.demand, rule.unit)


def _up(value: float) -> str:
    """Two figures, rounded up: a relaxation as printed is enough."""
    if value <= 0:
        return "0"
    step = 10.0 ** (np.floor(np.log10(value)) - 1)
    return f"{np.ceil(value / step - 1e-9) * step:.3g}"
