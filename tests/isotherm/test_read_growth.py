"""Reading grows no faster than the rows, in time and in memory."""

from __future__ import annotations

import time
import tracemalloc
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from isotherm.table import read_table
from isotherm.trace_read import read_trace


def _export(path: Path, rows: int) -> Path:
    rng = np.random.default_rng(8)
    at = np.arange(rows)
    columns = np.column_stack(
        [at * 0.5, 1.0 - 0.8 * at / rows, 30.0 * at / rows + rng.normal(0.0, 0.05, rows)]
    )
    header = "Time (s),Area per molecule (nm^2),Pressure (mN/m)"
    np.savetxt(
        path, columns, fmt=["%.1f", "%.6f", "%.3f"], delimiter=",", header=header, comments=""
    )
    return path


def _least(work: Callable[[], object], times: int) -> float:
    """Least processor time of several goes, s: what else the machine does falls out."""
    taken = []
    for _ in range(times):
        begin = time.process_time()
        work()
        taken.append(time.process_time() - begin)
    return min(taken)


@pytest.mark.parametrize("read", [read_table, read_trace], ids=lambda f: f.__name__)
def test_time_grows_no_faster_than_rows(read: Callable[[Path], object], tmp_path: Path) -> None:
    import pandas  # noqa: F401 - its own import is not what is measured

    few, many = _export(tmp_path / "few.csv", 20_000), _export(tmp_path / "many.csv", 200_000)
    read(few)
    # ten times the rows; half as much again for the caches a larger table outgrows
    assert _least(lambda: read(many), 3) < 15.0 * _least(lambda: read(few), 5)


@pytest.mark.parametrize("rows", [2_000, 20_000, 200_000])
def test_memory_is_a_few_times_the_numbers(rows: int, tmp_path: Path) -> None:
    import pandas  # noqa: F401

    path = _export(tmp_path / "run.csv", rows)
    read_trace(path)
    tracemalloc.start()
    try:
        read_trace(path)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    numbers = 3 * 8 * rows
    # small exports are read without pandas, cell by cell
    assert peak < (16.0 if rows < 10_000 else 8.0) * numbers + 2e6
