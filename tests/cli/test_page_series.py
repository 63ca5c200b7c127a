"""Pages of series of runs and of the rarer measurements: an answer, a figure that can be read, methods."""

from __future__ import annotations

import json
import re
from pathlib import Path

import numpy as np
from series_exports import mixture_sheet, temperature_sheet, write_run
from series_films import Lipid

from cli.main import run
from cli.page_mathtext import plain_label


def page_of(folder: Path, *argv: str) -> str:
    """Run a command and return its page, after what every page must have."""
    path = folder / "page.html"
    assert run([*argv, "--report", str(path)]) == 0
    html = path.read_text(encoding="utf-8")
    assert html.count('class="fact"') >= 2
    assert "How each number was obtained" in html
    points = re.findall(r'<script type="application/json"[^>]*>(.*?)</script>', html)
    said = [text for one in points for s in json.loads(one)["series"] for text in s["said"]]
    assert len(said) > 3
    assert not any("$" in text or "\\" in text for text in said)
    return html


def test_mixture(tmp_path: Path) -> None:
    for x in (0.0, 0.5, 1.0):
        present = {name: part for name, part in (("one", 1 - x), ("two", x)) if part > 0}
        film = Lipid(omega=0.40 - 0.04 * x, transition=None, collapse=50.0)
        shrink = 0.06 * x * (1 - x)
        write_run(
            tmp_path, f"x{x:.1f}", film, sheet=mixture_sheet(present), shrink=shrink, rows=700
        )
    html = page_of(tmp_path, "mixture", str(tmp_path))
    assert "areas at 10 mN/m" in html
    assert "condensation" in html


def test_temperature(tmp_path: Path) -> None:
    for t in (15, 20, 25):
        film = Lipid(transition=5 + 1.3 * (t - 15), gap=0.2 - 0.006 * (t - 15), kelvin=273.15 + t)
        write_run(tmp_path, f"t{t}", film, sheet=temperature_sheet(t), seed=t, rows=900)
    html = page_of(tmp_path, "temperature", str(tmp_path))
    assert re.search(r"slope of the transition</dt><dd>1\.\d+ ± 0\.\d+ mN/m/K", html)


def test_fluid_and_potential(tmp_path: Path) -> None:
    from isotherm.constants import BOLTZMANN_MN_NM

    rng = np.random.default_rng(1)
    area = np.linspace(1.2, 0.45, 1500)
    pressure = np.clip(BOLTZMANN_MN_NM * 295.15 / (area - 0.40) - 7.0, 0.0, None)
    pressure += rng.normal(0.0, 0.03, area.size)
    potential = np.clip(300.0 * (1.0 - area), 0.0, None) + rng.normal(20.0, 2.0, area.size)
    rows = [f"{a:.4f},{p:.3f},{v:.1f}" for a, p, v in zip(area, pressure, potential, strict=True)]
    trace, sheet = tmp_path / "run.csv", tmp_path / "run.toml"
    header = "Area per molecule (nm^2),Pressure (mN/m),Surface potential (mV)"
    trace.write_text("\n".join([header, *rows]) + "\n")
    sheet.write_text(temperature_sheet(22.0))
    told = ["--sheet", str(sheet), "--force"]
    assert "co-area" in page_of(tmp_path, "fluid", str(trace), *told)
    assert "potential begins at" in page_of(tmp_path, "potential", str(trace), *told)


def test_cycles(tmp_path: Path) -> None:
    rng = np.random.default_rng(4)
    down = np.linspace(0.45, 0.21, 400)
    rows = []
    for lag in (0.0, 0.004, 0.004, 0.008):
        area = down if len(rows) // 400 % 2 == 0 else down[::-1]
        pressure = np.interp(area + lag, [0.20, 0.215, 0.25, 0.50], [50.0, 26.0, 0.2, 0.0])
        pressure += rng.normal(0.0, 0.03, area.size)
        rows += [
            f"{2 * (len(rows) + n)},{a:.5f},{p:.3f}"
            for n, (a, p) in enumerate(zip(area, pressure, strict=True))
        ]
    trace = tmp_path / "loops.csv"
    trace.write_text("Time (s),Area (nm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    assert "hysteresis, cycle 1" in page_of(tmp_path, "cycles", str(trace))


def test_oscillation(tmp_path: Path) -> None:
    rng = np.random.default_rng(3)
    time = np.arange(0.0, 500.0, 0.5)
    strain = np.where(time < 440.0, 0.01 * np.sin(2 * np.pi * 0.025 * time), 0.0)
    pressure = 30.0 - 100.0 * strain + rng.normal(0.0, 0.03, time.size)
    area = 0.4 * np.exp(strain) + rng.normal(0.0, 2e-5, time.size)
    rows = [f"{t:.2f},{a:.6f},{p:.3f}" for t, a, p in zip(time, area, pressure, strict=True)]
    trace = tmp_path / "waves.csv"
    trace.write_text("Time (s),Area (nm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    assert "storage, at 0.02" in page_of(tmp_path, "oscillation", str(trace))


def test_labels_lose_their_markup() -> None:
    assert plain_label(r"surface pressure $\Pi$ / mN m$^{-1}$") == "surface pressure Π / mN m⁻¹"
    assert plain_label(r"$\Delta G_\mathrm{ex}$") == "Δ G_ex"
    assert plain_label("cost $5") == "cost $5"
