"""Read a record of film stability and find the holds in it."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import ZERO_CELSIUS
from isotherm.errors import UpstrokeError
from isotherm.hold_segments import Stretch, find_stretches
from isotherm.sheet import RunSheet
from isotherm.source import Source
from isotherm.table import Table, read_table
from isotherm.trace_area import trough_area
from isotherm.trace_order import time_order
from isotherm.water import surface_tension

__all__ = ["HoldRecord", "hold_record", "read_hold", "surface_pressure"]

FloatArray = NDArray[np.float64]

_NEEDS = ("time", "area|molecular_area|barrier_position", "pressure|tension")
_FEWEST_ROWS = 60  # a dozen blocks of a few rows: fewer cannot tell the laws apart
# mN/m. Surface pressure cannot exceed the tension of the liquid the film lies on, and that of mercury, the
# largest near room temperature, is about 486 mN/m (handbook value, from memory).
_HIGHEST_PRESSURE = 600.0
_AGE = 100.0  # times what eight in ten rows span: no hold has readings so far off


@dataclass(frozen=True)
class HoldRecord:
    """A record of area and pressure against time, with its holds.

    time : (n,) s.  area : (n,) in `area_unit`, "cm^2" (trough) or "nm^2" (per molecule).
    pressure : (n,) mN/m, as recorded.  stretches : the holds, in time order.
    """

    source: Source
    time: FloatArray
    area: FloatArray
    area_unit: str
    pressure: FloatArray
    stretches: tuple[Stretch, ...]
    title: str = ""
    warnings: tuple[str, ...] = field(default=())


def surface_pressure(table: Table, sheet: RunSheet) -> tuple[FloatArray, tuple[str, ...]]:
    """Surface pressure of every row, mN/m, with what was assumed for it.

    Parameters
    ----------
    table : Table
        With a `pressure` or a `tension` column.
    sheet : RunSheet
        Its subphase's tension, or temperature, gives Pi = gamma0 - gamma.

    Returns
    -------
    (n,) array, tuple of str
        NaN where a cell is missing; warnings.

    Raises
    ------
    UpstrokeError
        When the table has neither column, or a tension but nothing to take it from.
    """
    if "pressure" in table.values:
        return table.values["pressure"], ()
    where = table.source.path
    if "tension" not in table.values:
        raise UpstrokeError(
            "no column of surface pressure or tension",
            where=where,
            remedy='name it in the sheet\'s [[columns]] (role = "pressure")',
        )
    tension = table.values["tension"]
    if sheet.subphase.tension is not None:
        return sheet.subphase.tension.value - tension, ()
    liquid = sheet.subphase.liquid
    if liquid and "water" not in liquid.casefold():
        raise UpstrokeError(
            f"tension recorded, but that of clean '{liquid}' is not known",
            where=where,
            remedy="give [subphase] tension as measured on the clean surface",
        )
    if sheet.subphase.temperature is not None:
        celsius = sheet.subphase.temperature.value
    elif "temperature" in table.values:
        celsius = float(np.nanmedian(table.values["temperature"]))
    else:
        raise UpstrokeError(
            "tension recorded, but the clean subphase's is not known",
            where=where,
            remedy="give [subphase] tension, or its temperature for pure water",
        )
    clean = surface_tension(celsius + ZERO_CELSIUS)
    note = f"pressure taken from pure water's tension at {celsius:.1f} degC, {clean:.2f} mN/m"
    return clean - tension, (note,)


def _area(table: Table, sheet: RunSheet, warnings: list[str]) -> tuple[FloatArray, str]:
    """Area column and its unit: trough area where there is one, else area per molecule."""
    if "area" in table.values:
        return table.values["area"], "cm^2"
    if "molecular_area" in table.values:
        return table.values["molecular_area"], "nm^2"
    return trough_area(table, sheet.trough, warnings), "cm^2"


def hold_record(table: Table, sheet: RunSheet) -> HoldRecord:
    """Make a record from a table and find its holds.

    Parameters
    ----------
    table : Table
        With time, area (or molecular area, or barrier position) and pressure (or tension).
    sheet : RunSheet
        Run sheet; may be empty.

    Returns
    -------
    HoldRecord

    Raises
    ------
    UpstrokeError
        When a column is missing, or the record holds nothing.
    """
    where = table.source.path
    for wanted in _NEEDS:
        if not any(role in table.values for role in wanted.split("|")):
            raise UpstrokeError(
                f"no column of {wanted.replace('|', ' or ').replace('_', ' ')}",
                where=where,
                remedy=f'name it in the sheet\'s [[columns]] (role = "{wanted.split("|")[0]}")',
            )
    warnings = list(table.warnings)
    pressure, notes = surface_pressure(table, sheet)
    area, unit = _area(table, sheet, warnings)
    time = table.values["time"]
    warnings += notes
    kept = np.isfinite(time) & np.isfinite(area) & np.isfinite(pressure)
    if not kept.all():
        warnings.append(f"{int((~kept).sum())} rows with a missing cell left out")
    beyond = kept & (np.abs(pressure) > _HIGHEST_PRESSURE)
    if beyond.any():
        warnings.append(f"{int(beyond.sum())} rows of a pressure no film has left out")
        kept &= ~beyond
    _check_areas(area, kept, table)
    time, area, pressure = time[kept], area[kept], pressure[kept]
    sorting = time_order(time)
    if sorting.warning:
        warnings.append(sorting.warning)
    if sorting.order is not None:
        area, pressure = area[sorting.order], pressure[sorting.order]
    time = sorting.time
    fresh = np.concatenate([[True], np.diff(time) > 0]) if time.size else np.ones(0, dtype=bool)
    if not fresh.all():
        warnings.append(f"{int((~fresh).sum())} rows whose time repeats the row before left out")
        time, area, pressure = time[fresh], area[fresh], pressure[fresh]
    near = _one_age(time)
    if not near.all():
        apart = int((~near).sum())
        rows = "1 row" if apart == 1 else f"{apart} rows"
        warnings.append(f"{rows} whose time stands apart from all others left out")
        time, area, pressure = time[near], area[near], pressure[near]
    if time.size < _FEWEST_ROWS:
        raise UpstrokeError(
            f"{time.size} rows are too few to judge a hold",
            where=where,
            remedy=f"give a record of at least {_FEWEST_ROWS} rows",
        )
    stretches = find_stretches(time, area, pressure)
    if not stretches:
        raise UpstrokeError(
            "no hold found: neither pressure nor area keeps still under a film for long enough",
            where=where,
            remedy="give a record of a film held at a pressure or at an area",
        )
    return HoldRecord(
        table.source, time, area, unit, pressure, stretches, sheet.title, tuple(warnings)
    )


def _check_areas(area: FloatArray, kept: NDArray[np.bool_], table: Table) -> None:
    """Refuse areas that are none."""
    bad = np.flatnonzero(kept & (area <= 0))
    if bad.size:
        rows = "1 row" if bad.size == 1 else f"{bad.size} rows"
        raise UpstrokeError(
            f"{rows} with an area not above zero",
            where=f"{table.source.path}, line {int(table.lines[bad[0]])}",
            remedy="check the zero of the barriers and which column is the area",
        )


def _one_age(time: FloatArray) -> NDArray[np.bool_]:
    """Rows but those whose time is an age before or after nearly all others, as a reset clock writes it.

    time : (n,) s.
    """
    low, middle, high = np.percentile(time, [10.0, 50.0, 90.0]) if time.size else (0.0, 0.0, 0.0)
    return np.asarray(np.abs(time - middle) <= _AGE * (high - low))


def read_hold(path: str | Path, sheet: RunSheet | None = None) -> HoldRecord:
    """Read a record of film stability and find its holds.

    Parameters
    ----------
    path : str or Path
        Export with time, area and pressure.
    sheet : RunSheet, optional
        Run sheet.

    Returns
    -------
    HoldRecord

    Raises
    ------
    UpstrokeError
        When the file cannot be read, a column is missing, or it holds nothing.
    """
    known = sheet if sheet is not None else RunSheet()
    return hold_record(read_table(path, known, needs=_NEEDS), known)
