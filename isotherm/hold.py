"""Film stability: from a record of holds to the law of loss, its rate and what a dipping would cost."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_average import level_curve
from isotherm.hold_blocks import Blocks, block_means
from isotherm.hold_fit import LawFit, fit_laws
from isotherm.hold_laws import choose_law, law_results
from isotherm.hold_noise import LONGEST_PART
from isotherm.hold_read import HoldRecord, read_hold
from isotherm.hold_result import Hold, HoldResult
from isotherm.hold_segments import Stretch
from isotherm.hold_settling import settled_after
from isotherm.hold_systematic import Systematic, systematic
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet

if TYPE_CHECKING:
    from isotherm.check_result import CheckResult

__all__ = ["HoldRecord", "HoldResult", "analyse_hold", "planned_dipping_time", "read_hold"]

FloatArray = NDArray[np.float64]

# Blocks the fit sees: a law that changes within a tenth of the hold is still resolved ten times over,
# and the cost of the fit is set by it, not by the rows.
_BLOCKS = 96
_FEWEST_BLOCKS = 20
# Settling that shows in the drifting quantity only: at most this part of a hold is taken for it, so that a
# law that fails at the start is not made to fit by cutting the start away.
_LARGEST_CUT = 0.1
_PASSES = 3
_HOUR = 3600.0


@dataclass(frozen=True)
class _Fitted:
    blocks: Blocks
    fits: tuple[LawFit, ...]
    chosen: LawFit
    settling: float


def planned_dipping_time(sheet: RunSheet) -> float | None:
    """Time the design needs the film under pressure, s: strokes at the sheet's speed, and dwells.

    None where the sheet lacks the number of layers, the stroke or the speed. Dwells not given count as 0.
    """
    dipping, layers = sheet.dipping, sheet.stack.layers
    if layers is None or dipping.stroke_length is None or dipping.speed is None:
        return None
    if dipping.speed.value <= 0:
        return None
    stroke = dipping.stroke_length.value / dipping.speed.value
    dwells = [d.value for d in (dipping.dwell_top, dipping.dwell_bottom) if d is not None]
    return layers * (stroke + sum(dwells) / 2.0)


def _fit_settled(time: FloatArray, level: FloatArray, settling: float) -> _Fitted:
    """Fit the settled part; what settles later than the controlled quantity is cut away as well."""
    longest = max(settling, _LARGEST_CUT * float(time[-1]))
    for _ in range(_PASSES):
        kept = time >= settling
        blocks = block_means(time[kept], level[kept], _BLOCKS)
        fits = fit_laws(blocks)
        chosen = choose_law(fits, float(time[-1]))
        residual = level[kept] - level_curve(chosen, time[kept])
        more = settling + settled_after(time[kept] - settling, residual)
        if not settling < more <= longest:
            break
        settling = more
    return _Fitted(blocks, fits, chosen, settling)


def _remarks(fitted: _Fitted, drifting: str, duration: float, planned: float | None) -> list[str]:
    """What a reader of the numbers should know."""
    notes = []
    chosen, blocks = fitted.chosen, fitted.blocks
    span = float(blocks.time[-1] - blocks.time[0])
    if chosen.share >= 0.5 and chosen.correlation_time > 0.9 * LONGEST_PART * span:
        notes.append(
            "the scatter about the chosen law drifts as slowly as the film might: u is a guide only"
        )
    if chosen.drop[chosen.best] < 0:
        notes.append(f"the {drifting} grows: no loss, but not a film at rest either")
    if planned is not None and planned > 1.01 * duration:
        notes.append(
            f"the hold lasted {duration / _HOUR:.2f} h; the loss over {planned / _HOUR:.2f} h extrapolates "
            "the laws"
        )
    if blocks.spikes:
        rows = "1 row" if blocks.spikes == 1 else f"{blocks.spikes} rows"
        notes.append(f"{rows} far off their neighbours left out")
    return notes


def _one(
    record: HoldRecord, stretch: Stretch, number: int, planned: float | None, known: Systematic
) -> Hold:
    rows = slice(stretch.start, stretch.stop)
    time = record.time[rows] - record.time[stretch.start]
    pressure = record.pressure[rows] - known.zero - known.drift * record.time[rows]
    isobaric = stretch.kind == "isobaric"
    level, controlled = (record.area[rows], pressure) if isobaric else (pressure, record.area[rows])
    unit = record.area_unit if isobaric else "mN/m"
    settling = settled_after(time, controlled)
    warnings: list[str] = []
    if settling > 0.5 * float(time[-1]):
        warnings.append("the set point is still settling halfway through the hold")
        settling = 0.5 * float(time[-1])
    fitted = _fit_settled(time, level, settling)
    chosen, duration = fitted.chosen, float(time[-1])
    laws = law_results(fitted.fits, planned or duration, unit)
    start = next(law for law in laws if law.name == chosen.name).parameters["y0"]
    if isobaric:
        settled = pressure[time >= fitted.settling]
        scatter = float(np.std(settled)) / np.sqrt(max(chosen.effective, 1.0))
        shown = Quantity.combine(
            float(settled.mean()), "mN/m", u_random=scatter, u_systematic=known.pressure_u
        )
    else:
        shown = Quantity.combine(
            start.value, "mN/m", u_random=start.u, u_systematic=known.pressure_u
        )
    drifting = "area" if isobaric else "pressure"
    warnings += _remarks(fitted, drifting, duration, planned)
    return Hold(
        number=number,
        kind=stretch.kind,
        from_s=float(record.time[stretch.start]),
        to_s=float(record.time[stretch.stop - 1]),
        settling_s=fitted.settling,
        pressure=shown,
        start_level=start,
        laws=laws,
        chosen=chosen.name,
        planned_time=planned,
        noise=chosen.noise,
        correlation_time=chosen.correlation_time,
        effective=chosen.effective,
        blocks=fitted.blocks,
        fits=fitted.fits,
        relative_u_systematic=known.relative_u(stretch.kind, start.value, record.area_unit),
        drift_u=known.rate_u(stretch.kind, start.value),
        # the film's own time starts somewhere within the settling: a rectangular distribution (GUM 4.3.7)
        arrival_u=fitted.settling / np.sqrt(12.0),
        warnings=tuple(warnings),
    )


def analyse_hold(
    record: HoldRecord,
    sheet: RunSheet | None = None,
    planned_time: float | None = None,
    *,
    check: CheckResult | None = None,
) -> HoldResult:
    """Fit the published laws of film loss to every hold of a record.

    Parameters
    ----------
    record : HoldRecord
        From `read_hold`.
    sheet : RunSheet, optional
        Its trough gives systematic uncertainties, its design the planned time when none is asked for.
    planned_time : float, optional
        Time the film is to last, s.
    check : CheckResult, optional
        Zero and drift of the pressure probe, from before the film was spread: subtracted from the pressure,
        their uncertainty carried.

    Returns
    -------
    HoldResult

    Notes
    -----
    Laws: `hold_models`; choice: `hold_fit`, `hold_laws`; averages: `hold_average`.
    """
    known_sheet = sheet if sheet is not None else RunSheet()
    planned = planned_time if planned_time is not None else planned_dipping_time(known_sheet)
    known = systematic(known_sheet, check)
    warnings = [*record.warnings, *known.warnings]
    holds: list[Hold] = []
    for stretch in record.stretches:
        if stretch.stop - stretch.start < _FEWEST_BLOCKS:
            warnings.append(
                f"a hold of {stretch.stop - stretch.start} rows at "
                f"{record.time[stretch.start]:.0f} s is too short to fit"
            )
            continue
        holds.append(_one(record, stretch, len(holds) + 1, planned, known))
    slowest = [hold for hold in holds if hold.kind == "isochoric"]
    if slowest and known.drift == 0.0 and known.drift_u == 0.0:
        share = 10.0 / min(hold.start_level.value for hold in slowest)
        warnings.append(
            f"the probe's drift is not known (no check): 0.1 mN/m/h would pass for {share:.1g} %/h"
        )
    settings = {
        "laws": [law.name for law in holds[0].fits] if holds else [],
        "choice": "simplest law within 2 of the least AICc; constant where the loss is within U",
        "check": check.path if check is not None else None,
    }
    return HoldResult(
        source=record.source,
        holds=tuple(holds),
        planned_time=planned,
        area_unit=record.area_unit,
        title=record.title,
        settings=settings,
        warnings=tuple(warnings),
    )
