"""What isotherms at several temperatures say, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from isotherm.constants import ZERO_CELSIUS
from isotherm.quantity import Quantity, json_number
from isotherm.series import COVERAGE, Row, quantity_cells
from isotherm.temperature_line import Crossing, StraightLine

__all__ = [
    "CriticalPoint",
    "Expansivity",
    "TemperatureResult",
    "TemperatureRun",
    "TemperatureTrend",
    "TransitionHeat",
]


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


@dataclass(frozen=True)
class TransitionHeat:
    """Entropy (J/mol/K) and enthalpy (J/mol) of the transition, condensed to expanded.

    The simple form uses dΠ_t/dT, the full one dΠ_t/dT - dγ0/dT.
    """

    entropy: Quantity
    enthalpy: Quantity
    entropy_full: Quantity | None
    enthalpy_full: Quantity | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "entropy": self.entropy.to_json(),
            "enthalpy": self.enthalpy.to_json(),
            "entropy_full": _json(self.entropy_full),
            "enthalpy_full": _json(self.enthalpy_full),
        }


@dataclass(frozen=True)
class TemperatureRun:
    """One run: temperature, its coexistence (None where there is none) and the heat of it.

    delta_area : onset area minus end area, nm^2, positive. values : feature name -> quantity.
    """

    name: str
    path: str
    kelvin: Quantity
    pressure: Quantity | None
    onset_area: Quantity | None
    end_area: Quantity | None
    delta_area: Quantity | None
    heat: TransitionHeat | None = None
    values: dict[str, Quantity] = field(default_factory=dict)

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "name": self.name,
            "path": self.path,
            "kelvin": self.kelvin.to_json(),
            "transition_pressure": _json(self.pressure),
            "onset_area": _json(self.onset_area),
            "end_area": _json(self.end_area),
            "delta_area": _json(self.delta_area),
            "heat": None if self.heat is None else self.heat.to_json(),
            "features": {name: value.to_json() for name, value in self.values.items()},
        }


@dataclass(frozen=True)
class CriticalPoint:
    """Where ΔA, extended, closes.

    law : "linear" (ΔA falls in proportion) or "square root" (ΔA² does, as a mean-field film's).
    interval : K, Fieller, coverage 95 %; None for an end without bound.
    """

    law: str
    kelvin: Quantity
    interval: tuple[float | None, float | None]
    pressure: Quantity | None
    lack_of_fit_p: float | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        low, high = self.interval
        return {
            "law": self.law,
            "kelvin": self.kelvin.to_json(),
            "celsius": json_number(self.kelvin.value - ZERO_CELSIUS),
            "coverage": COVERAGE,
            "interval": [json_number(low), json_number(high)],
            "pressure": _json(self.pressure),
            "lack_of_fit_p": json_number(self.lack_of_fit_p),
        }


@dataclass(frozen=True)
class TemperatureTrend:
    """A feature against temperature: slope per kelvin, its 95 % interval and p of no trend."""

    name: str
    n: int
    slope: Quantity
    interval: tuple[float, float]
    at_mean: Quantity
    mean_kelvin: float
    p: float

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "name": self.name,
            "n": self.n,
            "slope": self.slope.to_json(),
            "coverage": COVERAGE,
            "interval": [json_number(v) for v in self.interval],
            "at_mean": self.at_mean.to_json(),
            "mean_kelvin": self.mean_kelvin,
            "p": json_number(self.p),
        }


@dataclass(frozen=True)
class Expansivity:
    """(1/A) dA/dT at constant pressure (mN/m), runs of one side of the transition only, 1/K."""

    pressure: float
    side: str  # "expanded" | "condensed" | "no transition"
    n: int
    value: Quantity
    interval: tuple[float, float]

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "pressure": self.pressure,
            "side": self.side,
            "n": self.n,
            "value": self.value.to_json(),
            "coverage": COVERAGE,
            "interval": [json_number(v) for v in self.interval],
        }


@dataclass(frozen=True)
class TemperatureResult:
    """Everything the series of temperatures gave.

    slope : dΠ_t/dT, mN/m/K. begins_at : K, where Π_t reaches zero: below it the film goes from gas to
    condensed. tension_slope : dγ0/dT used by the full form. critical : linear law first.
    """

    runs: tuple[TemperatureRun, ...]
    pressure_line: StraightLine | None
    slope: Quantity | None
    slope_interval: tuple[float, float] | None
    tension_slope: Quantity | None
    tension_from: str
    delta_area_line: StraightLine | None
    begins_at: Crossing | None
    critical: tuple[CriticalPoint, ...]
    trends: tuple[TemperatureTrend, ...]
    expansivity: tuple[Expansivity, ...]
    warnings: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.temperature/1."""
        begins = self.begins_at
        line = self.pressure_line
        return {
            "schema": "upstroke.temperature/1",
            "settings": {"coverage": COVERAGE, "direction": "condensed to expanded"},
            "warnings": list(self.warnings),
            "runs": [r.to_json() for r in self.runs],
            "transition_slope": _json(self.slope),
            "transition_slope_interval": None
            if self.slope_interval is None
            else [json_number(v) for v in self.slope_interval],
            "lack_of_fit_p": None if line is None else json_number(line.lack_of_fit_p),
            "tension_slope": _json(self.tension_slope),
            "tension_from": self.tension_from,
            "begins_at": None
            if begins is None
            else {
                "kelvin": Quantity(begins.value, begins.u, "K").to_json(),
                "interval": [json_number(begins.low), json_number(begins.high)],
            },
            "critical": [c.to_json() for c in self.critical],
            "trends": [t.to_json() for t in self.trends],
            "expansivity": [e.to_json() for e in self.expansivity],
        }

    def rows(self) -> list[Row]:
        """One row a run: temperature, transition, heat, features."""
        names = list(dict.fromkeys(name for run in self.runs for name in run.values))
        rows: list[Row] = []
        for run in self.runs:
            heat = run.heat
            row: Row = {"name": run.name, "path": run.path}
            row.update(quantity_cells("kelvin", run.kelvin))
            row.update(quantity_cells("transition_pressure", run.pressure))
            row.update(quantity_cells("onset_area", run.onset_area))
            row.update(quantity_cells("end_area", run.end_area))
            row.update(quantity_cells("delta_area", run.delta_area))
            row.update(quantity_cells("entropy", heat.entropy if heat else None))
            row.update(quantity_cells("enthalpy", heat.enthalpy if heat else None))
            row.update(quantity_cells("entropy_full", heat.entropy_full if heat else None))
            row.update(quantity_cells("enthalpy_full", heat.enthalpy_full if heat else None))
            for name in names:
                row.update(quantity_cells(name, run.values.get(name)))
            rows.append(row)
        return rows
