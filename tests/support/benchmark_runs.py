"""Runs of any length for benchmarks: an invented acid and a build, as arrays and as exports."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np
from isotherm_traces import acid

from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet
from isotherm.source import Source
from isotherm.trace import Trace
from transfer.log import DippingLog

__all__ = ["BUILD_SHEET", "FILM_SHEET", "build_log", "export", "film_trace"]

FILM_SHEET: RunSheet = parse_sheet(
    '[film]\nmolar_mass = "300 g/mol"\nconcentration = "1 mg/mL"\nvolume = "25 µL"\n'
)
BUILD_SHEET: RunSheet = parse_sheet(
    '[substrate]\nshape = "plate"\nwidth = "20.0 ± 0.1 mm"\nthickness = "1.00 ± 0.02 mm"\n'
    '[dipping]\npressure = "30 mN/m"\nposition_reads = "depth"\nsurface_at = "5.0 ± 0.05 mm"\n'
    'modulus = "200 ± 10 mN/m"\n'
)


@lru_cache(maxsize=4)
def film_trace(rows: int) -> Trace:
    """A compression of `rows` rows: gaseous, condensed, solid, collapsed."""
    return acid(rows)


def export(folder: Path, rows: int) -> Path:
    """Write time, trough area and pressure as a comma-separated export; returns its path."""
    path = folder / f"run-{rows}.csv"
    trace = film_trace(rows)
    table = np.column_stack([np.arange(rows) * 0.5, trace.area * 500.0, trace.pressure])
    with path.open("w", encoding="utf-8") as file:
        file.write("Time (s),Trough area (cm^2),Surface pressure (mN/m)\n")
        np.savetxt(file, table, fmt="%.2f,%.4f,%.3f")
    return path


@lru_cache(maxsize=4)
def build_log(rows: int) -> DippingLog:
    """A build of eight strokes written in `rows` rows."""
    random = np.random.default_rng(4)
    time, position = [0.0], [25.0]
    for stroke in range(8):
        after = 2.0 if stroke % 2 == 0 else 25.0
        time += [time[-1] + 120.0, time[-1] + 235.0]
        position += [position[-1], after]
    time, position = [*time, time[-1] + 120.0], [*position, position[-1]]
    grid = np.linspace(0.0, time[-1], rows)
    depth = np.interp(grid, time, position)
    wet = 0.42 * np.clip(depth - 5.0, 0.0, None)
    area = 200.0 - np.cumsum(np.abs(np.diff(wet, prepend=wet[0])))
    return DippingLog(
        grid,
        depth + random.normal(0.0, 0.002, rows),
        area + random.normal(0.0, 0.01, rows),
        30.0 + random.normal(0.0, 0.03, rows),
        Source("build.csv", "", rows),
    )
