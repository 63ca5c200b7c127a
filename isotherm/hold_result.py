"""What the holds of a record say, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_average import mean_loss, mean_rate
from isotherm.hold_blocks import Blocks
from isotherm.hold_fit import LawFit
from isotherm.quantity import Quantity, json_number
from isotherm.source import Source

__all__ = ["Hold", "HoldResult", "LawResult"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class LawResult:
    """One law as fitted to one hold.

    name : "constant" | "desorption" | "dissolution" | "nucleation" | "relaxation".
    equation : how it reads, for a person.
    parameters : name -> quantity.
    aicc, delta, weight : criterion, its excess over the least, share of support (all laws sum to 1).
    loss : relative loss over the time asked for, as this law alone has it.
    remark : e.g. which limiting case of nucleation is nearest.
    """

    name: str
    equation: str
    parameters: dict[str, Quantity]
    aicc: float
    delta: float
    weight: float
    loss: Quantity
    remark: str = ""

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "name": self.name,
            "equation": self.equation,
            "parameters": {key: value.to_json() for key, value in self.parameters.items()},
            "aicc": json_number(self.aicc),
            "delta_aicc": json_number(self.delta),
            "weight": json_number(self.weight),
            "loss": self.loss.to_json(),
            "remark": self.remark,
        }


@dataclass(frozen=True)
class Hold:
    """One hold: what was kept, what drifted, and by which law.

    kind : "isobaric" (area drifts) | "isochoric" (pressure drifts).
    from_s, to_s : time in the record of the set point's arrival and of the end.
    settling_s : left out after the arrival because the trough was still settling.
    pressure : mean over an isobaric hold, fitted start of an isochoric one, mN/m.
    start_level : drifting quantity at the arrival, by the chosen law.
    laws : in order of support; chosen : name of the law chosen (`hold_laws.choose_law`).
    planned_time : s, time asked for, or None.
    noise : scatter of one row group (`blocks`) about the chosen law, unit of the level.
    correlation_time : s, how long the scatter remembers; effective : independent groups it amounts to.
    relative_u_systematic : systematic u of a relative loss, as a part of the loss.
    drift_u : systematic u of the relative rate, 1/s (probe drift not excluded).
    arrival_u : u of the moment the film's own time starts, s.
    """

    number: int
    kind: str
    from_s: float
    to_s: float
    settling_s: float
    pressure: Quantity
    start_level: Quantity
    laws: tuple[LawResult, ...]
    chosen: str
    planned_time: float | None
    noise: float
    correlation_time: float
    effective: float
    blocks: Blocks
    fits: tuple[LawFit, ...]
    relative_u_systematic: float = 0.0
    drift_u: float = 0.0
    arrival_u: float = 0.0
    warnings: tuple[str, ...] = field(default=())

    @property
    def duration_s(self) -> float:
        """From arrival to the end, s."""
        return self.to_s - self.from_s

    @property
    def chosen_law(self) -> LawResult:
        """The chosen law."""
        return next(law for law in self.laws if law.name == self.chosen)

    @property
    def first_time(self) -> float:
        """Earliest time since the arrival that the fit saw, s; above 0."""
        first, second = self.blocks.time[:2].tolist()
        return max(self.settling_s, float(first), 0.5 * float(second - first))

    @property
    def loss_hold(self) -> Quantity:
        """Relative loss from the arrival to the end of the hold."""
        return self.loss_over(self.duration_s)

    @property
    def loss_planned(self) -> Quantity | None:
        """Relative loss over the planned time, None where no time was asked for."""
        return None if self.planned_time is None else self.loss_over(self.planned_time)

    @property
    def rates(self) -> tuple[tuple[float, Quantity], ...]:
        """Rate of loss at the times that matter: settled, halfway, at the end, at the planned end."""
        times = [self.first_time, 0.5 * self.duration_s, self.duration_s]
        if self.planned_time is not None:
            times.append(self.planned_time)
        return tuple((t, self.rate_at(t)) for t in sorted(set(times)))

    def loss_over(self, seconds: float) -> Quantity:
        """Relative loss from the arrival over `seconds`, averaged over the laws by their weights.

        The random part of u holds both each law's own uncertainty and the disagreement of the laws
        (Burnham & Anderson 2002, eq. 4.9).
        """
        loss = mean_loss(self.fits, seconds)
        parts = (
            loss.value * self.relative_u_systematic,
            self.drift_u * seconds,
            self.arrival_u * self._rate_change(seconds),
        )
        systematic = float(np.linalg.norm(parts))
        return Quantity.combine(loss.value, "1", u_random=loss.u, u_systematic=systematic)

    def _rate_change(self, seconds: float) -> float:
        """Change of rate from when it settled to `seconds`, 1/s: what a shift of the start costs."""
        settled = max(self.first_time, self.arrival_u)
        if self.arrival_u == 0.0 or seconds <= settled:
            return 0.0
        return abs(mean_rate(self.fits, settled).value - mean_rate(self.fits, seconds).value)

    def rate_at(self, seconds: float) -> Quantity:
        """Relative rate of loss -d ln y/dt at `seconds` after the arrival, 1/s, averaged over the laws.

        Times before the first that was seen are taken there: desorption has no rate at 0.
        """
        rate = mean_rate(self.fits, max(seconds, self.first_time))
        systematic = float(np.hypot(rate.value * self.relative_u_systematic, self.drift_u))
        return Quantity.combine(rate.value, "1/s", u_random=rate.u, u_systematic=systematic)

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "number": self.number,
            "kind": self.kind,
            "from_s": json_number(self.from_s),
            "to_s": json_number(self.to_s),
            "settling_s": json_number(self.settling_s),
            "duration_s": json_number(self.duration_s),
            "pressure": self.pressure.to_json(),
            "start_level": self.start_level.to_json(),
            "model": self.chosen,
            "models": [law.to_json() for law in self.laws],
            "loss_hold": self.loss_hold.to_json(),
            "loss_planned": self.loss_planned.to_json() if self.loss_planned else None,
            "rates": [{"time_s": json_number(t), "rate": rate.to_json()} for t, rate in self.rates],
            "noise": json_number(self.noise),
            "correlation_time_s": json_number(self.correlation_time),
            "effective_observations": json_number(self.effective),
            "warnings": list(self.warnings),
        }


@dataclass(frozen=True)
class HoldResult:
    """Every hold of one record."""

    source: Source
    holds: tuple[Hold, ...]
    planned_time: float | None = None  # s
    area_unit: str = "cm^2"
    title: str = ""
    settings: dict[str, Any] = field(default_factory=dict)
    warnings: tuple[str, ...] = field(default=())

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.hold/1."""
        return {
            "schema": "upstroke.hold/1",
            "title": self.title,
            "source": self.source.to_json(),
            "settings": self.settings,
            "planned_time_s": json_number(self.planned_time),
            "area_unit": self.area_unit,
            "warnings": list(self.warnings),
            "holds": [hold.to_json() for hold in self.holds],
        }
