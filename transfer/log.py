"""A dipping log as arrays in fixed units: what every transfer analysis starts from."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.sheet import RunSheet
from isotherm.source import Source
from isotherm.table import Table, read_table

__all__ = ["DippingLog", "log_from_table", "read_log"]

FloatArray = NDArray[np.float64]

# What each role is for, so that a missing column can be asked for in words.
_NEEDED = {
    "time": "time",
    "dipper_position": "position of the dipper",
    "area": "area of the trough",
    "pressure": "surface pressure",
}


@dataclass(frozen=True)
class DippingLog:
    """One dipping run, rows in file order; all arrays (n,).

    time : s. position : dipper reading, mm (depth or height, the sheet says which).
    area : trough area, cm^2. pressure : surface pressure, mN/m.
    """

    time: FloatArray
    position: FloatArray
    area: FloatArray
    pressure: FloatArray
    source: Source
    warnings: tuple[str, ...] = field(default=())


def read_log(path: str | Path, sheet: RunSheet) -> DippingLog:
    """Read a dipping log from a text export.

    Parameters
    ----------
    path : str or Path
        The export; columns time, dipper position, trough area (or barrier positions, with the trough's
        width in the sheet) and pressure.
    sheet : RunSheet
        Its column hints, and the trough's width.

    Returns
    -------
    DippingLog
        Rows as they stand in the file, in s, mm, cm^2 and mN/m.

    Raises
    ------
    UpstrokeError
        When a column is missing or the file cannot be read.
    """
    return log_from_table(read_table(path, sheet), sheet)


def log_from_table(table: Table, sheet: RunSheet) -> DippingLog:
    """Build a dipping log from a table already read.

    Parameters
    ----------
    table : Table
        Columns in fixed units.
    sheet : RunSheet
        Trough width, mm, for exports of barrier positions; tension of the clean subphase, mN/m, for
        exports of tension.

    Returns
    -------
    DippingLog

    Raises
    ------
    UpstrokeError
        When a role has no column.
    """
    values = dict(table.values)
    warnings = list(table.warnings)
    if "area" not in values and "barrier_position" in values and sheet.trough.width is not None:
        gap = values["barrier_position"]
        # two barriers: their readings are taken as distances from the middle, so the gap is the sum
        length = gap.sum(axis=1) if gap.ndim == 2 else gap
        values["area"] = np.asarray(length * sheet.trough.width.value / 100.0, dtype=np.float64)
        warnings.append("trough area computed from barrier positions times the trough's width")
    if "pressure" not in values and "tension" in values and sheet.subphase.tension is not None:
        values["pressure"] = sheet.subphase.tension.value - values["tension"]
        warnings.append("pressure computed from tension and the sheet's clean subphase")
    for role, words in _NEEDED.items():
        if role not in values:
            raise UpstrokeError(
                f"no column gives the {words}",
                where=table.source.path,
                remedy=f'name it in the sheet: [[columns]] role = "{role}", header = "..."',
            )
    return DippingLog(
        time=values["time"],
        position=values["dipper_position"],
        area=values["area"],
        pressure=values["pressure"],
        source=table.source,
        warnings=tuple(warnings),
    )
