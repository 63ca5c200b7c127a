"""The one way from an isotherm and a run sheet to a dipping pressure and a film budget."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from isotherm.errors import UpstrokeError
from isotherm.hold_result import HoldResult
from isotherm.molecular_area import molecules_spread
from isotherm.quantity import COVERAGE_FACTOR, Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from transfer.target_budget import Budget, Means, budget, supply_of
from transfer.target_cautions import cautions
from transfer.target_choice import choose
from transfer.target_film import FilmAxis, film_axis
from transfer.target_inputs import TargetInputs, gather_inputs
from transfer.target_intervals import Interval
from transfer.target_loss import loss_map
from transfer.target_phase import check_phase
from transfer.target_programme import programme, stroke_film, timing
from transfer.target_relax import relaxations
from transfer.target_result import Drawing, TargetResult
from transfer.target_sensitivity import combined_u, sensitivity
from transfer.target_summary import (
    binding_text,
    judge_asked,
    limit_rows,
    packing_error,
    warnings_of,
)

if TYPE_CHECKING:
    from isotherm.check_result import CheckResult

__all__ = ["choose_target"]

_HOUR = 3600.0  # s


def choose_target(
    result: IsothermResult,
    sheet: RunSheet,
    *,
    holds: tuple[HoldResult, ...] = (),
    check: CheckResult | None = None,
) -> TargetResult:
    """Choose the surface pressure for dipping, and say what the film will serve.

    Parameters
    ----------
    result : IsothermResult
        Its first compression counts.
    sheet : RunSheet
        [target], [dipping], [substrate], [stack], [trough] and [film], each where given; a rule that lacks
        what it needs is left out and named.
    holds : tuple of HoldResult
        Film loss; without them nothing is said about it.
    check : CheckResult or None
        Drift of the pressure probe (mN/m per hour): over the dipping time it adds to the tolerance.

    Returns
    -------
    TargetResult

    Raises
    ------
    UpstrokeError
        When the record has no rising compression, or the sheet names an unknown phase or impossible geometry.

    Notes
    -----
    Limits: `target_limits`; the deepest pressure: `target_choice`; film budget: `target_budget`.
    """
    if sheet.target.phase is not None:
        check_phase(sheet.target.phase, sheet.path or "run sheet")
    film = _counted(film_axis(result), sheet)
    steps, stroke, timed = programme(sheet), stroke_film(sheet), timing(sheet)
    planned = timed.total(steps.moves).value if timed is not None and steps.moves else None
    loss = loss_map(holds, planned, film) if holds and planned else None
    supply = supply_of(sheet, stroke, steps, film)
    inputs = gather_inputs(
        result,
        sheet,
        film=film,
        loss=loss,
        supply=supply,
        drift_u=_drift_u(check, planned),
        no_loss=_no_loss(holds, planned),
    )
    choice = choose(inputs)
    at = choice.recommended
    effects, ways = sensitivity(inputs, choice), relaxations(inputs, choice)
    foreseen: Budget | None = None
    at_asked: Budget | None = None
    if supply is not None and stroke is not None:
        means = Means(film, supply, stroke, steps, timed, loss, inputs.set_u)
        foreseen = None if at is None else budget(at, means, result, sheet)
        asked = sheet.dipping.pressure
        at_asked = None if asked is None else budget(asked.value, means, result, sheet)
    return TargetResult(
        source=result.source,
        title=sheet.title or result.title,
        recommended=None if at is None else Quantity(at, combined_u(effects), "mN/m"),
        window=None
        if choice.window is None
        else Interval(choice.window.low.pressure, choice.window.high.pressure),
        windows=tuple(Interval(w.low.pressure, w.high.pressure) for w in choice.windows),
        binding=binding_text(choice, ways),
        limits=limit_rows(inputs, choice),
        left_out=choice.rules.left_out,
        relaxations=ways,
        sensitivity=effects,
        packing_error=None if at is None else packing_error(inputs, at),
        loss=loss.total_at(at) if loss is not None and at is not None else None,
        modulus=None if at is None else _modulus(film, at),
        molecular_area=None if at is None else _molecular_area(result, film, at),
        budget=foreseen,
        asked=judge_asked(inputs, choice, sheet, at_asked),
        cautions=cautions(sheet),
        drawing=_drawing(result, inputs),
        set_u=inputs.set_u,
        warnings=warnings_of(result, sheet, inputs, choice, foreseen=foreseen),
        settings={
            "coverage_factor": COVERAGE_FACTOR,
            "holds": [hold.source.path for hold in holds],
            "check": check.path if check is not None else None,
        },
    )


def _counted(film: FilmAxis, sheet: RunSheet) -> FilmAxis:
    """The film with the number of molecules from the sheet, where the record does not tell it."""
    if film.molecules is not None:
        return film
    try:
        return replace(film, molecules=molecules_spread(sheet.film).value)
    except UpstrokeError:
        return film  # the sheet does not tell it either: no budget, and the result says why


def _no_loss(holds: tuple[HoldResult, ...], planned: float | None) -> str:
    """Why nothing can be said about film loss, where that is so."""
    if not any(result.holds for result in holds):
        return "no hold is given" if not holds else "no hold was found in the records given"
    if planned is None:
        return "the dipping time is not known (stack.layers, dipping.stroke_length, dipping.speed)"
    return "no hold lies where the isotherm gives a modulus"


def _drift_u(check: CheckResult | None, planned: float | None) -> float:
    """What the probe may have drifted at some moment of the dipping, mN/m (rectangular, GUM 4.3.7)."""
    drift = check.drift_rate if check is not None else None
    if drift is None or planned is None:
        return 0.0
    return float(np.hypot(drift.value, drift.u or 0.0)) * planned / _HOUR / float(np.sqrt(3.0))


def _modulus(film: FilmAxis, pressure: float) -> Quantity:
    at = np.array([pressure])
    return Quantity.combine(
        float(film.modulus_at(at)[0]),
        "mN/m",
        u_random=float(film.u_modulus_at(at)[0]),
        u_systematic=None,
    )


def _molecular_area(result: IsothermResult, film: FilmAxis, pressure: float) -> Quantity:
    at = np.array([pressure])
    value, modulus = float(film.area_at(at)[0]), float(film.modulus_at(at)[0])
    relative = film.pressure_u / modulus if modulus > 0 else 0.0
    return Quantity(value, value * float(np.hypot(relative, result.area_relative_u or 0.0)), "nm^2")


def _drawing(result: IsothermResult, inputs: TargetInputs) -> Drawing:
    curve, film = result.headline.curve, inputs.film
    return Drawing(
        area=curve.area,
        pressure=curve.pressure,
        axis_pressure=film.pressure,
        axis_modulus=film.modulus,
        axis_u_modulus=film.u_modulus,
        end=inputs.end.value,
        collapsed=inputs.collapse is not None,
    )
