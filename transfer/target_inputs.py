"""All that the choice of a dipping pressure depends on, gathered once so that it can be varied."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from isotherm.quantity import Quantity
from isotherm.result import Branch, IsothermResult, Phase, Transition
from isotherm.sheet import RunSheet, Target
from transfer.target_film import FilmAxis, film_axis
from transfer.target_loss import LossMap

__all__ = ["Band", "Supply", "TargetInputs", "gather_inputs", "moved"]


@dataclass(frozen=True)
class Band:
    """A coexistence or a kink on the pressure axis, mN/m.

    kind : "coexistence" | "kink". onset, end : equal for a kink; end None where the record stops inside.
    """

    kind: str
    onset: Quantity
    end: Quantity | None

    @property
    def name(self) -> str:
        """How it is called in words."""
        if self.kind == "kink":
            return f"kink at {self.onset.value:.1f} mN/m"
        if self.end is None:
            return f"coexistence from {self.onset.value:.1f} mN/m"
        return f"coexistence at {self.onset.value:.1f} to {self.end.value:.1f} mN/m"


@dataclass(frozen=True)
class Supply:
    """Film that the strokes take and the trough can give.

    smallest_area : cm^2. stroke : film one depositing stroke removes, cm^2.
    strokes : depositing strokes one filling has to serve. area_relative_u : of a trough area foretold for a
    fresh film of the same recipe.
    """

    smallest_area: Quantity
    stroke: Quantity
    strokes: int
    area_relative_u: float


@dataclass(frozen=True)
class TargetInputs:
    """What the limits are computed from. Pressures mN/m.

    collapse : None where it was not reached (`highest` then stands in as a lower bound).
    drift_u : what the pressure probe may drift while dipping.
    loss : None where unknown, `no_loss` then says why.
    """

    film: FilmAxis
    highest: Quantity
    collapse: Quantity | None
    lift_off: Quantity | None
    bands: tuple[Band, ...]
    phases: tuple[Phase, ...]
    wanted: Target
    tolerance: Quantity | None
    overshoot: Quantity | None
    drift_u: float
    loss: LossMap | None
    supply: Supply | None
    no_loss: str = ""

    @property
    def end(self) -> Quantity:
        """Collapse pressure, or the highest pressure reached: the film is not known beyond it."""
        if self.collapse is None:
            return self.highest
        # The tangent construction may lie above anything the film ever showed.
        value = min(self.collapse.value, self.highest.value)
        return replace(self.collapse, value=value)

    @property
    def control_u(self) -> float:
        """Standard uncertainty of the pressure held while dipping: controller and drift, mN/m."""
        return float(np.hypot(self.tolerance.value if self.tolerance else 0.0, self.drift_u))

    @property
    def set_u(self) -> float:
        """The same with zero and scale of the probe, mN/m: the unit margins are counted in."""
        return float(np.hypot(self.control_u, self.film.pressure_u))

    def guard(self, feature: Quantity, *, above: bool, k: float) -> float:
        """Distance to keep from a feature, mN/m: k times u of feature and controller together.

        above : the feature lies above the pressure held, where the controller's overshoot counts too.
        """
        beyond = self.overshoot if above else None
        parts = (feature.u or 0.0, self.control_u, (beyond.u or 0.0) if beyond else 0.0)
        return k * float(np.linalg.norm(parts)) + (beyond.value if beyond else 0.0)


def gather_inputs(
    result: IsothermResult,
    sheet: RunSheet,
    *,
    film: FilmAxis | None = None,
    loss: LossMap | None = None,
    supply: Supply | None = None,
    drift_u: float = 0.0,
    no_loss: str = "no hold is given",
) -> TargetInputs:
    """Collect what the isotherm and the sheet say."""
    branch = result.headline
    axis = film if film is not None else film_axis(result)
    return TargetInputs(
        film=axis,
        highest=branch.highest_pressure,
        collapse=branch.collapse.pressure if branch.collapse is not None else None,
        lift_off=_lift_off(branch, axis),
        bands=tuple(band for t in branch.transitions if (band := _band(t)) is not None),
        phases=branch.phases,
        wanted=sheet.target,
        tolerance=sheet.dipping.tolerance,
        overshoot=sheet.dipping.overshoot,
        drift_u=drift_u,
        loss=loss,
        supply=supply,
        no_loss=no_loss,
    )


def moved(quantity: Quantity, by: float) -> Quantity:
    """The same quantity with its value moved."""
    return replace(quantity, value=quantity.value + by)


def _lift_off(branch: Branch, axis: FilmAxis) -> Quantity | None:
    """Pressure at the lift-off area, with the uncertainty of the zero."""
    if branch.lift_off is None:
        return None
    value = max(axis.pressure_of(branch.lift_off.value), 0.0)
    return Quantity(value, axis.pressure_u, "mN/m")


def _band(transition: Transition) -> Band | None:
    if transition.kind == "kink":
        point = transition.at
        return None if point is None else Band("kink", point.pressure, point.pressure)
    if transition.onset is None:
        return None
    onset = transition.onset.pressure
    end = transition.end.pressure if transition.end is not None else None
    if end is not None and end.value < onset.value:  # a hump: the plateau lies below its onset
        onset, end = end, onset
    return Band("coexistence", onset, end)
