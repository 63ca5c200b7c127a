"""What isotherms of components and their mixtures say, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from isotherm.quantity import Quantity, json_number
from isotherm.series import COVERAGE, Row, quantity_cells

__all__ = ["CompositionPressure", "MixtureResult", "MixtureState", "MixturesAt", "SurfacePhaseRule"]


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


@dataclass(frozen=True)
class MixtureState:
    """One composition at one pressure.

    fractions : mole fraction of each component, in the order of `MixtureResult.components`.
    area, ideal, excess : nm^2; `ideal` is Σ x_i A_i. excess_relative : excess over ideal, unit "1".
    p : probability of an excess this large in an ideal film. Pure components have no excess.
    gibbs_excess, gibbs_mixing : J/mol of molecules; the latter includes R T Σ x ln x.
    """

    fractions: tuple[float, ...]
    runs: int
    area: Quantity
    ideal: Quantity | None = None
    excess: Quantity | None = None
    excess_relative: Quantity | None = None
    p: float | None = None
    gibbs_excess: Quantity | None = None
    gibbs_p: float | None = None
    gibbs_mixing: Quantity | None = None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "fractions": list(self.fractions),
            "runs": self.runs,
            "area": self.area.to_json(),
            "ideal_area": _json(self.ideal),
            "excess_area": _json(self.excess),
            "excess_relative": _json(self.excess_relative),
            "p": json_number(self.p),
            "excess_gibbs": _json(self.gibbs_excess),
            "excess_gibbs_p": json_number(self.gibbs_p),
            "mixing_gibbs": _json(self.gibbs_mixing),
        }


@dataclass(frozen=True)
class MixturesAt:
    """Every composition at one surface pressure (mN/m) and what they say together.

    verdict : "condensation", "expansion", "both signs" or "no departure found".
    joint_p : probability of departures this large, all compositions together, in ideal films.
    interaction : ω of ΔG_ex = ω x (1 - x), J/mol (two components only); interaction_p its
        lack-of-fit probability, None with one mixture.
    """

    pressure: float
    states: tuple[MixtureState, ...]
    verdict: str
    joint_p: float | None
    statement: str
    interaction: Quantity | None = None
    interaction_p: float | None = None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "pressure": self.pressure,
            "verdict": self.verdict,
            "joint_p": json_number(self.joint_p),
            "statement": self.statement,
            "interaction": _json(self.interaction),
            "interaction_lack_of_fit_p": json_number(self.interaction_p),
            "states": [s.to_json() for s in self.states],
        }


@dataclass(frozen=True)
class CompositionPressure:
    """Collapse or transition pressure of one composition; None where no run of it has one."""

    fractions: tuple[float, ...]
    runs: int
    pressure: Quantity | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "fractions": list(self.fractions),
            "runs": self.runs,
            "pressure": _json(self.pressure),
        }


@dataclass(frozen=True)
class SurfacePhaseRule:
    """Collapse or transition pressure against composition, and what it means for miscibility.

    kind : "collapse" or "transition".
    reading : "miscible", "immiscible" or "cannot tell".
    p_constant : probability of the spread seen if the pressure did not depend on composition.
    p_ideal : the same if it went linearly from one component to the other; None where not defined.
    """

    kind: str
    points: tuple[CompositionPressure, ...]
    reading: str
    statement: str
    p_constant: float | None = None
    p_ideal: float | None = None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "kind": self.kind,
            "reading": self.reading,
            "statement": self.statement,
            "p_constant": json_number(self.p_constant),
            "p_ideal": json_number(self.p_ideal),
            "points": [p.to_json() for p in self.points],
        }


@dataclass(frozen=True)
class MixtureResult:
    """Everything the series of compositions gave."""

    components: tuple[str, ...]
    kelvin: float | None
    at: tuple[MixturesAt, ...]
    phase_rule: tuple[SurfacePhaseRule, ...]
    integral_from: float  # mN/m, below which the excess area is extrapolated
    sources: tuple[str, ...]
    warnings: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.mixture/1."""
        return {
            "schema": "upstroke.mixture/1",
            "settings": {"coverage": COVERAGE, "integral_from": self.integral_from},
            "sources": list(self.sources),
            "warnings": list(self.warnings),
            "components": list(self.components),
            "kelvin": json_number(self.kelvin),
            "at": [a.to_json() for a in self.at],
            "phase_rule": [r.to_json() for r in self.phase_rule],
        }

    def rows(self) -> list[Row]:
        """One row a composition and pressure."""
        rows: list[Row] = []
        for group in self.at:
            for state in group.states:
                row: Row = {"pressure": group.pressure}
                for name, x in zip(self.components, state.fractions, strict=True):
                    row[f"x {name}"] = x
                row["runs"] = state.runs
                row.update(quantity_cells("area", state.area))
                row.update(quantity_cells("ideal_area", state.ideal))
                row.update(quantity_cells("excess_area", state.excess))
                row["p"] = state.p
                row.update(quantity_cells("excess_gibbs", state.gibbs_excess))
                row.update(quantity_cells("mixing_gibbs", state.gibbs_mixing))
                rows.append(row)
        return rows
