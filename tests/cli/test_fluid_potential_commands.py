"""`upstroke fluid` and `upstroke potential` as a person and a script meet them."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from cli.main import run
from isotherm.constants import BOLTZMANN_MN_NM

KELVIN = 295.15
CO_AREA, COHESION = 0.40, 7.0  # nm^2, mN/m, of the invented film


@pytest.fixture
def record(tmp_path: Path) -> Path:
    """A film that follows Volmer's equation, with a surface potential that rises at 1.0 nm^2."""
    rng = np.random.default_rng(1)
    area = np.linspace(1.2, 0.45, 1500)
    pressure = BOLTZMANN_MN_NM * KELVIN / (area - CO_AREA) - COHESION
    pressure = np.clip(pressure, 0.0, None) + rng.normal(0.0, 0.03, area.size)
    potential = np.where(area < 1.0, 300.0 * (1.0 - area) + 20.0, 20.0)
    potential += rng.normal(0.0, 2.0, area.size)
    rows = [f"{a:.4f},{p:.3f},{v:.1f}" for a, p, v in zip(area, pressure, potential, strict=True)]
    path = tmp_path / "run.csv"
    header = "Area per molecule (nm^2),Pressure (mN/m),Surface potential (mV)"
    path.write_text("\n".join([header, *rows]) + "\n")
    path.with_suffix(".toml").write_text('[subphase]\ntemperature = "22.0 ± 0.1 degC"\n')
    return path


def sheet(record: Path) -> list[str]:
    return ["--sheet", str(record.with_suffix(".toml"))]


def test_fluid_finds_co_area_and_cohesion(record: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["fluid", str(record), *sheet(record), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.fluid/1"
    assert payload["settings"]["command"] == "fluid"
    fit = payload["whole_branch"]
    assert fit["holds"]
    assert fit["co_area"]["value"] == pytest.approx(CO_AREA, abs=0.003)
    assert fit["cohesion"]["value"] == pytest.approx(COHESION, abs=0.1)


def test_potential_gives_moments_and_takes_a_baseline(
    record: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    argv = ["potential", str(record), *sheet(record), "--baseline", "20 ± 1 mV", "--json", "-"]
    assert run(argv) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.potential/1"
    assert payload["settings"]["baseline"]["value"] == 20
    assert payload["onset"]["area"]["value"] == pytest.approx(1.0, abs=0.02)
    for place in payload["at"]:
        # ΔV/mV = 37.67 (μ/mD)/(A/Å²), arithmetic of the Helmholtz relation
        expected = place["potential"]["value"] * place["area"] * 100.0 / 37.67
        assert place["moment"]["value"] == pytest.approx(expected, rel=0.001)


@pytest.mark.parametrize("command", ["fluid", "potential"])
def test_tables_fit_and_figures_are_drawn(
    command: str, record: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "figure.png"
    table = tmp_path / "table.csv"
    argv = [command, str(record), *sheet(record), "--figure", str(out), "--csv", str(table)]
    assert run(argv) == 0
    assert max(len(line) for line in capsys.readouterr().out.splitlines()) <= 80
    assert out.read_bytes().startswith(b"\x89PNG")
    assert table.read_text().count("\n") > 1


def test_a_run_without_potential_is_refused(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "run.csv"
    rng = np.random.default_rng(2)
    rows = [f"{0.4 - 0.0002 * n:.4f},{0.05 * n + rng.normal(0, 0.03):.3f}" for n in range(800)]
    path.write_text("Area (nm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    assert run(["potential", str(path)]) == 1
    text = capsys.readouterr().err
    assert "no surface potential" in text
    assert text.count("\n") == 1


def test_a_baseline_must_be_a_potential(record: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["potential", str(record), "--baseline", "20 nm"]) == 2
    assert "--baseline" in capsys.readouterr().err
