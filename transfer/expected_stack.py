"""Expected numbers of one build: as designed, as built, along the substrate."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from transfer.evidence_from_result import film_inputs, ledger_from_result
from transfer.evidence_ledger import FilmInputs
from transfer.expected import (
    Contraction,
    ExpectedNumbers,
    contraction,
    expected_build,
    expected_design,
)
from transfer.expected_along import AlongSubstrate, along_substrate
from transfer.result import TransferResult

__all__ = ["ExpectedStack", "design_films", "expected_stack"]


@dataclass(frozen=True)
class ExpectedStack:
    """What the stack should show; parts are None where sheet or log do not say enough."""

    designed: ExpectedNumbers | None
    built: ExpectedNumbers | None
    along: AlongSubstrate | None
    contraction: Contraction | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "designed": None if self.designed is None else self.designed.to_json(),
            "built": None if self.built is None else self.built.to_json(),
            "along_substrate": None if self.along is None else self.along.to_json(),
            "contraction": None if self.contraction is None else self.contraction.to_json(),
        }


def design_films(
    sheet: RunSheet, isotherm: IsothermResult | None, pressure: float
) -> tuple[FilmInputs, ...]:
    """Films in the order the design lays them down: by its type and first stroke.

    Parameters
    ----------
    sheet : RunSheet
    isotherm : IsothermResult or None
    pressure : float, mN/m
    """
    first = sheet.stack.first_stroke or "down"
    turn = {"X": ("down",), "Z": ("up",)}.get(
        sheet.stack.type or "", (first, "up" if first == "down" else "down")
    )
    return tuple(film_inputs(sheet, direction, isotherm, pressure) for direction in turn)


def expected_stack(
    result: TransferResult,
    sheet: RunSheet,
    *,
    isotherm: IsothermResult | None = None,
    faces: int = 2,
) -> ExpectedStack:
    """Compute what the stack should show.

    Parameters
    ----------
    result : TransferResult
    sheet : RunSheet
        stack.layers, layer_thickness, permittivity, absorptivity, crystal_frequency, area_in_film.
    isotherm : IsothermResult or None
        Gives the area per molecule at the dipping pressure when the sheet does not.
    faces : int
        Coated faces that absorbance and resonator see; a dipped substrate has two.
    """
    films = design_films(sheet, isotherm, result.pressure_target)
    crystal = sheet.stack.crystal_frequency
    designed = None
    if sheet.stack.layers:
        designed = expected_design(
            films, sheet.stack.layers, crystal_frequency=crystal, faces=faces
        )
    built = along = None
    if result.strokes:
        ledger = ledger_from_result(result, sheet, isotherm=isotherm)
        built = expected_build(ledger, crystal_frequency=crystal, faces=faces)
        along = along_substrate(result, ledger)
    packed = None
    on_water, in_film = films[0].molecular_area, sheet.stack.area_in_film
    laid = [s.ratio for s in result.strokes if s.counted and s.ratio is not None]
    if on_water is not None and in_film is not None and laid:
        mean = sum(r.value for r in laid) / len(laid)
        u = max((r.u or 0.0) for r in laid) / len(laid) ** 0.5
        packed = contraction(on_water, in_film, Quantity(mean, u or None, "1"))
    return ExpectedStack(designed, built, along, packed)
