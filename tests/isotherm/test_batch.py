"""Many runs in several processes."""

import itertools
from collections.abc import Iterator
from pathlib import Path

import batch_work
import numpy as np
import pytest
from series_films import Lipid, result_of
from series_traces import volmer_trace

from isotherm.batch import run_batch
from isotherm.batch_row import error_row, summary_columns, summary_row


def write_trace(path: Path, seed: int, rows: int = 400) -> str:
    trace = volmer_trace(np.random.default_rng(seed), rows=rows)
    lines = [f"{a:.5f},{p:.4f}" for a, p in zip(trace.area, trace.pressure, strict=True)]
    path.write_text("\n".join(["Mma (nm^2),Pressure (mN/m)", *lines]) + "\n")
    return str(path)


@pytest.mark.parametrize("jobs", [1, 2])
def test_order_is_kept_and_a_bad_item_is_only_its_own_fault(jobs: int) -> None:
    outcomes = list(run_batch(range(20), batch_work.square, jobs=jobs))
    assert [o.number for o in outcomes] == list(range(1, 21))
    assert [o.result for o in outcomes if o.error is None] == [
        i * i for i in range(20) if i not in (3, 5)
    ]
    assert outcomes[3].error == "3: three is not allowed"
    assert outcomes[5].error is not None
    assert "ValueError: five is odd" in outcomes[5].error


def test_an_item_that_kills_its_process_is_named_and_the_rest_done() -> None:
    outcomes = list(run_batch(range(60), batch_work.deadly, jobs=2))
    assert [o.item for o in outcomes if o.error] == [7]
    assert "killed" in str(outcomes[7].error)
    assert [o.result for o in outcomes if o.error is None] == [i + 1 for i in range(60) if i != 7]


def test_items_are_taken_only_a_little_ahead() -> None:
    taken = 0

    def endless() -> Iterator[int]:
        nonlocal taken
        for i in itertools.count():
            taken += 1
            yield i

    running = run_batch(endless(), batch_work.deadly, jobs=2)
    assert next(running).result == 1
    assert taken <= 2 * 4 * 8
    running.close()


def test_workers_use_one_thread_each(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("OMP_NUM_THREADS", raising=False)
    told = {o.result for o in run_batch(range(4), batch_work.threads, jobs=2)}
    assert told == {"1"}


def test_missing_file_is_one_line(tmp_path: Path) -> None:
    good = write_trace(tmp_path / "good.csv", 1)
    outcomes = list(run_batch([good, str(tmp_path / "none.csv"), good], batch_work.summarise))
    assert [o.error is None for o in outcomes] == [True, False, True]
    assert "\n" not in str(outcomes[1].error)


def test_rows_are_the_same_at_any_number_of_jobs(tmp_path: Path) -> None:
    files = [write_trace(tmp_path / f"{i}.csv", i) for i in range(3)]
    files.insert(1, str(tmp_path / "absent.csv"))
    one, two = (
        [
            (o.number, o.item, o.result, o.error)
            for o in run_batch(files, batch_work.summarise, jobs=j)
        ]
        for j in (1, 2)
    )
    assert one == two


def test_every_row_has_the_header() -> None:
    at = (10.0, 30.0, 99.0)
    header = summary_columns(at)
    for lipid in (Lipid(), Lipid(transition=None, collapse=None)):
        row = summary_row(result_of(lipid), at)
        assert tuple(row) == header
        assert row["area_at_99"] is None
    assert tuple(error_row("a.csv", "unreadable", at)) == header


def test_a_row_holds_what_the_result_says() -> None:
    result = result_of(Lipid())
    row = summary_row(result, (30.0,))
    collapse = result.headline.collapse
    assert collapse is not None
    assert row["collapse_pressure"] == collapse.pressure.value
    assert row["u_collapse_pressure"] == collapse.pressure.u
    assert row["coexistences"] == 1
    assert row["kinks"] == 0
