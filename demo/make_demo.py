"""Make the demonstration export. The film, the trough and the run are invented.

Run from the project's top directory: python demo/make_demo.py
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

HERE = Path(__file__).resolve().parent
SEED = 20

MOLECULES = 6.02214076e23 * 25e-6 * 1.00 / 284.48  # 25 µL of 1.00 mg/mL (g/L), 284.48 g/mol
ROWS = 3000
FROM_CM2, TO_CM2 = 240.0, 95.0
SECONDS = 1450.0

# area per molecule (nm^2) and pressure (mN/m) of the invented film's corners, chosen by hand
CORNERS = ((0.46, 0.0), (0.2445, 0.15), (0.2065, 24.6), (0.1915, 54.0), (0.1795, 47.5))
ROUNDING = 0.0006  # nm^2, width over which the corners are rounded


def film_pressure(area: np.ndarray) -> np.ndarray:
    """Return the invented film's pressure (mN/m) at each area (nm^2): straight stretches, rounded."""
    corner_area, corner_pressure = (np.array(c)[::-1] for c in zip(*CORNERS, strict=True))
    fine = np.linspace(0.17, 0.47, 30001)
    sharp = np.interp(fine, corner_area, corner_pressure)
    step = fine[1] - fine[0]
    kernel = np.exp(-0.5 * (np.arange(-400, 401) * step / ROUNDING) ** 2)
    padded = np.pad(sharp, 400, mode="edge")
    return np.interp(area, fine, np.convolve(padded, kernel / kernel.sum(), mode="valid"))


def isotherm_lines() -> list[str]:
    """Return the lines of the invented export."""
    rng = np.random.default_rng(SEED)
    time = np.linspace(0.0, SECONDS, ROWS)
    trough = np.linspace(FROM_CM2, TO_CM2, ROWS) + rng.normal(0.0, 0.01, ROWS)
    area = trough * 1e14 / MOLECULES
    pressure = film_pressure(area) + 0.18 + rng.normal(0.0, 0.05, ROWS)
    head = [
        "Invented run for demonstration: no such film was ever spread",
        "Film:\toctadecanoic acid, 25 uL of 1.00 mg/mL",
        "Subphase:\twater, 20.0 degC",
        "",
        "Time\tTrough area\tSurface pressure\tSubphase temperature",
        "s\tcm^2\tmN/m\tdegC",
    ]
    celsius = 20.0 + 0.05 * np.sin(time / 300.0)
    rows = [
        f"{t:.2f}\t{a:.2f}\t{p:.2f}\t{c:.1f}"
        for t, a, p, c in zip(time, trough, pressure, celsius, strict=True)
    ]
    return [*head, *rows]


def main() -> None:
    """Write the export beside this file."""
    (HERE / "spacer_isotherm.txt").write_text("\n".join(isotherm_lines()) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
