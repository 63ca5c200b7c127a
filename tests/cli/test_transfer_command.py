"""`upstroke transfer` as a person and a script meet it, on a log made by hand."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pytest
from dipping_export import write_log

from cli.main import run

RATIOS = (1.0, 0.98, 1.01, 0.97)


def test_json_holds_every_field_of_the_contract(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    log, sheet = write_log(tmp_path, RATIOS)
    assert run(["transfer", str(log), "--sheet", str(sheet), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.transfer/1"
    assert payload["settings"]["sheet"]["path"] == str(sheet)
    assert payload["type"] == "Y"
    assert [s["direction"] for s in payload["strokes"]] == ["up", "down", "up", "down"]
    for stroke, truth in zip(payload["strokes"], RATIOS, strict=True):
        assert abs(stroke["ratio"]["value"] - truth) < 0.02
        assert stroke["ratio"]["u"] > 0
        for field in ("number", "start_s", "end_s", "coated_area", "film_removed"):
            assert stroke[field] is not None
        for field in ("ratio_uncorrected", "pressure_mean", "pressure_sd", "speed_mm_per_s"):
            assert isinstance(stroke[field], float)
        assert isinstance(stroke["flags"], list)
    assert abs(payload["layers"]["value"] - sum(RATIOS)) < 0.1
    assert isinstance(payload["creep"], list)
    assert payload["renewals"] == []


def test_the_table_fits_80_columns_and_shows_each_stroke(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    log, sheet = write_log(tmp_path, RATIOS)
    assert run(["transfer", str(log), "--sheet", str(sheet)]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert max(len(line) for line in lines if str(log) not in line) <= 80
    strokes = [line.split() for line in lines if line[:8].strip().isdigit() and "±" in line]
    assert [cells[1] for cells in strokes] == ["up", "down", "up", "down"]
    assert any(line.startswith("  deposition type") and line.endswith("Y") for line in lines)


def test_the_csv_has_one_row_a_stroke(tmp_path: Path) -> None:
    log, sheet = write_log(tmp_path, RATIOS)
    out = tmp_path / "strokes.csv"
    assert run(["transfer", str(log), "--sheet", str(sheet), "--csv", str(out)]) == 0
    rows = list(csv.DictReader(io.StringIO(out.read_text())))
    assert [float(row["ratio"]) for row in rows] == pytest.approx(RATIOS, abs=0.02)
    assert all(float(row["u_ratio"]) > 0 for row in rows)


def test_the_sheet_is_needed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    log, _ = write_log(tmp_path, RATIOS)
    assert run(["transfer", str(log)]) == 2
    assert "--sheet" in capsys.readouterr().err


def test_a_trace_that_is_no_log_is_refused_in_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    _, sheet = write_log(tmp_path, RATIOS)
    trace = tmp_path / "trace.csv"
    trace.write_text("area (cm^2),pressure (mN/m)\n" + "100,1\n90,5\n" * 50)
    assert run(["transfer", str(trace), "--sheet", str(sheet)]) == 1
    text = capsys.readouterr().err
    assert text.startswith("upstroke: ")
    assert text.count("\n") == 1
    assert "unexpected" not in text


def test_what_the_stack_should_show_is_in_the_json(capsys: pytest.CaptureFixture[str]) -> None:
    demo = Path(__file__).resolve().parents[2] / "demo"
    log, sheet = str(demo / "build_good.txt"), str(demo / "build_good.toml")
    assert run(["transfer", log, "--sheet", sheet, "--json", "-"]) == 0
    expected = json.loads(capsys.readouterr().out)["expected"]
    assert expected["designed"]["layers"]["value"] == 20
    assert expected["built"]["layers"]["value"] == pytest.approx(19.84, abs=0.3)
