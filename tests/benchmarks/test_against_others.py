"""Against what a person would use instead, in one run:

    python -m pytest tests/benchmarks --benchmark-only --benchmark-columns=min,median,rounds

Every group compares this project with a general library on the same data and on the same machine. A library
that finds knees says nothing of phases, areas or uncertainty; it is the nearest thing a person would run.
"""

from __future__ import annotations

import warnings
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from benchmark_runs import BUILD_SHEET, FILM_SHEET, build_log, export, film_trace

from isotherm.analysis import analyse
from isotherm.table import read_table
from isotherm.trace_read import read_trace
from transfer.analysis import analyse_log

MILLION = 1_000_000
ROWS = 3000


@pytest.fixture(scope="module")
def million(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return export(tmp_path_factory.mktemp("million"), MILLION)


@pytest.fixture(scope="module")
def small(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return export(tmp_path_factory.mktemp("small"), ROWS)


@pytest.mark.benchmark(group="reading 1,000,000 rows", min_rounds=3)
def test_read_ours(benchmark: Any, million: Path) -> None:
    table = benchmark(read_table, million)
    assert table.source.rows == MILLION


@pytest.mark.benchmark(group="reading 1,000,000 rows", min_rounds=3)
def test_read_pandas(benchmark: Any, million: Path) -> None:
    import pandas as pd

    assert len(benchmark(pd.read_csv, million, engine="c")) == MILLION


@pytest.mark.benchmark(group="a compression of 3,000 rows")
def test_analyse_ours(benchmark: Any) -> None:
    result = benchmark(analyse, film_trace(ROWS))
    assert result.branches[0].collapse is not None


@pytest.mark.benchmark(group="a compression of 3,000 rows")
def test_analyse_by_a_scipy_script(benchmark: Any) -> None:
    """Smooth and differentiate by Savitzky and Golay, take extremes: no knees, no uncertainty."""
    from scipy.signal import find_peaks, savgol_filter

    trace = film_trace(ROWS)

    def script() -> tuple[float, int]:
        slope = savgol_filter(trace.pressure, 51, 3, deriv=1)
        modulus = -trace.area * slope / np.gradient(trace.area)
        return float(modulus.max()), len(find_peaks(np.abs(np.diff(modulus)))[0])

    assert benchmark(script)[0] > 0


@pytest.mark.benchmark(group="a compression of 3,000 rows", min_rounds=1, max_time=0.1)
def test_analyse_by_pwlf(benchmark: Any) -> None:
    pwlf = pytest.importorskip("pwlf")
    trace = film_trace(ROWS)

    def fit() -> Any:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return pwlf.PiecewiseLinFit(-trace.area, trace.pressure).fitfast(4)

    assert len(benchmark(fit)) == 5


@pytest.mark.benchmark(group="a compression of 3,000 rows", min_rounds=1, max_time=0.1)
def test_analyse_by_piecewise_regression(benchmark: Any) -> None:
    fitter = pytest.importorskip("piecewise_regression")
    trace = film_trace(ROWS)

    def fit() -> Any:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return fitter.Fit(-trace.area, trace.pressure, n_breakpoints=3, n_boot=0)

    benchmark(fit)


@pytest.mark.benchmark(group="a compression of 3,000 rows", min_rounds=1, max_time=0.1)
def test_analyse_by_ruptures(benchmark: Any) -> None:
    """Plain change points in slope, told how many there are, every fifth row a candidate."""
    import ruptures as rpt

    trace = film_trace(ROWS)
    line = np.column_stack([trace.pressure, trace.area, np.ones(ROWS)])

    def search() -> list[int]:
        return rpt.BottomUp(model="linear", jump=5).fit(line).predict(n_bkps=3)

    assert len(benchmark(search)) == 4


@pytest.mark.benchmark(group="1,000,000 rows", min_rounds=2)
def test_million_isotherm(benchmark: Any) -> None:
    trace = film_trace(MILLION)
    assert benchmark(analyse, trace).branches


@pytest.mark.benchmark(group="1,000,000 rows", min_rounds=2)
def test_million_transfer(benchmark: Any) -> None:
    log = build_log(MILLION)
    assert len(benchmark(analyse_log, log, BUILD_SHEET).strokes) == 8


@pytest.mark.benchmark(group="1,000,000 rows", min_rounds=2)
def test_million_savitzky_golay(benchmark: Any) -> None:
    from scipy.signal import savgol_filter

    trace = film_trace(MILLION)
    benchmark(savgol_filter, trace.pressure, 501, 3, deriv=1)


@pytest.mark.benchmark(group="from file to result, 3,000 rows")
def test_file_to_result(benchmark: Any, small: Path) -> None:
    assert benchmark(lambda: analyse(read_trace(small, FILM_SHEET))).branches


@pytest.mark.benchmark(group="a build of 10,000 rows")
def test_transfer(benchmark: Any) -> None:
    log = build_log(10_000)
    assert len(benchmark(analyse_log, log, BUILD_SHEET).strokes) == 8
