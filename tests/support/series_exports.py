"""Exports and sheets of the invented films, as files the commands read."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from series_films import Lipid


def write_run(
    folder: Path,
    name: str,
    lipid: Lipid,
    *,
    sheet: str = "",
    scale: float = 1.0,
    seed: int = 0,
    rows: int = 1200,
    shrink: float = 0.0,
) -> Path:
    """Write one export of area per molecule and pressure, and its own sheet where one is given.

    scale multiplies areas; shrink (nm^2) is taken off all of them.
    """
    rng = np.random.default_rng(seed)
    top = lipid.collapse if lipid.collapse is not None else lipid.last
    pressure = np.linspace(0.0, top, 20000)
    area = np.asarray(lipid.area(pressure)) * scale - shrink
    # the film lifts off where the fluid law ends, from a flat surface
    grid = np.linspace(area[0] * 1.25, area[-1] * 0.985, rows)
    value = np.interp(-grid, -area, pressure, left=0.0, right=top)
    value += rng.normal(0.0, 0.03, rows)
    lines = [f"{a:.5f}\t{p:.3f}" for a, p in zip(grid, value, strict=True)]
    path = folder / f"{name}.txt"
    path.write_text("Area (nm^2)\tPressure (mN/m)\n" + "\n".join(lines) + "\n", encoding="utf-8")
    if sheet:
        (folder / f"{name}.toml").write_text(sheet, encoding="utf-8")
    return path


def mixture_sheet(fractions: dict[str, float]) -> str:
    """Return a sheet of a mixture at 22 °C."""
    parts = "".join(
        f'[[film.component]]\nname = "{name}"\nmolar_mass = "700 g/mol"\nmole_fraction = {x}\n'
        for name, x in fractions.items()
    )
    return f'{parts}[subphase]\ntemperature = "22.0 ± 0.1 degC"\n'


def temperature_sheet(celsius: float) -> str:
    """Return a sheet that says the temperature alone."""
    return f'[subphase]\ntemperature = "{celsius} ± 0.1 degC"\n'
