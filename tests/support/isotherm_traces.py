"""Small traces with closed forms, for tests of the isotherm analysis."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from isotherm.source import Source
from isotherm.trace import Trace

FloatArray = NDArray[np.float64]

__all__ = ["acid", "lecithin", "make_trace", "rounded"]


def make_trace(
    area: FloatArray,
    pressure: FloatArray,
    *,
    noise: float = 0.0,
    seed: int = 1,
    timed: bool = True,
    **more: object,
) -> Trace:
    """A trace of (n,) area nm^2 and pressure mN/m, 1 s a row, with white noise (mN/m)."""
    random = np.random.default_rng(seed)
    readings = pressure + noise * random.standard_normal(area.size)
    time = np.arange(area.size, dtype=float) if timed else None
    source = Source("invented.txt", "", area.size)
    return Trace(area.copy(), readings, source, time=time, **more)  # type: ignore[arg-type]


def rounded(x: FloatArray, width: float) -> FloatArray:
    """A hinge at 0 rounded over `width`."""
    return np.asarray(width * np.logaddexp(0.0, x / width))


def acid(n: int = 2000, stop: float = 0.19, noise: float = 0.05, seed: int = 1) -> Trace:
    """An invented straight-chain acid.

    Flat to 0.25 nm^2, then Π = 500 (0.25 - A) to a kink at 0.20 nm^2 and 25 mN/m, then
    Π = 25 + 4000 (0.20 - A); collapse at 0.193 nm^2 and 53 mN/m, falling 800 mN/m per nm^2 after it.
    """
    area = np.linspace(0.40, stop, n)
    pressure = (
        500.0 * rounded(0.25 - area, 2e-4)
        + 3500.0 * rounded(0.20 - area, 1e-4)
        - 4800.0 * rounded(0.193 - area, 1e-4)
    )
    return make_trace(area, pressure, noise=noise, seed=seed)


def lecithin(n: int = 3000, stop: float = 0.42, noise: float = 0.05, seed: int = 1) -> Trace:
    """An invented lecithin: lift-off 0.95 nm^2, coexistence 0.75 to 0.55 nm^2, then condensed.

    Moduli 30, 8 and 200 mN/m, constant against ln A; onset 7.09, end 9.57 mN/m; no collapse.
    """
    area = np.linspace(1.15, stop, n)
    x = -np.log(area)
    pressure = np.zeros(n)
    for at, step in ((0.95, 30.0), (0.75, -22.0), (0.55, 192.0)):
        pressure = pressure + step * rounded(x + np.log(at), 1e-3)
    return make_trace(area, pressure, noise=noise, seed=seed)
