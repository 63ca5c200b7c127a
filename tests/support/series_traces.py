"""Invented traces with a closed form, for analyses that start from rows."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from isotherm.source import Source
from isotherm.trace import Trace

K_MN_NM = 0.01380649  # k in mN/m nm^2 per kelvin


def volmer_trace(
    rng: np.random.Generator,
    *,
    omega: float = 0.38,
    cohesion: float = 5.0,
    factor: float = 1.0,
    bend: float = 0.0,
    rows: int = 3000,
    noise: float = 0.05,
    top: float = 30.0,
    start: float = 1.6,
    scale: float = 1.0,
    kelvin: float | None = 295.0,
) -> Trace:
    """Π = q kT/(A - ω) - Π_coh down to zero, with a bend added above 8 mN/m when asked."""
    thermal = K_MN_NM * (kelvin or 295.0) * factor
    area = np.linspace(start, omega + thermal / (top + cohesion), rows)
    pressure = np.maximum(thermal / (area - omega) - cohesion, 0.0)
    pressure = pressure + bend * np.maximum(pressure - 8.0, 0.0) ** 1.5
    return Trace(
        area=area * scale,
        pressure=pressure + rng.normal(0, noise, rows) + rng.normal(0, 0.1),
        source=Source("fluid.csv", "", rows),
        time=np.arange(rows) * 1.0,
        kelvin=kelvin,
        area_relative_u=0.01,
        pressure_u=0.1,
        title="fluid",
    )


def with_potential(
    trace: Trace,
    rng: np.random.Generator,
    *,
    onset: float = 1.35,
    noise: float = 3.0,
    level: float = 0.0,
    sign: float = 1.0,
) -> Trace:
    """The trace with a potential (mV) that leaves `level` at `onset` and rises with a bend."""
    inside = np.maximum(onset - trace.area, 0.0)
    rise = 500.0 * inside - 120.0 * inside**2
    return replace(trace, potential=level + sign * rise + rng.normal(0, noise, len(trace.area)))
