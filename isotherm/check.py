"""Before the film: clean surface, zero and steadiness of the probe, truth of plate and barriers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from isotherm.check_barrier import check_barrier
from isotherm.check_fit import BareFit, fit_bare
from isotherm.check_items import (
    bare_items,
    barrier_items,
    drift_item,
    sheet_items,
    tension_item,
    water_tension,
)
from isotherm.check_record import BareRecord, bare_record
from isotherm.check_result import CheckCurve, CheckItem, CheckResult, load_check
from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet
from isotherm.table import Table, read_table

__all__ = ["CheckResult", "check_records", "load_check", "read_check"]


def _recorded_temperature(tables: Sequence[Table]) -> float | None:
    for table in tables:
        values = table.values.get("temperature")
        if values is not None and np.isfinite(values).any():
            return float(np.nanmedian(values))
    return None


def _clean_tension(zero: Quantity, sheet: RunSheet, water: Quantity | None) -> Quantity | None:
    """Tension the record itself shows: what the pressure was taken from, less the zero it reads."""
    reference = sheet.subphase.tension if sheet.subphase.tension is not None else water
    if reference is None:
        return None
    scale = sheet.trough.pressure_uncertainty
    u = float(np.hypot(zero.u or 0.0, scale.value if scale is not None else 0.0))
    return Quantity(reference.value - zero.value, u, "mN/m")


@dataclass(frozen=True)
class _Drift:
    rate: Quantity
    still: bool
    record: str


def _headline_drift(fits: list[tuple[BareRecord, BareFit]]) -> _Drift | None:
    """Drift of the best-known record: one with barriers still goes before one that was compressed."""
    known = [
        _Drift(fit.drift, record.area is None, record.path)
        for record, fit in fits
        if fit.drift is not None
    ]
    return min(known, key=lambda one: (not one.still, one.rate.u or np.inf), default=None)


def _headline_zero(fits: list[tuple[BareRecord, BareFit]]) -> Quantity | None:
    """Zero of the first compression, else of the first record."""
    for record, fit in fits:
        if record.area is not None:
            return fit.zero
    return fits[0][1].zero if fits else None


def check_records(tables: Sequence[Table], sheet: RunSheet | None = None) -> CheckResult:
    """Check surface, probe, plate and barrier before a film is spread.

    Parameters
    ----------
    tables : sequence of Table
        Records of the bare subphase: compressions, waits with the barriers still, barrier travel. May be
        empty when the sheet's own readings are all there is.
    sheet : RunSheet, optional
        Its [check] gives limits and readings; limits not given are common practice.

    Returns
    -------
    CheckResult

    Raises
    ------
    UpstrokeError
        When there is nothing to check.

    Notes
    -----
    Rise, drift and zero: `check_fit`. Plate and calibration: `check_plate`. Water: IAPWS R1-76(2014).
    """
    known = sheet if sheet is not None else RunSheet()
    water = water_tension(known, _recorded_temperature(tables))
    warnings: list[str] = []
    items: list[CheckItem] = []
    fits: list[tuple[BareRecord, BareFit]] = []
    curves: list[CheckCurve] = []
    for table in tables:
        path = table.source.path
        barrier = check_barrier(table)
        if "pressure" in table.values or "tension" in table.values:
            record = bare_record(table, known)
            warnings += [f"{path}: {text}" for text in record.warnings]
            fit = fit_bare(record.time, record.area, record.pressure, timed=record.timed)
            fits.append((record, fit))
            items += bare_items(fit, record.area_unit, path, known)
            tension = _clean_tension(fit.zero, known, water) if record.has_tension else None
            if tension is not None:
                items.append(tension_item("recorded tension", tension, water, path, known))
            hinge = fit.hinge
            curves.append(
                CheckCurve(
                    record=path,
                    time=record.time,
                    area=record.area,
                    area_unit=record.area_unit,
                    pressure=record.pressure,
                    fitted=fit.fitted,
                    hinge=Quantity(hinge.value, hinge.u, record.area_unit) if hinge else None,
                    timed=record.timed,
                )
            )
        elif barrier is None:
            raise UpstrokeError(
                "neither pressure nor barrier travel with area in this record",
                where=path,
                remedy="give a record of the bare subphase, or of the barriers",
            )
        if barrier is not None:
            items += barrier_items(barrier, path, known)
    drift = _headline_drift(fits)
    if drift is not None:
        items.append(drift_item(drift.rate, drift.still, drift.record, known))
    elif fits:
        warnings.append(
            "drift of the probe not found: record the bare subphase with the barriers still, or out and "
            "back, with time"
        )
    items += sheet_items(known, water)
    if not items:
        raise UpstrokeError(
            "nothing to check",
            remedy="give a record of the bare subphase, or readings in the sheet's [check]",
        )
    return CheckResult(
        items=tuple(items),
        zero_offset=_headline_zero(fits),
        drift_rate=drift.rate if drift is not None else None,
        sources=tuple(table.source for table in tables),
        curves=tuple(curves),
        title=known.title,
        warnings=tuple(warnings),
    )


def read_check(paths: Sequence[str | Path], sheet: RunSheet | None = None) -> CheckResult:
    """Read records of the bare subphase and check them (see `check_records`)."""
    known = sheet if sheet is not None else RunSheet()
    return check_records([read_table(path, known) for path in paths], known)
