"""The recommended pressure: the one deepest inside all limits."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from isotherm.quantity import COVERAGE_FACTOR
from transfer.target_inputs import TargetInputs
from transfer.target_intervals import Interval, Window, common, where_allowed
from transfer.target_limits import Rule, Rules, rules_of

__all__ = ["Choice", "Deepest", "Margin", "choose", "deepest", "margin_of"]


@dataclass(frozen=True)
class Choice:
    """What the rules leave.

    allowed : stretches each applied rule allows. windows : stretches all allow. recommended : mN/m, or None.
    window : the one the recommendation lies in. margin : mN/m from it to the nearest danger.
    """

    rules: Rules
    allowed: tuple[tuple[Interval, ...], ...]
    windows: tuple[Window, ...]
    recommended: float | None
    window: Window | None
    margin: float | None

    @property
    def binding(self) -> tuple[Rule, ...]:
        """Rules that end the window, the one below first."""
        if self.window is None:
            return ()
        ends = (self.window.low, self.window.high)
        return tuple(self.rules.applied[edge.rule] for edge in ends if edge.rule >= 0)


@dataclass(frozen=True)
class Deepest:
    """The pressure of a window farthest from any danger, and how far, mN/m."""

    pressure: float
    margin: float
    window: Window


@dataclass(frozen=True)
class Margin:
    """Distance from a pressure to the nearest end of what one rule allows, mN/m, and its u."""

    value: float
    u: float | None


def choose(inputs: TargetInputs) -> Choice:
    """Find the pressures that obey every rule, and the one farthest from breaking any.

    Every rule ends at pressures that already hold its uncertainty, so that margins of all rules are
    distances on one axis, and within a window the smallest margin is largest in the middle. The end of what
    is known (no hold at a higher pressure) counts as a limit: what has not been seen is no safer. Of several
    windows the one with the largest such margin counts.

    Parameters
    ----------
    inputs : TargetInputs

    Returns
    -------
    Choice
    """
    rules = rules_of(inputs)
    low, high = inputs.film.lowest, inputs.film.highest
    allowed = tuple(_allowed(rule, low, high) for rule in rules.applied)
    windows = common(allowed, low, high)
    best = deepest(windows)
    if best is None:
        return Choice(rules, allowed, windows, None, None, None)
    return Choice(rules, allowed, windows, best.pressure, best.window, best.margin)


def deepest(windows: Sequence[Window]) -> Deepest | None:
    """The pressure with the largest smallest margin in any of the windows; None where there is none."""
    found = [_deepest(window) for window in windows]
    return max(found, key=lambda item: item.margin, default=None)


def margin_of(
    inputs: TargetInputs, rule: Rule, allowed: Sequence[Interval], pressure: float
) -> Margin | None:
    """How far a rule lets the pressure err, mN/m; None where it ends nowhere on this film.

    Negative where the rule excludes the pressure. u is that of the end: the slack's u over its slope.
    """
    record = (inputs.film.lowest, inputs.film.highest)
    inside = [interval for interval in allowed if interval.holds(pressure)]
    ends = [end for interval in inside or allowed for end in (interval.low, interval.high)]
    if rule.name != "record":  # where the record ends, the rule does not
        ends = [end for end in ends if end not in record]
    if not ends:
        return None
    nearest = min(ends, key=lambda end: abs(end - pressure))
    away = abs(nearest - pressure)
    return Margin(away if inside else -away, _end_u(rule, nearest))


def _end_u(rule: Rule, end: float) -> float | None:
    step = 1e-3  # mN/m
    at = np.array([end - step, end, end + step])
    nominal, surest = rule.slack(at, 0.0), rule.slack(at, COVERAGE_FACTOR)
    slopes = np.abs(np.diff(surest)) / step
    slope = float(np.nanmax(slopes)) if np.isfinite(slopes).any() else 0.0
    u = abs(float(nominal[1] - surest[1])) / COVERAGE_FACTOR
    return u / slope if slope > 0 and np.isfinite(u) else None


def _allowed(rule: Rule, low: float, high: float) -> tuple[Interval, ...]:
    return where_allowed(lambda pressure: rule.slack(pressure, COVERAGE_FACTOR), low, high)


def _deepest(window: Window) -> Deepest:
    low, high = window.low.pressure, window.high.pressure
    return Deepest(0.5 * (low + high), 0.5 * window.width, window)
