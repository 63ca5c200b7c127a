"""An export crowded with columns about other things: speeds, targets, states, notes, room temperatures."""

from __future__ import annotations

import random
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Crowded", "crowded_export"]

_OTHERS = (
    "Barrier speed (mm/min)", "Target pressure (mN/m)", "Relative area (%)", "Cycle", "Room temperature (°C)",
    "Compression modulus (mN/m)", "State", "Comment", "Relative humidity (%)", "Pressure change (mN/m)",
    "Step", "Note", "Dipper speed (mm/min)", "Area rate (cm²/min)",
    "Probe signal (counts)", "Set position (mm)",
)  # fmt: skip
_TEXTS = ("State", "Comment", "Note")
_CLOCKS = ("Clock", "Timestamp")
_NAMES = {
    "time": ("Time (s)", "Elapsed time [s]", "t (s)", "Time", "Zeit [s]", *_CLOCKS),
    "area": ("Area (cm²)", "Trough area [cm^2]", "Film area (cm2)", "Fläche (cm²)"),
    "pressure": ("Pressure (mN/m)", "Surface Pressure (mN/m)", "Π / mN m⁻¹", "SP [mN/m]"),
    "dipper_position": (
        "Dipper position (mm)", "Substrate position [mm]",
        "Immersion depth (mm)", "Eintauchtiefe (mm)",
    ),
    "temperature": ("Subphase temperature (°C)", "T (°C)", "Temperature [degC]"),
    "potential": ("Surface potential (mV)", "ΔV (mV)", "Potential [mV]"),
    "tension": ("Surface tension (mN/m)", "γ (mN/m)"),
}  # fmt: skip
_GAPS = ("", "-", "NaN", "n/a", "--")


@dataclass(frozen=True)
class Crowded:
    """The text, and the readings of each role, (n,), NaN where a cell is missing; times from their first."""

    text: str
    readings: dict[str, NDArray[np.float64]]


def crowded_export(seed: int) -> Crowded:
    """Write an export of random columns, some with gaps."""
    rng, numbers = random.Random(seed), np.random.default_rng(seed)
    rows = rng.choice([12, 40, 300])
    delimiter = rng.choice([",", ";", "\t"])
    decimal = "." if delimiter == "," else rng.choice(".,")
    roles = ["area", "pressure"]
    roles += [
        role
        for role in ("time", "dipper_position", "temperature", "potential", "tension")
        if rng.random() < 0.5
    ]
    rng.shuffle(roles)
    columns: list[tuple[str, list[str]]] = []
    readings = {}
    for role in roles:
        name = rng.choice(_NAMES[role])
        values = np.round(numbers.uniform(1.0, 100.0, rows), 3)
        if role == "time":
            values = np.arange(rows) * 1.5
        cells = [repr(value).replace(".", decimal) for value in values.tolist()]
        if name in _CLOCKS:
            day = "2031-05-06 " if name == "Timestamp" else ""
            cells = [
                f"{day}{9 + int(t) // 3600:02d}:{int(t) // 60 % 60:02d}:{t % 60:04.1f}"
                for t in values.tolist()
            ]
        elif role != "time" and rng.random() < 0.3:
            # each column on rows of its own: a row of nothing at all would be a blank line
            for row in range(2 + len(columns), rows, 17):
                cells[row] = rng.choice(_GAPS)
                values[row] = np.nan
        columns.append((name, cells))
        readings[role] = values
    for name in rng.sample(_OTHERS, rng.choice([0, 1, 2, 4])):
        cells = [
            repr(value).replace(".", decimal)
            for value in np.round(numbers.uniform(0, 50, rows), 2).tolist()
        ]
        if name in _TEXTS:
            cells = [rng.choice(["on", "off", "up", "closing now"]) for _ in range(rows)]
        columns.insert(rng.randrange(len(columns) + 1), (name, cells))
    lines = [delimiter.join(name for name, _ in columns)]
    lines += [delimiter.join(row) for row in zip(*(cells for _, cells in columns), strict=True)]
    return Crowded("\n".join(lines) + "\n", readings)
