"""Put a dipping log in order: missing cells, repeated rows, clocks that jump back."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from transfer.log import DippingLog

__all__ = ["MIN_ROWS", "clean_log"]

FloatArray = NDArray[np.float64]

# Fewest rows that can hold a dwell, a stroke and a dwell with two rows to judge each.
MIN_ROWS = 8
# Backward steps up to this many are separate jumps of the clock; more means rows are out of order.
_MAX_JUMPS = 3


def clean_log(log: DippingLog) -> DippingLog:
    """Return `log` with finite rows in rising time, and say what was done.

    Parameters
    ----------
    log : DippingLog
        Arrays (n,) in file order; never changed.

    Returns
    -------
    DippingLog
        Rows with missing cells and repeated rows dropped, time strictly rising, s.

    Raises
    ------
    UpstrokeError
        When a column is all missing or constant where it may not be, or too few rows are left.
    """
    warnings = list(log.warnings)
    where = log.source.path
    columns = {
        "time": np.asarray(log.time, dtype=np.float64),
        "position": np.asarray(log.position, dtype=np.float64),
        "area": np.asarray(log.area, dtype=np.float64),
        "pressure": np.asarray(log.pressure, dtype=np.float64),
    }
    rows = columns["time"].size
    for name, column in columns.items():
        if column.shape != (rows,):
            raise UpstrokeError(
                f"column {name} has {column.size} rows, time has {rows}", where=where
            )
        if rows and not np.isfinite(column).any():
            raise UpstrokeError(f"column {name} holds no number", where=where)
    good = np.logical_and.reduce([np.isfinite(c) for c in columns.values()])
    if rows - int(good.sum()):
        warnings.append(f"{rows - int(good.sum())} rows with a missing cell were dropped")
    bad_area = good & (columns["area"] <= 0)
    if bad_area.any():
        warnings.append(
            f"{int(bad_area.sum())} rows with a trough area of zero or less were dropped"
        )
        good &= ~bad_area
    columns = {name: column[good] for name, column in columns.items()}

    order, note = _order(columns["time"])
    if note.startswith("shift"):
        columns["time"] = _unjump(columns["time"])
    elif note:
        columns = {name: column[order] for name, column in columns.items()}
    if note:
        warnings.append(note.removeprefix("shift:").strip())

    columns, dropped = _drop_repeats(columns)
    if dropped:
        warnings.append(f"{dropped} repeated rows were dropped")
    columns["time"], spread = _spread_equal_times(columns["time"])
    if spread:
        warnings.append(
            f"{spread} rows share a time stamp with the row before; spread evenly between stamps"
        )
    if columns["time"].size < MIN_ROWS:
        raise UpstrokeError(
            f"{columns['time'].size} usable rows, at least {MIN_ROWS} are needed", where=where
        )
    return DippingLog(
        time=columns["time"],
        position=columns["position"],
        area=columns["area"],
        pressure=columns["pressure"],
        source=log.source,
        warnings=tuple(warnings),
    )


def _order(time: FloatArray) -> tuple[NDArray[np.intp], str]:
    """Return the row order to use, and a note: "" nothing to do, "shift: ..." or a text for sorted rows."""
    steps = np.diff(time)
    back = np.flatnonzero(steps < 0)
    order = np.argsort(time, kind="stable")
    if back.size == 0:
        return order, ""
    if back.size > _MAX_JUMPS:
        return order, f"rows were out of order in time ({back.size} backward steps); sorted by time"
    # whole pieces in the wrong order leave no overlap once sorted; a clock that was set back does
    starts = np.concatenate([[0], back + 1])
    ends = np.concatenate([back, [time.size - 1]])
    pieces = sorted(zip(time[starts].tolist(), time[ends].tolist(), strict=True))
    overlap = any(later[0] <= earlier[1] for earlier, later in pairwise(pieces))
    if not overlap:
        return order, "parts of the log were in the wrong order in time; sorted by time"
    jumps = ", ".join(f"{-steps[i]:.6g} s after row {i + 1}" for i in back)
    return order, (
        f"shift: the clock jumps back ({jumps}); later times were moved on so that it runs through"
    )


def _unjump(time: FloatArray) -> FloatArray:
    """Move every stretch after a backward jump on, so that it follows one usual step later."""
    steps = np.diff(time)
    usual = float(np.median(steps[steps > 0])) if (steps > 0).any() else 1.0
    steps = np.where(steps < 0, usual, steps)
    return np.concatenate([time[:1], time[0] + np.cumsum(steps)])


def _drop_repeats(columns: dict[str, FloatArray]) -> tuple[dict[str, FloatArray], int]:
    """Drop rows equal to the row before in every column."""
    same = np.logical_and.reduce([np.diff(c) == 0 for c in columns.values()])
    if not same.any():
        return columns, 0
    keep = np.concatenate([[True], ~same])
    return {name: c[keep] for name, c in columns.items()}, int(same.sum())


def _spread_equal_times(time: FloatArray) -> tuple[FloatArray, int]:
    """Spread rows that share a stamp evenly up to the next stamp (clocks written in whole seconds)."""
    same = np.diff(time) == 0
    if not same.any():
        return time, 0
    first = np.flatnonzero(np.concatenate([[True], ~same]))
    counts = np.diff(np.concatenate([first, [time.size]]))
    stamps = time[first]
    gaps = np.diff(stamps)
    last = float(np.median(gaps)) if gaps.size else 1.0
    gaps = np.concatenate([gaps, [last]])
    # a long silence after a stamp is a gap in the log, not room to spread into
    gaps = np.minimum(gaps, last if last > 0 else 1.0)
    within = np.arange(time.size) - np.repeat(first, counts)
    return time + within * np.repeat(gaps / counts, counts), int(same.sum())
