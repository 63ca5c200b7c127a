"""The table to take to the trough: film each stroke takes, area at which it ends, when to renew the film."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from isotherm.quantity import COVERAGE_FACTOR, Quantity
from transfer.target_film import FilmAxis
from transfer.target_loss import LossMap
from transfer.target_programme import Move, Timing

__all__ = ["Filling", "PlannedStroke", "fits", "foreseen_area", "plan_strokes", "sure_of"]

# A filling that serves more strokes than this does not run out for any purpose here.
_MOST = 100_000
# Rounding of areas in cm^2: a stroke that ends exactly on the smallest area still fits.
_EXACT = 1e-9


@dataclass(frozen=True)
class PlannedStroke:
    """One stroke of the plan.

    stroke : number from 1. film_removed, area_at_start, area_at_end : cm^2. renew_before : spread fresh film
    before it. starts_s : s of dipping time, renewals not counted; None where speed is not known.
    """

    stroke: int
    direction: str
    film: str
    film_removed: Quantity
    area_at_start: Quantity
    area_at_end: Quantity
    renew_before: bool
    starts_s: float | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "stroke": self.stroke,
            "direction": self.direction,
            "film": self.film or None,
            "film_removed": self.film_removed.to_json(),
            "area_at_start": self.area_at_start.to_json(),
            "area_at_end": self.area_at_end.to_json(),
            "renew_before": self.renew_before,
            "starts_s": self.starts_s,
        }


@dataclass(frozen=True)
class Filling:
    """A fresh film held at the dipping pressure, and how it shrinks.

    area : trough area it starts with, cm^2. smallest : cm^2. film : a depositing stroke takes, cm^2.
    pressure : mN/m. loss : None where no hold tells it. timing : None where the speed is not known.
    """

    area: Quantity
    smallest: Quantity
    film: Quantity
    pressure: float
    loss: LossMap | None = None
    timing: Timing | None = None

    def left(self, time: float) -> tuple[float, float]:
        """Part of the film that its own loss leaves after `time` (s), and its u."""
        if self.loss is None or self.timing is None:
            return 1.0, 0.0
        at = np.array([time])
        return float(self.loss.left(self.pressure, at)[0]), float(
            self.loss.u_left(self.pressure, at)[0]
        )

    def area_after(self, taken: int, lost: float) -> float:
        """Area, cm^2, after `taken` depositing strokes when the film's own loss has taken `lost` cm^2."""
        return self.area.value - taken * self.film.value - lost

    def u_after(self, taken: int, u_left: float) -> float:
        """Its standard uncertainty, cm^2; what a stroke takes is uncertain in the same way for all."""
        parts = (self.area.u or 0.0, taken * (self.film.u or 0.0), self.area.value * u_left)
        return float(np.linalg.norm(parts))


@dataclass(frozen=True)
class _State:
    """Where a filling stands: time since it was spread (s), strokes taken, film lost by itself (cm^2)."""

    time: float = 0.0
    taken: int = 0
    lost: float = 0.0


def _after(filling: Filling, state: _State, move: Move) -> _State:
    """State when a stroke has ended; the film lost meanwhile is that part of the film still there."""
    timing = filling.timing
    end = state.time + (timing.stroke.value if timing is not None else 0.0)
    now = filling.area_after(state.taken, state.lost)
    before, after = filling.left(state.time)[0], filling.left(end)[0]
    lost = now * (1.0 - after / before) if before > 0 else now
    return _State(end, state.taken + int(move.takes), state.lost + lost)


def _waited(filling: Filling, state: _State, move: Move) -> _State:
    """State at the end of the dwell that follows a stroke."""
    timing = filling.timing
    if timing is None:
        return state
    end = state.time + timing.wait(move.direction)
    now = filling.area_after(state.taken, state.lost)
    before, after = filling.left(state.time)[0], filling.left(end)[0]
    lost = now * (1.0 - after / before) if before > 0 else now
    return _State(end, state.taken, state.lost + lost)


def fits(filling: Filling, moves: Sequence[Move], k: float = 0.0) -> int:
    """Depositing strokes that one filling serves before the smallest area, surely for k = 2.

    Parameters
    ----------
    filling : Filling
    moves : sequence of Move
        The pattern of strokes, repeated for as long as the film lasts.
    k : float
        Standard uncertainties to be on the safe side by.
    """
    if filling.film.value <= 0 or not any(move.takes for move in moves):
        return 0
    state = _State()
    for number in range(_MOST):
        move = moves[number % len(moves)]
        ended = _after(filling, state, move)
        u = np.hypot(
            filling.u_after(ended.taken, filling.left(ended.time)[1]), filling.smallest.u or 0.0
        )
        room = filling.area_after(ended.taken, ended.lost) - filling.smallest.value - k * u
        if room < -_EXACT:
            return state.taken
        state = _waited(filling, ended, move)
    return state.taken


def plan_strokes(filling: Filling, moves: Sequence[Move]) -> tuple[PlannedStroke, ...]:
    """Foretell every stroke, with fresh film where the next would pass the smallest area.

    Parameters
    ----------
    filling : Filling
    moves : sequence of Move
        All passages of the stack.

    Returns
    -------
    tuple of PlannedStroke
        Empty when not even a fresh film serves one stroke.
    """
    if fits(filling, moves) < 1:
        return ()
    planned: list[PlannedStroke] = []
    state = _State()
    clock = 0.0
    for number, move in enumerate(moves, start=1):
        ended = _after(filling, state, move)
        fresh = state.time > 0 or state.taken > 0
        room = filling.area_after(ended.taken, ended.lost) - filling.smallest.value
        renew = fresh and room < -_EXACT
        if renew:
            state = _State()
            ended = _after(filling, state, move)
        planned.append(_planned(filling, number, move, state, ended, renew, clock))
        waited = _waited(filling, ended, move)
        clock += waited.time - state.time
        state = waited
    return tuple(planned)


def _planned(
    filling: Filling, number: int, move: Move, start: _State, end: _State, renew: bool, clock: float
) -> PlannedStroke:
    areas = []
    for state in (start, end):
        u = filling.u_after(state.taken, filling.left(state.time)[1])
        areas.append(Quantity(filling.area_after(state.taken, state.lost), u, "cm^2"))
    nothing = Quantity(0.0, 0.0, "cm^2")
    return PlannedStroke(
        stroke=number,
        direction=move.direction,
        film=move.film,
        film_removed=filling.film if move.deposits else nothing,
        area_at_start=areas[0],
        area_at_end=areas[1],
        renew_before=renew,
        starts_s=clock if filling.timing is not None else None,
    )


def sure_of(filling: Filling, moves: Sequence[Move]) -> int:
    """Strokes one filling serves with about 95 % certainty."""
    return fits(filling, moves, COVERAGE_FACTOR)


def foreseen_area(
    film: FilmAxis, pressure: float, relative_u: float, pressure_u: float
) -> Quantity:
    """Trough area, cm^2, of a fresh film of the same recipe at a pressure."""
    at = np.array([pressure])
    return Quantity(
        float(film.trough_area_at(at)[0]),
        float(film.u_trough_area_at(at, relative_u, pressure_u)[0]),
        "cm^2",
    )
