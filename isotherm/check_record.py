"""One record of the bare subphase, cleaned and condensed for the fit."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.hold_blocks import spikes
from isotherm.hold_read import surface_pressure
from isotherm.sheet import RunSheet
from isotherm.table import Table
from isotherm.trace_area import trough_area
from isotherm.trace_order import time_order

__all__ = ["BareRecord", "bare_record"]

FloatArray = NDArray[np.float64]

_BLOCKS = 96
_FEWEST_ROWS = 24
_FEWEST_TIMES = (
    8  # a level, a drift and a rise are told apart, with rows left to judge the noise by
)
# Barriers that change the area by less than this part of it stand still.
_MOVING = 0.05


@dataclass(frozen=True)
class BareRecord:
    """Block means of a record, in time order.

    path : of the record.  time : (m,) s, or row number where `timed` is False.
    area : (m,) `area_unit`, None where the barriers stand still or no area was recorded.
    pressure : (m,) mN/m.  has_tension : whether the export gave tension.
    """

    path: str
    time: FloatArray
    timed: bool
    area: FloatArray | None
    area_unit: str
    pressure: FloatArray
    has_tension: bool
    warnings: tuple[str, ...] = field(default=())


def _area(table: Table, sheet: RunSheet, warnings: list[str]) -> tuple[FloatArray | None, str]:
    if "area" in table.values:
        return table.values["area"], "cm^2"
    if "molecular_area" in table.values:
        return table.values["molecular_area"], "nm^2"
    if "barrier_position" not in table.values:
        return None, ""
    if sheet.trough.width is not None:
        return trough_area(table, sheet.trough, warnings), "cm^2"
    warnings.append("barrier positions without [trough] width: the area is not known")
    return None, ""


def bare_record(table: Table, sheet: RunSheet) -> BareRecord:
    """Clean and condense one record.

    Parameters
    ----------
    table : Table
        With pressure or tension; time and area where they were recorded.
    sheet : RunSheet
        Subphase and trough.

    Returns
    -------
    BareRecord

    Raises
    ------
    UpstrokeError
        When there is no pressure or tension, or too few rows.
    """
    pressure, notes = surface_pressure(table, sheet)
    warnings = [*table.warnings, *notes]
    area, unit = _area(table, sheet, warnings)
    given = table.values.get("time")
    timed = given is not None and bool(np.isfinite(given).any())
    time = given if given is not None and timed else np.arange(pressure.size, dtype=float)
    kept = np.isfinite(pressure) & np.isfinite(time)
    if area is not None:
        kept &= np.isfinite(area)
    time, pressure = time[kept], pressure[kept]
    area = None if area is None else area[kept]
    if time.size < _FEWEST_ROWS:
        raise UpstrokeError(
            f"{time.size} rows are too few to check a bare surface",
            where=table.source.path,
            remedy=f"record at least {_FEWEST_ROWS} rows",
        )
    sorting = time_order(time)
    if sorting.warning:
        warnings.append(sorting.warning)
    if sorting.order is not None:
        pressure = pressure[sorting.order]
        area = None if area is None else area[sorting.order]
    time = sorting.time
    good = ~spikes(pressure)
    if not good.all():
        warnings.append(f"{int((~good).sum())} rows far off their neighbours left out")
        time, pressure = time[good], pressure[good]
        area = None if area is None else area[good]
    edges = np.unique(np.linspace(0, time.size, min(time.size, _BLOCKS) + 1).astype(np.int64))
    counts = np.diff(edges)

    def means(values: FloatArray) -> FloatArray:
        return np.asarray(np.add.reduceat(values, edges[:-1]) / counts)

    times = means(time - time[0])
    fresh = np.concatenate([[True], np.diff(times) > 0])
    if int(fresh.sum()) < _FEWEST_TIMES:
        raise UpstrokeError(
            f"the rows have only {int(fresh.sum())} different times",
            where=table.source.path,
            remedy="check which column is the time, or export it with more digits",
        )
    areas = None if area is None else means(area)[fresh]
    if areas is not None and np.ptp(areas) <= _MOVING * float(np.abs(areas).max()):
        areas = None
    return BareRecord(
        path=table.source.path,
        time=times[fresh],
        timed=timed,
        area=areas,
        area_unit=unit,
        pressure=means(pressure)[fresh],
        has_tension="tension" in table.values,
        warnings=tuple(warnings),
    )
