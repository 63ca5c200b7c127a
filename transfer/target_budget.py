"""The film budget: strokes one filling serves, renewals, what to spread, and how long it all takes."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from isotherm.errors import UpstrokeError
from isotherm.molecular_area import molecules_spread
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from transfer.target_film import FilmAxis
from transfer.target_inputs import Supply
from transfer.target_loss import LossMap
from transfer.target_plan import Filling, PlannedStroke, fits, foreseen_area, plan_strokes, sure_of
from transfer.target_programme import Move, Programme, StrokeFilm, Timing

__all__ = [
    "Budget",
    "Means",
    "Spreading",
    "budget",
    "fresh_area_relative_u",
    "supply_of",
]

_NM2_PER_CM2 = 1e14
_PER_MICROLITRE = Quantity(1.0, None, "µL")


@dataclass(frozen=True)
class Spreading:
    """What to spread.

    volume : µL, fills the trough at its largest area with the area per molecule the record started at.
    area_per_molecule : nm^2, at that start. largest_area : cm^2. strokes_possible, renewals : with it.
    whole_stack : µL that would serve the whole stack without renewal (may be more than the trough takes).
    """

    volume: Quantity
    area_per_molecule: Quantity
    largest_area: Quantity
    strokes_possible: int
    renewals: int | None
    whole_stack: Quantity | None


@dataclass(frozen=True)
class Budget:
    """Film and time of the whole stack at one pressure.

    area : trough area of a fresh film at the pressure, cm^2. strokes_possible : depositing strokes one
    filling serves; strokes_sure : with about 95 % certainty. strokes_needed, renewals : None without a
    number of layers. time : s, without spreading, compressing and renewing; None without a speed.
    plan : one row a stroke.
    """

    area: Quantity
    smallest_area: Quantity
    stroke: StrokeFilm
    strokes_possible: int
    strokes_sure: int
    strokes_needed: int | None
    renewals: int | None
    time: Quantity | None
    spreading: Spreading | None
    plan: tuple[PlannedStroke, ...]
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Means:
    """What a budget is made of, at any pressure. set_u : standard uncertainty of the pressure held, mN/m."""

    film: FilmAxis
    supply: Supply
    stroke: StrokeFilm
    programme: Programme
    timing: Timing | None
    loss: LossMap | None
    set_u: float

    @property
    def pattern(self) -> tuple[Move, ...]:
        """Strokes to repeat for as long as a filling lasts."""
        return self.programme.moves or (Move("down", True), Move("up", True))

    def filling(self, pressure: float) -> Filling:
        """A fresh film held at a pressure, mN/m."""
        area = foreseen_area(self.film, pressure, self.supply.area_relative_u, self.set_u)
        return Filling(
            area, self.supply.smallest_area, self.stroke.film, pressure, self.loss, self.timing
        )


def fresh_area_relative_u(sheet: RunSheet) -> float:
    """Relative u of the trough area of a film spread again by the same recipe.

    Both films hold a volume measured anew; concentration, purity and molar mass are the same and drop out.
    """
    volume = sheet.film.volume
    if volume is None or volume.u is None:
        return 0.0
    return math.sqrt(2.0) * volume.u / volume.value


def supply_of(
    sheet: RunSheet, stroke: StrokeFilm | None, plan: Programme, film: FilmAxis
) -> Supply | None:
    """What the rule of enough film needs; None where the sheet lacks a part of it.

    With a limit on renewals one filling has to serve its share of the stack, else one stroke.
    """
    smallest = sheet.trough.smallest_area
    if smallest is None or stroke is None or film.molecules is None:
        return None
    limit = sheet.target.renewals if sheet.target.renewals is not None else sheet.stack.renewals
    strokes = 1
    if limit is not None and plan.depositing:
        strokes = math.ceil(plan.depositing / (limit + 1))
    return Supply(_measured(smallest, sheet), stroke.film, strokes, fresh_area_relative_u(sheet))


def budget(pressure: float, means: Means, result: IsothermResult, sheet: RunSheet) -> Budget:
    """Work out the film budget at a pressure.

    Parameters
    ----------
    pressure : float
        mN/m.
    means : Means
    result : IsothermResult
        Gives the area per molecule the record started at.
    sheet : RunSheet

    Returns
    -------
    Budget
    """
    filling, pattern = means.filling(pressure), means.pattern
    stroke, programme, timing = means.stroke, means.programme, means.timing
    possible, sure = fits(filling, pattern), sure_of(filling, pattern)
    moves = programme.moves or _one_filling(pattern, possible)
    plan = plan_strokes(filling, moves)
    renewals = sum(row.renew_before for row in plan) if programme.moves and plan else None
    notes = [*stroke.notes, *programme.notes, *(timing.notes if timing is not None else ())]
    if means.loss is None:
        notes.append("no hold given: the film's own loss is not in the plan")
    elif timing is None:
        notes.append("speed not known: the film's own loss is not in the plan")
    if plan and sure < possible and _longest_run(plan, programme) > sure:
        notes.append(
            f"a filling is planned to serve up to {_longest_run(plan, programme)} strokes but is sure (95 %) "
            f"of {sure} only: be ready to renew earlier"
        )
    return Budget(
        area=filling.area,
        smallest_area=filling.smallest,
        stroke=stroke,
        strokes_possible=possible,
        strokes_sure=sure,
        strokes_needed=programme.depositing if programme.moves else None,
        renewals=renewals,
        time=timing.total(programme.moves) if timing is not None and programme.moves else None,
        spreading=_spreading(means, filling, result, sheet),
        plan=plan,
        notes=tuple(notes),
    )


def _one_filling(pattern: tuple[Move, ...], strokes: int) -> tuple[Move, ...]:
    """As many strokes as one filling serves, where the number of layers is not known."""
    return tuple(pattern[j % len(pattern)] for j in range(strokes))


def _longest_run(plan: tuple[PlannedStroke, ...], programme: Programme) -> int:
    """Most depositing strokes between two renewals."""
    longest = run = 0
    for j, row in enumerate(plan):
        takes = programme.moves[j].takes if programme.moves else True
        run = int(takes) if row.renew_before else run + int(takes)
        longest = max(longest, run)
    return longest


def _measured(smallest: Quantity, sheet: RunSheet) -> Quantity:
    """The smallest area with the trough's own area uncertainty where it states none."""
    area_u = sheet.trough.area_uncertainty
    if smallest.u is not None or area_u is None:
        return smallest
    return replace(smallest, u=area_u.value)


def _spreading(
    means: Means, filling: Filling, result: IsothermResult, sheet: RunSheet
) -> Spreading | None:
    film, programme = means.film, means.programme
    curve = result.headline.curve
    largest = sheet.trough.largest_area
    if largest is None and curve.trough_area is not None:
        largest = Quantity(float(curve.trough_area[0]), None, "cm^2")
    if largest is None or film.molecules is None:
        return None
    try:
        per_volume = molecules_spread(replace(sheet.film, volume=_PER_MICROLITRE))
    except UpstrokeError:
        return None
    start = float(curve.area[0])
    relative = result.area_relative_u
    per_molecule = Quantity(start, None if relative is None else start * relative, "nm^2")
    # The volume that was spread, scaled: what is uncertain in the solution drops out.
    amount = largest.value / start * _NM2_PER_CM2
    volume = _volume(amount, film, sheet, per_volume, (largest.u or 0.0) / largest.value)
    scale = amount / film.molecules
    full = replace(
        filling,
        area=Quantity(filling.area.value * scale, (filling.area.u or 0.0) * scale, "cm^2"),
    )
    strokes = fits(full, means.pattern)
    renewals = None
    if programme.moves and strokes:
        renewals = sum(row.renew_before for row in plan_strokes(full, programme.moves))
    return Spreading(
        volume=volume,
        area_per_molecule=per_molecule,
        largest_area=largest,
        strokes_possible=strokes,
        renewals=renewals,
        whole_stack=_whole_stack(means, filling, sheet, per_volume),
    )


def _volume(
    molecules: float, film: FilmAxis, sheet: RunSheet, per_volume: Quantity, relative_u: float
) -> Quantity:
    """Volume, µL, that holds a number of molecules: the record's scaled, else from the concentration."""
    spread = sheet.film.volume
    if spread is not None and film.molecules is not None:
        value = spread.value * molecules / film.molecules
        return Quantity(
            value, value * math.hypot((spread.u or 0.0) / spread.value, relative_u), "µL"
        )
    value = molecules / per_volume.value
    return Quantity(
        value, value * math.hypot((per_volume.u or 0.0) / per_volume.value, relative_u), "µL"
    )


def _whole_stack(
    means: Means, filling: Filling, sheet: RunSheet, per_volume: Quantity
) -> Quantity | None:
    """Volume, µL, for all strokes in one filling, the film's own loss over the whole time included."""
    film, programme = means.film, means.programme
    if not programme.moves:
        return None
    left = 1.0
    if filling.timing is not None:
        left = filling.left(filling.timing.total(programme.moves).value)[0]
    if left <= 0:
        return None
    need = programme.depositing * filling.film.value + filling.smallest.value
    u = float(np.hypot(programme.depositing * (filling.film.u or 0.0), filling.smallest.u or 0.0))
    molecules = need / left / float(film.area_at(np.array([filling.pressure]))[0]) * _NM2_PER_CM2
    return _volume(molecules, film, sheet, per_volume, u / need)
