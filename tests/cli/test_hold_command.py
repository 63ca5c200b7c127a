"""`upstroke hold` as a person and a script meet it, on a record made by hand."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import numpy as np
import pytest

from cli.main import run

K = 4e-4  # s^-0.5, loss of the invented film: A = A0 (1 - K sqrt t)


@pytest.fixture
def record(tmp_path: Path) -> Path:
    rng = np.random.default_rng(8)
    time = np.arange(0.0, 7200.0, 4.0)
    area = 120.0 * (1.0 - K * np.sqrt(time)) + rng.normal(0.0, 0.01, time.size)
    pressure = 30.0 + rng.normal(0.0, 0.05, time.size)
    rows = [f"{t:.1f},{a:.3f},{p:.3f}" for t, a, p in zip(time, area, pressure, strict=True)]
    path = tmp_path / "held.csv"
    path.write_text("Time (s),Trough area (cm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    return path


def test_json_says_kind_law_and_loss(record: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["hold", str(record), "--over", "1 h", "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.hold/1"
    assert payload["settings"]["over_s"] == 3600
    (hold,) = payload["holds"]
    assert hold["kind"] == "isobaric"
    assert hold["model"] == "desorption"
    truth = K * 60.0  # after an hour, sqrt(3600 s) = 60
    assert hold["loss_planned"]["value"] == pytest.approx(truth, rel=0.1)
    assert sum(model["weight"] for model in hold["models"]) == pytest.approx(1.0)


def test_the_table_fits_80_columns(record: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["hold", str(record), "--over", "1 h"]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert max(len(line) for line in lines if str(record) not in line) <= 80
    assert any("loss over 60 min, as planned" in line for line in lines)
    assert any(line.startswith("  desorption *") for line in lines)


def test_csv_has_one_row_a_law(record: Path, tmp_path: Path) -> None:
    out = tmp_path / "laws.csv"
    assert run(["hold", str(record), "--csv", str(out)]) == 0
    rows = list(csv.DictReader(io.StringIO(out.read_text())))
    assert len(rows) == 5
    assert [row["law"] for row in rows if row["chosen"] == "1"] == ["desorption"]


@pytest.mark.parametrize("text", ["4 kg", "-1 h", "soon"])
def test_a_time_must_be_a_time(record: Path, text: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["hold", str(record), "--over", text]) == 2
    assert "--over" in capsys.readouterr().err


def test_a_record_without_a_hold_is_refused(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "moving.csv"
    rows = [f"{t},{120 - 0.1 * t:.2f},{0.1 * t:.2f}" for t in range(600)]
    path.write_text("Time (s),Trough area (cm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    assert run(["hold", str(path)]) == 1
    text = capsys.readouterr().err
    assert text.startswith("upstroke: ")
    assert text.count("\n") == 1
    assert "unexpected" not in text


def test_the_figure_is_drawn(record: Path, tmp_path: Path) -> None:
    out = tmp_path / "figure.svg"
    assert run(["hold", str(record), "--figure", str(out)]) == 0
    assert out.read_bytes().startswith(b"<?xml")
