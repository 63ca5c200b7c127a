"""`upstroke replicates`, `mixture` and `temperature` as a person and a script meet them."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pytest
from series_exports import mixture_sheet, temperature_sheet, write_run
from series_films import Lipid

from cli.main import run


@pytest.fixture
def repeats(tmp_path: Path) -> Path:
    folder = tmp_path / "runs"
    folder.mkdir()
    for number, scale in enumerate((1.0, 1.004, 0.997, 1.002)):
        write_run(folder, f"run{number + 1}", Lipid(), scale=scale, seed=number, rows=700)
    return folder


@pytest.fixture
def mixtures(tmp_path: Path) -> Path:
    folder = tmp_path / "mixtures"
    folder.mkdir()
    for x in (0.0, 0.5, 1.0):
        present = {name: part for name, part in (("one", 1 - x), ("two", x)) if part > 0}
        film = Lipid(omega=0.40 - 0.04 * x, transition=None, collapse=50.0)
        shrink = 0.06 * x * (1 - x)
        write_run(folder, f"x{x:.1f}", film, sheet=mixture_sheet(present), shrink=shrink, rows=700)
    return folder


@pytest.fixture
def temperatures(tmp_path: Path) -> Path:
    folder = tmp_path / "temperatures"
    folder.mkdir()
    for t in (15, 20, 25):
        film = Lipid(transition=5 + 1.3 * (t - 15), gap=0.2 - 0.006 * (t - 15), kelvin=273.15 + t)
        write_run(folder, f"t{t}", film, sheet=temperature_sheet(t), seed=t, rows=900)
    return folder


def ask(capsys: pytest.CaptureFixture[str], *argv: str) -> dict:
    assert run([*argv, "--json", "-"]) == 0
    captured = capsys.readouterr()
    assert captured.err == ""
    payload = json.loads(captured.out)
    assert payload["schema"] == f"upstroke.{argv[0]}/1"
    assert payload["settings"]["command"] == argv[0]
    assert "numpy" in payload["versions"]
    return payload


def printed(capsys: pytest.CaptureFixture[str], *argv: str) -> str:
    assert run(list(argv)) == 0
    text = capsys.readouterr().out
    assert max(len(line) for line in text.splitlines()) <= 80
    assert "coverage about 95 %" in " ".join(text.split())
    return text


def test_replicates_names_runs_means_and_scatter(
    repeats: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    payload = ask(capsys, "replicates", str(repeats), "--at", "20,30", "--drop", "run4")
    assert [one["name"] for one in payload["runs"]] == ["run1", "run2", "run3", "run4"]
    assert [one["kept"] for one in payload["runs"]] == [True, True, True, False]
    features = {one["name"]: one for one in payload["features"]}
    assert features["area_at_30"]["n"] == 3
    assert payload["settings"]["drop"] == ["run4"]
    text = printed(capsys, "replicates", str(repeats))
    assert "4 runs, 4 kept" in text
    assert "area at 30" in text


def test_replicates_csv_has_one_row_a_run(repeats: Path, tmp_path: Path) -> None:
    out = tmp_path / "runs.csv"
    assert run(["replicates", str(repeats), "--csv", str(out)]) == 0
    rows = list(csv.DictReader(io.StringIO(out.read_text())))
    assert [row["name"] for row in rows] == ["run1", "run2", "run3", "run4"]
    assert all(float(row["u_area_at_30"]) > 0 for row in rows)


def test_mixture_takes_fractions_from_each_runs_own_sheet(
    mixtures: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    payload = ask(capsys, "mixture", str(mixtures), "--at", "20,30")
    assert payload["components"] == ["one", "two"]
    assert [group["pressure"] for group in payload["at"]] == [20, 30]
    assert all(group["verdict"] == "condensation" for group in payload["at"])
    half = next(s for s in payload["at"][1]["states"] if s["fractions"] == [0.5, 0.5])
    assert half["excess_area"]["value"] == pytest.approx(-0.015, abs=0.002)
    assert len(payload["settings"]["sheets"]) == 3
    text = printed(capsys, "mixture", str(mixtures), "--at", "30")
    assert "At 30 mN/m: condensation" in text


def test_temperature_gives_slope_and_heat(
    temperatures: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    payload = ask(capsys, "temperature", str(temperatures))
    slope = payload["transition_slope"]
    assert abs(slope["value"] - 1.3) < max(3 * slope["u"], 0.2)
    text = printed(capsys, "temperature", str(temperatures))
    assert "dΠ_t/dT" in text
    assert "ΔH full" in text


@pytest.mark.parametrize("command", ["replicates", "mixture", "temperature"])
def test_one_run_is_no_series(
    command: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = write_run(tmp_path, "only", Lipid(), rows=500)
    assert run([command, str(path)]) == 1
    text = capsys.readouterr().err
    assert text.startswith("upstroke: ")
    assert text.count("\n") == 1
    assert "unexpected" not in text


def test_figures_of_series_are_drawn(
    repeats: Path, mixtures: Path, temperatures: Path, tmp_path: Path
) -> None:
    for command, folder in (
        ("replicates", repeats),
        ("mixture", mixtures),
        ("temperature", temperatures),
    ):
        out = tmp_path / f"{command}.svg"
        assert run([command, str(folder), "--figure", str(out)]) == 0
        assert out.read_bytes().startswith(b"<?xml")
