"""Invented traces with a closed form, for analyses that start from rows."""

from __future__ import annotations

from collections.abc import Sequence
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


def oscillating_trace(
    rng: np.random.Generator,
    steps: Sequence[tuple[float, float, float]],
    *,
    elastic: float = 60.0,
    viscous: float = 30.0,
    relaxation: float | None = None,
    cubic: float = 0.0,
    rest: float = 60.0,
    rate: float = 10.0,
    noise: float = 0.03,
    area_noise: float = 2e-5,
    wander: float = 0.0,
    level: float = 20.0,
    delay: float = 0.0,
) -> Trace:
    """Rests and oscillations (frequency Hz, amplitude of ln A, cycles) of an invented film.

    Kelvin-Voigt: Π = level - E ε - η dε/dt. With `relaxation` (s) a Maxwell element of modulus
    `elastic` instead. `cubic` adds -cubic ε³; `delay` (s) shifts the pressure readings later.
    """
    step = 1.0 / rate
    pieces = []
    for frequency, amplitude, cycles in steps:
        pieces.append(np.zeros(round(rest * rate)))
        t = np.arange(round(cycles / frequency * rate)) * step
        pieces.append(amplitude * np.sin(2 * np.pi * frequency * t))
    pieces.append(np.zeros(round(rest * rate)))
    strain = np.concatenate(pieces)
    time = np.arange(len(strain)) * step
    pace = np.gradient(strain, step)
    if relaxation is None:
        drop = elastic * strain + viscous * pace
    else:
        # ds/dt = E dε/dt - s/τ, exact over each step for a constant pace
        decay = np.exp(-step / relaxation)
        stress = np.zeros(len(strain))
        gain = elastic * relaxation * (1 - decay)
        for i in range(1, len(strain)):
            mean_pace = (strain[i] - strain[i - 1]) / step
            stress[i] = stress[i - 1] * decay + gain * mean_pace
        drop = stress
    pressure = level - drop - cubic * strain**3
    if delay:
        pressure = np.interp(time - delay, time, pressure)
    slow = np.cumsum(rng.normal(0, 1, len(time))) * wander * np.sqrt(step)
    return Trace(
        area=0.6 * np.exp(strain + rng.normal(0, area_noise, len(time))),
        pressure=pressure + slow + rng.normal(0, noise, len(time)),
        source=Source("oscillation.csv", "", len(time)),
        time=time,
        pressure_u=0.1,
        kelvin=295.0,
        title="oscillation",
    )
