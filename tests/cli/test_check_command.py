"""`upstroke check` as a person and a script meet it, and its file given to other commands."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import numpy as np
import pytest

from cli.main import run

ZERO, DRIFT = 0.06, 0.10  # mN/m, mN/m/h, of the invented probe


def write(path: Path, header: str, *columns: np.ndarray) -> Path:
    rows = [",".join(f"{value:.4f}" for value in row) for row in zip(*columns, strict=True)]
    path.write_text("\n".join([header, *rows]) + "\n")
    return path


@pytest.fixture
def still(tmp_path: Path) -> Path:
    rng = np.random.default_rng(5)
    time = np.arange(0.0, 3600.0, 4.0)
    pressure = ZERO + DRIFT * time / 3600.0 + rng.normal(0.0, 0.03, time.size)
    return write(tmp_path / "still.csv", "Time (s),Pressure (mN/m)", time, pressure)


@pytest.fixture
def dirty(tmp_path: Path) -> Path:
    """A surface whose pressure rises by 1.5 mN/m under compression."""
    rng = np.random.default_rng(6)
    area = np.linspace(240.0, 60.0, 600)
    pressure = np.where(area < 120.0, (120.0 - area) * 0.025, 0.0) + rng.normal(0.0, 0.03, 600)
    header = "Time (s),Trough area (cm^2),Pressure (mN/m)"
    return write(tmp_path / "dirty.csv", header, np.arange(600.0), area, pressure)


def test_json_judges_every_item(
    still: Path, dirty: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["check", str(still), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.check/1"
    assert payload["verdict"] == "pass"
    assert payload["drift_rate"]["value"] == pytest.approx(DRIFT, abs=0.05)
    assert run(["check", str(dirty), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["verdict"] == "fail"
    assert [i["name"] for i in payload["items"] if i["verdict"] == "fail"] == ["pressure rise"]


def test_the_table_fits_and_the_csv_has_a_row_an_item(
    dirty: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "items.csv"
    assert run(["check", str(dirty), "--csv", str(out)]) == 0
    text = capsys.readouterr().out
    assert max(len(line) for line in text.splitlines() if str(dirty) not in line) <= 80
    assert "Verdict: fail" in text
    rows = list(csv.DictReader(io.StringIO(out.read_text())))
    assert {row["item"] for row in rows} >= {"zero", "pressure rise"}


def test_nothing_to_check_is_wrong_usage(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["check"]) == 2
    assert "record of the bare subphase" in " ".join(capsys.readouterr().err.split())


def test_its_json_serves_other_commands(
    still: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    kept = tmp_path / "check.json"
    assert run(["check", str(still), "--json", str(kept)]) == 0
    rng = np.random.default_rng(8)
    time = np.arange(0.0, 7200.0, 4.0)
    area = 120.0 * (1.0 - 4e-4 * np.sqrt(time)) + rng.normal(0.0, 0.01, time.size)
    pressure = 30.0 + rng.normal(0.0, 0.05, time.size)
    header = "Time (s),Trough area (cm^2),Pressure (mN/m)"
    held = write(tmp_path / "held.csv", header, time, area, pressure)
    capsys.readouterr()
    assert run(["hold", str(held), "--check", str(kept), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["settings"]["check"]["path"] == str(kept)
    # the zero the probe read on the clean surface is taken off, as is its drift
    assert payload["holds"][0]["pressure"]["value"] == pytest.approx(30.0 - ZERO - DRIFT, abs=0.06)


def test_a_file_that_is_no_check_is_refused(
    still: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    other = tmp_path / "other.json"
    other.write_text('{"schema": "something else"}')
    assert run(["hold", str(still), "--check", str(other)]) == 1
    text = capsys.readouterr().err
    assert "not the result of a check" in text
    assert text.count("\n") == 1


def test_the_figure_is_drawn(dirty: Path, tmp_path: Path) -> None:
    out = tmp_path / "figure.svg"
    assert run(["check", str(dirty), "--figure", str(out)]) == 0
    assert out.read_bytes().startswith(b"<?xml")
