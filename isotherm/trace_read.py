"""From an export and its run sheet to a trace: fixed units, time order, nothing missing."""

from __future__ import annotations

from pathlib import Path
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.sheet import RunSheet
from isotherm.table import Table, read_table
from isotherm.trace import Trace
from isotherm.trace_area import areas_of
from isotherm.trace_order import time_order
from isotherm.trace_pressure import pressures_of

__all__ = ["FEWEST_ROWS", "read_trace", "trace_from_table"]

FloatArray = NDArray[np.float64]

# A straight line through each of two branches, a knee between them and a spread to judge it by.
FEWEST_ROWS: Final = 8
_LEAST_AREA: Final = (
    1e-6  # nm^2; an atom covers some 0.01: less is none, and its logarithm means nothing
)
_NEEDS: Final = ("molecular_area|area|barrier_position", "pressure|tension")


def read_trace(
    path: str | Path, sheet: RunSheet | None = None, *, needs: tuple[str, ...] = ()
) -> Trace:
    """Read one export as a trace.

    Parameters
    ----------
    path : str or Path
        The export.
    sheet : RunSheet, optional
        Film, subphase and trough; without it the export must give area per molecule.
    needs : tuple of str
        Roles needed besides area and pressure, such as `"time"`.

    Raises
    ------
    UpstrokeError
        When the export cannot be read, lacks a role, or its readings cannot be those of an isotherm.
    """
    known = sheet if sheet is not None else RunSheet()
    return trace_from_table(read_table(path, known, needs=(*_NEEDS, *needs)), known)


def trace_from_table(table: Table, sheet: RunSheet) -> Trace:
    """Build the trace of a table that has an area and a pressure or tension (see `read_trace`)."""
    where = table.source.path
    warnings = list(table.warnings)
    areas = areas_of(table, sheet)
    pressure = pressures_of(table, sheet)
    warnings += [*areas.warnings, *pressure.warnings]
    time = table.values.get("time")
    if time is not None and not np.isfinite(time).any():
        warnings.append("the time column holds no time and is not used")
        time = None
    good = np.isfinite(areas.molecular) & np.isfinite(pressure.values)
    if time is not None:
        good &= np.isfinite(time)
    keep = np.flatnonzero(good) if not good.all() else None
    count = len(good) if keep is None else len(keep)
    if keep is not None:
        lost = len(good) - count
        rows = "1 row" if lost == 1 else f"{lost} rows"
        warnings.append(f"{rows} of {len(good)} without a finite area, pressure or time dropped")
    if count < FEWEST_ROWS:
        raise UpstrokeError(
            f"{count} usable rows",
            where=where,
            remedy=f"an analysis needs at least {FEWEST_ROWS} rows with area and pressure",
        )
    order = keep
    if time is not None:
        sorting = time_order(time if keep is None else time[keep])
        time = sorting.time
        if sorting.warning:
            warnings.append(sorting.warning)
        if sorting.order is not None:
            order = sorting.order if keep is None else keep[sorting.order]

    def pick(values: FloatArray | None) -> FloatArray | None:
        return values if values is None or order is None else values[order]

    area, readings = pick(areas.molecular), pick(pressure.values)
    if area is None or readings is None:  # unreachable, for the type checker
        raise UpstrokeError("no area or pressure", where=where)
    _check_range(area, readings, table, order)
    if pressure.gamma is not None and readings.max() > pressure.gamma:
        above = int(np.count_nonzero(readings > pressure.gamma))
        rows = "1 pressure reading is" if above == 1 else f"{above} pressure readings are"
        warnings.append(
            f"{rows} above the tension of the clean subphase ({pressure.gamma:.1f} mN/m; highest "
            f"{readings.max():.1f}), which no film can reach: check zero and scale of the probe"
        )
    return Trace(
        area=area,
        pressure=readings,
        source=table.source,
        time=time,
        trough_area=pick(areas.trough),
        temperature=pick(table.values.get("temperature")),
        potential=pick(table.values.get("potential")),
        area_relative_u=areas.relative_u,
        pressure_u=pressure.u,
        subphase_tension=pressure.gamma,
        kelvin=pressure.kelvin,
        title=sheet.title or sheet.film.name,
        warnings=tuple(warnings),
    )


def _check_range(
    area: FloatArray, pressure: FloatArray, table: Table, order: NDArray[np.intp] | None
) -> None:
    """Refuse what cannot be an isotherm: areas not above zero, constant area or pressure."""
    where = table.source.path
    lowest = float(area.min())
    if lowest <= _LEAST_AREA:
        row = int(np.argmin(area))
        line = int(table.lines[row if order is None else order[row]])
        count = int(np.count_nonzero(area <= _LEAST_AREA))
        rows = "1 row" if count == 1 else f"{count} rows"
        raise UpstrokeError(
            f"{rows} with an area not above zero",
            where=f"{where}, line {line}",
            remedy="check the zero of the barriers and which column is the area",
        )
    for name, values in (("area", area), ("pressure", pressure)):
        if float(np.ptp(values)) <= 1e-12 * float(np.abs(values).max()):
            raise UpstrokeError(
                f"the {name} is the same in all {len(values)} rows",
                where=where,
                remedy=f"check which column is the {name}, or record a compression",
            )
