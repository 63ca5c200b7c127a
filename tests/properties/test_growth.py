"""Time grows no faster than the rows, and memory stays a few times the numbers, for whole analyses.

Processor time of the best of a few runs, alternately, and sizes a decade apart: what the machine does
besides changes both. Run with `-m slow` for 10^6 rows; growth of the reader is tested beside the reader.
"""

from __future__ import annotations

import gc
import time
import tracemalloc
from collections.abc import Callable
from typing import Any

import pytest
from benchmark_runs import BUILD_SHEET, build_log, film_trace

from isotherm.analysis import analyse
from transfer.analysis import analyse_log

SLACK = 1.5  # of linear growth: caches hold small runs and not large ones
MEMORY = 8.0  # times the numeric data
COLUMNS = {"isotherm": 3, "transfer": 4}  # of 8 bytes a row


def work(kind: str, rows: int) -> Callable[[], Any]:
    if kind == "isotherm":
        trace = film_trace(rows)
        return lambda: analyse(trace)
    log = build_log(rows)
    return lambda: analyse_log(log, BUILD_SHEET)


def seconds(*runs: Callable[[], Any], rounds: int) -> list[float]:
    best = [float("inf")] * len(runs)
    for _ in range(rounds):
        for i, run in enumerate(runs):
            begin = time.process_time()
            run()
            best[i] = min(best[i], time.process_time() - begin)
    return best


def peak_bytes(run: Callable[[], Any]) -> int:
    gc.collect()
    tracemalloc.start()
    try:
        run()
        return tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()


@pytest.mark.parametrize("kind", sorted(COLUMNS))
def test_ten_times_the_rows(kind: str) -> None:
    small, large = work(kind, 10_000), work(kind, 100_000)
    small()  # imports and first uses
    before, after = seconds(small, large, rounds=3)
    assert after <= 10.0 * SLACK * before, f"{before:.3f} s for 10^4 rows, {after:.3f} s for 10^5"


@pytest.mark.slow
@pytest.mark.parametrize("kind", sorted(COLUMNS))
def test_a_million_rows(kind: str) -> None:
    small, large = work(kind, 100_000), work(kind, 1_000_000)
    small()
    before, after = seconds(small, large, rounds=2)
    assert after <= 10.0 * SLACK * before, f"{before:.3f} s for 10^5 rows, {after:.3f} s for 10^6"


@pytest.mark.parametrize("kind", sorted(COLUMNS))
def test_memory(kind: str) -> None:
    rows = 200_000
    run = work(kind, rows)
    run()
    used = peak_bytes(run) / (8.0 * rows * COLUMNS[kind])
    assert used <= MEMORY, f"{used:.1f} times the numeric data"
