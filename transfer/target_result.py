"""What the choice of a dipping pressure found, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number
from isotherm.source import Source
from transfer.target_budget import Budget
from transfer.target_cautions import Caution
from transfer.target_intervals import Interval
from transfer.target_limits import LeftOut
from transfer.target_plan import PlannedStroke
from transfer.target_relax import Relaxation
from transfer.target_sensitivity import Effect

__all__ = ["Asked", "Drawing", "Limit", "TargetResult"]

FloatArray = NDArray[np.float64]


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


@dataclass(frozen=True)
class Limit:
    """One rule and what it allows.

    rule, label, reason : as in `transfer.target_limits.Rule`. intervals : all it allows, mN/m. allowed :
    the one that holds the recommendation, else the widest; None where it allows nothing. margin : distance
    from the recommendation to its nearest end, mN/m. normalised : the same in standard uncertainties of the
    pressure held. at : the feature's pressures, mN/m. binding : whether it ends the window.
    """

    rule: str
    label: str
    reason: str
    intervals: tuple[Interval, ...]
    allowed: Interval | None
    margin: Quantity | None
    normalised: float | None
    at: tuple[float, ...]
    binding: bool

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "rule": self.rule,
            "label": self.label,
            "allowed": None if self.allowed is None else _pair(self.allowed),
            "intervals": [_pair(interval) for interval in self.intervals],
            "reason": self.reason,
            "at": [json_number(value) for value in self.at],
            "margin": _json(self.margin),
            "margin_normalised": json_number(self.normalised),
            "binding": self.binding,
        }


@dataclass(frozen=True)
class Asked:
    """The sheet's own dipping pressure, mN/m, judged.

    breaks : the rules that exclude it. budget : film and plan at it, None where unknown.
    """

    pressure: float
    admissible: bool
    breaks: tuple[str, ...]
    packing_error: Quantity | None
    budget: Budget | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "pressure": json_number(self.pressure),
            "admissible": self.admissible,
            "breaks": list(self.breaks),
            "packing_error": _json(self.packing_error),
            "strokes_possible": None if self.budget is None else self.budget.strokes_possible,
            "renewals": None if self.budget is None else self.budget.renewals,
            "plan": [] if self.budget is None else [row.to_json() for row in self.budget.plan],
        }


@dataclass(frozen=True)
class Drawing:
    """What the figure needs besides: the whole first compression and the modulus along the pressure axis.

    area (m,) nm^2, pressure (m,) mN/m; axis_pressure, axis_modulus, axis_u_modulus (n,) mN/m. end :
    collapse or highest pressure; collapsed : which of the two.
    """

    area: FloatArray
    pressure: FloatArray
    axis_pressure: FloatArray
    axis_modulus: FloatArray
    axis_u_modulus: FloatArray
    end: float
    collapsed: bool


@dataclass(frozen=True)
class TargetResult:
    """The dipping pressure chosen from one isotherm.

    recommended, window, windows : mN/m. binding : in words. At the recommendation: packing_error and loss
    (1), modulus (mN/m), molecular_area (nm^2). budget : None where the sheet lacks what it needs. set_u :
    standard uncertainty of the pressure held, mN/m, the unit of normalised margins.
    """

    source: Source
    title: str
    recommended: Quantity | None
    window: Interval | None
    windows: tuple[Interval, ...]
    binding: str
    limits: tuple[Limit, ...]
    left_out: tuple[LeftOut, ...]
    relaxations: tuple[Relaxation, ...]
    sensitivity: tuple[Effect, ...]
    packing_error: Quantity | None
    loss: Quantity | None
    modulus: Quantity | None
    molecular_area: Quantity | None
    budget: Budget | None
    asked: Asked | None
    cautions: tuple[Caution, ...]
    drawing: Drawing
    set_u: float
    warnings: tuple[str, ...] = field(default=())
    settings: dict[str, Any] = field(default_factory=dict)

    @property
    def plan(self) -> tuple[PlannedStroke, ...]:
        """One row a stroke; empty without a budget."""
        return () if self.budget is None else self.budget.plan

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.target/1."""
        budget = self.budget
        return {
            "schema": "upstroke.target/1",
            "title": self.title,
            "source": self.source.to_json(),
            "settings": self.settings,
            "warnings": list(self.warnings),
            "recommended": _json(self.recommended),
            "window": None if self.window is None else _pair(self.window),
            "windows": [_pair(window) for window in self.windows],
            "binding": self.binding,
            "limits": [limit.to_json() for limit in self.limits],
            "left_out": [{"rule": item.rule, "why": item.why} for item in self.left_out],
            "relaxations": [_relaxation(item) for item in self.relaxations],
            "sensitivity": [_effect(item) for item in self.sensitivity],
            "packing_error": _json(self.packing_error),
            "loss": _json(self.loss),
            "modulus": _json(self.modulus),
            "molecular_area": _json(self.molecular_area),
            "strokes_possible": None if budget is None else budget.strokes_possible,
            "renewals": None if budget is None else budget.renewals,
            "time": None if budget is None else _json(budget.time),
            "volume": None if budget is None or budget.spreading is None
            else budget.spreading.volume.to_json(),
            "budget": None if budget is None else _budget(budget),
            "plan": [row.to_json() for row in self.plan],
            "asked": None if self.asked is None else self.asked.to_json(),
            "pressure_u": json_number(self.set_u),
            "cautions": [caution.to_json() for caution in self.cautions],
        }  # fmt: skip


def _pair(interval: Interval) -> list[float | None]:
    return [json_number(interval.low), json_number(interval.high)]


def _relaxation(item: Relaxation) -> dict[str, Any]:
    return {
        "text": item.text,
        "opens_at": json_number(item.pressure),
        "changes": [
            {
                "rule": change.rule,
                "by": json_number(change.by),
                "of": json_number(change.of),
                "unit": change.unit,
                "relative": json_number(change.relative),
            }
            for change in item.changes
        ],
    }


def _effect(effect: Effect) -> dict[str, Any]:
    return {
        "input": effect.name,
        "u": json_number(effect.u),
        "unit": effect.unit,
        "shift_up": json_number(effect.shift_up),
        "shift_down": json_number(effect.shift_down),
    }


def _budget(budget: Budget) -> dict[str, Any]:
    spreading = budget.spreading
    return {
        "area": budget.area.to_json(),
        "smallest_area": budget.smallest_area.to_json(),
        "coated_per_stroke": budget.stroke.coated.to_json(),
        "transfer_ratio": budget.stroke.ratio.to_json(),
        "film_per_stroke": budget.stroke.film.to_json(),
        "strokes_possible": budget.strokes_possible,
        "strokes_sure": budget.strokes_sure,
        "strokes_needed": budget.strokes_needed,
        "renewals": budget.renewals,
        "time": _json(budget.time),
        "spreading": None
        if spreading is None
        else {
            "volume": spreading.volume.to_json(),
            "area_per_molecule": spreading.area_per_molecule.to_json(),
            "largest_area": spreading.largest_area.to_json(),
            "strokes_possible": spreading.strokes_possible,
            "renewals": spreading.renewals,
            "volume_whole_stack": _json(spreading.whole_stack),
        },
        "notes": list(budget.notes),
    }
