"""Items of a check: each a value with its uncertainty, a limit, and a verdict."""

from __future__ import annotations

import math
from typing import Final

from isotherm.check_barrier import BarrierCheck
from isotherm.check_fit import BareFit
from isotherm.check_plate import two_point_calibration, wilhelmy_tension
from isotherm.check_result import CheckItem, verdict_of
from isotherm.constants import ZERO_CELSIUS
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet
from isotherm.water import surface_tension, surface_tension_slope

__all__ = [
    "bare_items",
    "barrier_items",
    "drift_item",
    "sheet_items",
    "tension_item",
    "water_tension",
]

# Common practice; no single source. The run sheet's [check] overrules each.
PRESSURE_RISE: Final = 0.2  # mN/m
ZERO: Final = 1.0  # mN/m
DRIFT_PER_HOUR: Final = 0.5  # mN/m/h
TENSION_TOLERANCE: Final = 0.5  # mN/m
GAIN_TOLERANCE: Final = 0.01  # 1
LINEARITY_TOLERANCE: Final = 0.005  # 1
WIDTH_TOLERANCE: Final = 0.01  # 1
_SHEET: Final = "run sheet"
_PRACTICE: Final = "common practice"
_WATER: Final = ("water", "h2o")


def _judged(
    name: str, value: Quantity, given: Quantity | None, practice: float, note: str, record: str
) -> CheckItem:
    limit = given.value if given is not None else practice
    origin = _SHEET if given is not None else _PRACTICE
    return CheckItem(name, value, limit, origin, verdict_of(value, limit), note, record)


def bare_items(fit: BareFit, area_unit: str, record: str, sheet: RunSheet) -> list[CheckItem]:
    """Zero and, where the barriers moved, the rise of one record of the bare subphase."""
    allowed = sheet.check
    items = [_judged("zero", fit.zero, allowed.zero, ZERO, "at the start of the record", record)]
    if fit.rise is not None:
        where = "no rise along the compression that noise would not explain"
        if fit.hinge is not None:
            hinge = Quantity(fit.hinge.value, fit.hinge.u, area_unit)
            where = f"begins at {str(hinge).replace('^2', '²')}"
        if not fit.separable:
            where += "; drift not told apart, counted as rise"
        items.append(
            _judged("pressure rise", fit.rise, allowed.pressure_rise, PRESSURE_RISE, where, record)
        )
    return items


def drift_item(drift: Quantity, still: bool, record: str, sheet: RunSheet) -> CheckItem:
    """Drift of the probe in one hour."""
    note = "barriers still" if still else "told apart from the rise: area and time ran differently"
    return _judged("drift", drift, sheet.check.drift_per_hour, DRIFT_PER_HOUR, note, record)


def water_tension(sheet: RunSheet, recorded: float | None) -> Quantity | None:
    """Tension of pure water at the subphase's temperature, mN/m; None for other liquids or unknown T."""
    subphase = sheet.subphase
    if subphase.liquid.strip().casefold() not in _WATER or subphase.additives:
        return None
    known = subphase.temperature
    celsius = known.value if known is not None else recorded
    if celsius is None or not math.isfinite(celsius):
        return None
    kelvin = celsius + ZERO_CELSIUS
    u = known.u * abs(surface_tension_slope(kelvin)) if known is not None and known.u else None
    return Quantity(surface_tension(kelvin), u, "mN/m")


def tension_item(
    name: str, tension: Quantity, water: Quantity | None, record: str, sheet: RunSheet
) -> CheckItem:
    """Clean subphase's tension against pure water's at the same temperature."""
    if water is None:
        note = "not compared: the subphase is not plain water, or its temperature is not known"
        return CheckItem(name, tension, None, "", "", note, record)
    parts = [q.u for q in (tension, water) if q.u is not None]
    difference = Quantity(
        tension.value - water.value, math.hypot(*parts) if parts else None, "mN/m"
    )
    note = f"{tension} against water's {water}"
    limit = sheet.check.tension_tolerance
    return _judged(f"{name} less water's", difference, limit, TENSION_TOLERANCE, note, record)


def sheet_items(sheet: RunSheet, water: Quantity | None) -> list[CheckItem]:
    """What the sheet's own readings say: tension as given, by the plate, and the probe's calibration."""
    check, items = sheet.check, []
    if sheet.subphase.tension is not None:
        items.append(
            tension_item("clean subphase tension", sheet.subphase.tension, water, _SHEET, sheet)
        )
    if check.force is not None and check.perimeter is not None:
        tension = wilhelmy_tension(check.force, check.perimeter, check.contact_angle)
        items.append(tension_item("tension by the plate", tension, water, _SHEET, sheet))
    points = (check.low_reading, check.low_true, check.high_reading, check.high_true)
    known = [point for point in points if point is not None]
    if len(known) == 4:
        found = two_point_calibration(*known)
        error = Quantity(found.gain.value - 1.0, found.gain.u, "1")
        note = f"true = {found.gain.value:.4f} × reading {found.offset.value:+.2f} mN/m"
        items.append(
            _judged("probe gain less 1", error, check.gain_tolerance, GAIN_TOLERANCE, note, _SHEET)
        )
    return items


def barrier_items(found: BarrierCheck, record: str, sheet: RunSheet) -> list[CheckItem]:
    """Straightness of area against barrier travel, and the width it implies."""
    items = [
        _judged(
            "area against barrier travel",
            found.departure,
            sheet.check.linearity_tolerance,
            LINEARITY_TOLERANCE,
            "largest departure from a straight line, part of the range",
            record,
        )
    ]
    given = sheet.trough.width
    if given is not None:
        ratio = found.width.value / given.value
        u = ratio * math.hypot(
            (found.width.u or 0) / found.width.value, (given.u or 0) / given.value
        )
        note = f"{found.width} from area and travel, {given} by the sheet"
        items.append(
            _judged("trough width ratio less 1", Quantity(ratio - 1.0, u, "1"), None, WIDTH_TOLERANCE,
                    note, record)
        )  # fmt: skip
    return items
