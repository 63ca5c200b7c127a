"""`upstroke cycles` as a person and a script meet it, on an invented film that loses 1 % a cycle."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import numpy as np
import pytest

from cli.main import run

SHRINK = 0.01  # of the area, from cycle to cycle


@pytest.fixture
def record(tmp_path: Path) -> Path:
    rng = np.random.default_rng(4)
    down = np.linspace(0.45, 0.21, 600)
    rows, time = [], 0.0
    for cycle in range(3):
        left = (1.0 - SHRINK) ** cycle
        for area, lag in ((down, 0.0), (down[::-1], 0.004)):
            film = area / left + lag
            pressure = np.interp(film, [0.20, 0.215, 0.25, 0.50], [50.0, 26.0, 0.2, 0.0])
            pressure += rng.normal(0.0, 0.03, area.size)
            rows += [
                f"{time + 2 * n},{a:.5f},{p:.3f}"
                for n, (a, p) in enumerate(zip(area, pressure, strict=True))
            ]
            time += 2.0 * area.size
    path = tmp_path / "loops.csv"
    path.write_text("Time (s),Area (nm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    return path


def test_json_pairs_branches_and_follows_the_area(
    record: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["cycles", str(record), "--at", "20", "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["schema"] == "upstroke.cycles/1"
    assert [c["number"] for c in payload["cycles"]] == [1, 2, 3]
    for cycle in payload["cycles"]:
        assert cycle["hysteresis"]["molar"]["value"] > 0
    shifts = [s for s in payload["area_shifts"] if s["direction"] == "compression"]
    for number, shift in enumerate(shifts[1:], start=1):
        assert shift["part"]["value"] == pytest.approx((1 - SHRINK) ** number - 1, abs=0.003)


def test_the_table_fits_figure_and_csv_are_made(
    record: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    figure, table = tmp_path / "loops.png", tmp_path / "loops_out.csv"
    argv = ["cycles", str(record), "--figure", str(figure), "--csv", str(table)]
    assert run(argv) == 0
    lines = capsys.readouterr().out.splitlines()
    assert max(len(line) for line in lines if str(record) not in line) <= 80
    assert figure.read_bytes().startswith(b"\x89PNG")
    rows = list(csv.DictReader(io.StringIO(table.read_text())))
    assert [row["direction"] for row in rows] == ["compression", "expansion"] * 3
