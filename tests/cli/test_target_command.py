"""`upstroke target` as a person and a script meet it, on the demonstration's isotherm."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import numpy as np
import pytest

from cli.main import run

SHEET = """\
title = "Invented build"
[film]
molar_mass = "284.48 g/mol"
concentration = "1.00 ± 0.01 mg/mL"
volume = "25.0 ± 0.2 µL"
solvent = "chloroform"
[subphase]
temperature = "20.0 ± 0.2 degC"
[trough]
smallest_area = "60 cm^2"
largest_area = "240 cm^2"
[substrate]
width = "20.0 ± 0.1 mm"
thickness = "1.00 ± 0.02 mm"
[dipping]
pressure = "30 mN/m"
tolerance = "0.2 mN/m"
stroke_length = "20 mm"
speed = "5 mm/min"
[stack]
layers = 8
type = "Y"
first_stroke = "up"
[target]
collapse_margin = "{margin} mN/m"
guard_band = "2 mN/m"
"""
KINK, COLLAPSE = 25.0, 50.0  # mN/m, of the invented film


@pytest.fixture
def trace(tmp_path: Path) -> Path:
    rng = np.random.default_rng(6)
    area = np.linspace(0.45, 0.185, 1500)
    pressure = np.interp(area, [0.18, 0.192, 0.207, 0.245, 0.46], [44, COLLAPSE, KINK, 0.1, 0.0])
    pressure += rng.normal(0.0, 0.04, area.size)
    molecules = 6.02214076e23 * 25e-6 / 284.48
    rows = [f"{a * molecules / 1e14:.3f},{p:.3f}" for a, p in zip(area, pressure, strict=True)]
    path = tmp_path / "run.csv"
    path.write_text("Trough area (cm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    return path


def sheet(folder: Path, margin: float = 5.0) -> str:
    path = folder / "run.toml"
    path.write_text(SHEET.format(margin=margin), encoding="utf-8")
    return str(path)


def test_json_recommends_a_pressure_inside_every_limit(
    trace: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["target", str(trace), "--sheet", sheet(tmp_path), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.target/1"
    best = payload["recommended"]["value"]
    assert abs(best - KINK) > 2
    assert 0 < best < COLLAPSE - 5
    low, high = payload["window"]
    assert low < best < high
    for limit in payload["limits"]:
        assert limit["allowed"][0] <= best <= limit["allowed"][1], limit["rule"]
    assert payload["binding"]
    assert payload["strokes_possible"] >= 1
    assert len(payload["plan"]) == 8


def test_the_page_fits_and_carries_plan_and_cautions(
    trace: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "plan.csv"
    figure = tmp_path / "target.svg"
    argv = ["target", str(trace), "--sheet", sheet(tmp_path), "--csv", str(out)]
    assert run([*argv, "--figure", str(figure)]) == 0
    text = capsys.readouterr().out
    assert max(len(line) for line in text.splitlines() if str(trace) not in line) <= 80
    assert "Dip at " in text
    assert "Cautions" in text
    assert "chloroform" in text
    rows = list(csv.DictReader(io.StringIO(out.read_text())))
    assert [row["stroke"] for row in rows] == [str(n) for n in range(1, 9)]
    assert figure.read_bytes().startswith(b"<?xml")


def test_no_admissible_pressure_is_an_answer_too(
    trace: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    impossible = sheet(tmp_path, margin=60.0)
    assert run(["target", str(trace), "--sheet", impossible]) == 0
    text = capsys.readouterr().out
    assert "No pressure meets every rule" in text
    assert "What would open a window" in text
    assert run(["target", str(trace), "--sheet", impossible, "--json", "-"]) == 0
    assert json.loads(capsys.readouterr().out)["recommended"] is None


def test_the_sheet_is_needed(trace: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["target", str(trace)]) == 2
    assert "--sheet" in capsys.readouterr().err
