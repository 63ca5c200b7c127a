"""`upstroke batch`: one row a run, a bad file named and left behind."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pytest
from series_exports import write_run
from series_films import Lipid

from cli.main import run


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    runs = tmp_path / "runs"
    runs.mkdir()
    for number in (1, 2, 3):
        write_run(runs, f"run{number}", Lipid(), seed=number, rows=500)
    (runs / "run2b.txt").write_text("no numbers here\n")
    return runs


def test_rows_are_in_order_and_the_same_at_any_number_of_jobs(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    said = []
    for jobs in ("1", "2"):
        assert run(["batch", str(folder), "--json", "-", "--jobs", jobs]) == 1
        captured = capsys.readouterr()
        assert captured.err.count("\n") == 1
        assert "run2b.txt" in captured.err
        said.append(captured.out)
    assert said[0] == said[1]
    payload = json.loads(said[0])
    assert payload["schema"] == "upstroke.batch/1"
    assert payload["failed"] == 1
    names = [Path(row["path"]).name for row in payload["runs"]]
    assert names == ["run1.txt", "run2.txt", "run2b.txt", "run3.txt"]


def test_csv_and_table(folder: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "run2b.txt").unlink()
    out = tmp_path / "runs.csv"
    assert run(["batch", str(folder), "--csv", str(out), "--at", "20"]) == 0
    text = capsys.readouterr().out
    assert max(len(line) for line in text.splitlines()) <= 80
    rows = list(csv.DictReader(io.StringIO(out.read_text())))
    assert len(rows) == 3
    truth = float(Lipid().area(20.0))
    assert all(abs(float(row["area_at_20"]) - truth) < 0.01 * truth for row in rows)
