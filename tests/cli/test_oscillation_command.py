"""`upstroke oscillation` as a person and a script meet it, on invented waves."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from cli.main import run

MODULUS, PHASE = 100.0, 0.2  # mN/m and rad, of the invented film: a lossy linear element


@pytest.fixture
def waves(tmp_path: Path) -> Path:
    rng = np.random.default_rng(3)
    rows, start = ["Time (s),Area (nm^2),Pressure (mN/m)"], 0.0
    for frequency in (0.02, 0.05):
        t = np.arange(0.0, 10.0 / frequency + 60.0, 0.5)
        moving = t < 10.0 / frequency
        angle = 2.0 * np.pi * frequency * t
        strain = np.where(moving, 0.01 * np.sin(angle), 0.0)
        pressure = 30.0 - np.where(moving, MODULUS * 0.01 * np.sin(angle + PHASE), 0.0)
        pressure += rng.normal(0.0, 0.03, t.size)
        area = 0.4 * np.exp(strain) + rng.normal(0.0, 2e-5, t.size)
        rows += [
            f"{start + x:.2f},{a:.6f},{p:.3f}" for x, a, p in zip(t, area, pressure, strict=True)
        ]
        start += t[-1] + 0.5
    path = tmp_path / "waves.csv"
    path.write_text("\n".join(rows) + "\n")
    return path


def test_json_gives_storage_and_loss_of_every_frequency(
    waves: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["oscillation", str(waves), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.oscillation/1"
    assert [round(s["frequency"]["value"], 3) for s in payload["segments"]] == [0.02, 0.05]
    for segment in payload["segments"]:
        for part, truth in (
            ("storage", MODULUS * np.cos(PHASE)),
            ("loss", MODULUS * np.sin(PHASE)),
        ):
            assert abs(segment[part]["value"] - truth) < max(4 * segment[part]["u"], 0.5)


def test_the_table_fits_and_the_figure_is_drawn(
    waves: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "waves.svg"
    assert run(["oscillation", str(waves), "--delay", "0.0 ± 0.05 s", "--figure", str(out)]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert max(len(line) for line in lines if str(waves) not in line) <= 80
    assert sum(line.strip().startswith(("1 ", "2 ")) for line in lines) == 4
    assert out.read_bytes().startswith(b"<?xml")


def test_a_record_that_stands_still_is_refused(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "still.csv"
    rows = [f"{n},{0.4 - 1e-4 * n:.5f},{0.05 * n:.2f}" for n in range(500)]
    path.write_text("Time (s),Area (nm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    assert run(["oscillation", str(path)]) == 1
    assert "no oscillation" in capsys.readouterr().err
