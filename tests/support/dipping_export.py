"""A small dipping log with known ratios, made by hand: enough to meet the commands with."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

WIDTH, THICKNESS = 20.0, 1.0  # mm
LENGTH = 20.0  # mm of substrate that cross the surface
SPEED = 0.2  # mm/s
DWELL = 120.0  # s
SURFACE_AT = 5.0  # mm, reading at which the lower edge touches the water

SHEET = """\
title = "Invented build"
[substrate]
shape = "plate"
width = "20.0 ± 0.1 mm"
thickness = "1.00 ± 0.02 mm"
[dipping]
pressure = "30 mN/m"
tolerance = "0.2 mN/m"
position_reads = "depth"
surface_at = "5.00 ± 0.05 mm"
modulus = "200 ± 10 mN/m"
[stack]
layers = {layers}
type = "Y"
first_stroke = "{first}"
layer_thickness = "2.5 ± 0.05 nm"
"""


def write_log(
    folder: Path, ratios: Sequence[float] = (1.0, 0.98, 1.01, 0.97), *, seed: int = 4
) -> tuple[Path, Path]:
    """Write a log whose strokes, up first, have these ratios, and its sheet; return both paths."""
    rng = np.random.default_rng(seed)
    deep, high = SURFACE_AT + LENGTH, SURFACE_AT - 3.0
    turns = [deep if n % 2 == 0 else high for n in range(len(ratios) + 1)]
    time, position = [0.0], [turns[0]]
    for before, after in zip(turns, [*turns[1:], turns[-1]], strict=True):
        time += [time[-1] + DWELL, time[-1] + DWELL + abs(after - before) / SPEED + 1e-6]
        position += [before, after]
    grid = np.arange(0.0, time[-1], 1.0)
    depth = np.interp(grid, time, position)
    # mm^2 below the surface: the faces and, as soon as it touches, the lower edge's own face
    wet = 2.0 * (WIDTH + THICKNESS) * np.clip(depth - SURFACE_AT, 0.0, None)
    wet += WIDTH * THICKNESS * (depth > SURFACE_AT)
    crossed = np.abs(np.diff(wet, prepend=wet[0]))
    starts = np.array(time[2::2])
    number = np.clip(np.searchsorted(starts, grid, side="left"), 0, len(ratios) - 1)
    taken = np.cumsum(np.asarray(ratios)[number] * crossed) / 100.0  # cm^2
    area = 200.0 - taken + rng.normal(0.0, 0.01, grid.size)
    pressure = 30.0 + rng.normal(0.0, 0.03, grid.size)
    rows = [
        f"{t:.1f},{d + rng.normal(0.0, 0.002):.3f},{a:.3f},{p:.3f}"
        for t, d, a, p in zip(grid, depth, area, pressure, strict=True)
    ]
    log = folder / "build.csv"
    header = "Time (s),Dipper position (mm),Trough area (cm^2),Surface pressure (mN/m)"
    log.write_text("\n".join([header, *rows]) + "\n", encoding="utf-8")
    sheet = folder / "build.toml"
    sheet.write_text(SHEET.format(layers=len(ratios), first="up"), encoding="utf-8")
    return log, sheet
