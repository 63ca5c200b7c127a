"""Stretches of the pressure axis: where a rule allows, and where all rules do."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Edge", "Interval", "Window", "common", "where_allowed"]

FloatArray = NDArray[np.float64]

_STEPS = 2000  # of the search for changes of sign; a pressure axis of 70 mN/m is then cut every 0.035 mN/m
_HALVINGS = 32  # 0.035 mN/m over 2^32: far below any rounding that matters


@dataclass(frozen=True)
class Interval:
    """A stretch that one rule allows, mN/m."""

    low: float
    high: float

    def holds(self, pressure: float) -> bool:
        """Whether a pressure lies in it, ends included."""
        return self.low <= pressure <= self.high


@dataclass(frozen=True)
class Edge:
    """An end of a window: where, and which rule (by its place in the list of rules) put it there."""

    pressure: float
    rule: int


@dataclass(frozen=True)
class Window:
    """A stretch that every rule allows, with the rules that end it."""

    low: Edge
    high: Edge

    @property
    def width(self) -> float:
        """mN/m."""
        return self.high.pressure - self.low.pressure


def where_allowed(
    slack: Callable[[FloatArray], FloatArray], low: float, high: float
) -> tuple[Interval, ...]:
    """Stretches of [low, high] where `slack` is not negative; NaN counts as negative.

    Parameters
    ----------
    slack : function of (n,) pressures, mN/m, to (n,)
        Positive where the rule allows.
    low, high : float
        mN/m.

    Returns
    -------
    tuple of Interval
        In order. Ends are found by halving, all at once.
    """
    if not high > low:
        return ()
    grid = np.linspace(low, high, _STEPS + 1)
    inside = slack(grid) >= 0.0  # NaN compares false
    turn = np.flatnonzero(inside[1:] != inside[:-1])
    left, right, starts = grid[turn], grid[turn + 1], inside[turn + 1]
    for _ in range(_HALVINGS if turn.size else 0):
        middle = 0.5 * (left + right)
        beyond = (slack(middle) >= 0.0) == starts
        right = np.where(beyond, middle, right)
        left = np.where(beyond, left, middle)
    # the allowed side of each change, so that every end keeps its rule
    edges = np.where(starts, right, left)
    lows = [*([low] if inside[0] else []), *edges[starts]]
    highs = [*edges[~starts], *([high] if inside[-1] else [])]
    return tuple(Interval(float(a), float(b)) for a, b in zip(lows, highs, strict=True))


def common(allowed: Sequence[Sequence[Interval]], low: float, high: float) -> tuple[Window, ...]:
    """Stretches of [low, high] that lie in every rule's allowed stretches, in order.

    Each end is marked with the first rule that put it there; -1 stands for the ends of an axis no rule ends.
    """
    windows = [Window(Edge(low, -1), Edge(high, -1))]
    for rule, intervals in enumerate(allowed):
        kept = []
        for window in windows:
            for interval in intervals:
                start, stop = window.low, window.high
                if interval.low > start.pressure or (start.rule < 0 and interval.low == low):
                    start = Edge(interval.low, rule)
                if interval.high < stop.pressure or (stop.rule < 0 and interval.high == high):
                    stop = Edge(interval.high, rule)
                if stop.pressure >= start.pressure:
                    kept.append(Window(start, stop))
        windows = kept
    return tuple(windows)
