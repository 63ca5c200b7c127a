"""The trough around the film: barriers, encoder, probe, and everything they do to the numbers."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from isotherm_truth import Film, FloatArray, Truth

from isotherm.source import Source
from isotherm.trace import Trace

__all__ = ["Instrument", "draw_instrument", "record", "record_sparse"]


@dataclass(frozen=True)
class Instrument:
    """How one run is recorded. Pressures mN/m, trough areas cm^2."""

    rows: int  # of the first compression
    noise: float
    correlation: float  # of successive readings, first-order autoregressive
    offset: float
    drift: float  # over the whole run
    pressure_step: float
    area_step: float
    jitter: float
    spikes: int
    start_area: float
    constant_strain: bool
    pauses: int
    cycles: bool
    with_time: bool
    pressure_u: float | None


def draw_instrument(rng: np.random.Generator, rows: tuple[int, int] = (600, 12_000)) -> Instrument:
    """Draw an instrument; `rows` bounds the length of the first compression."""
    start = float(rng.uniform(120.0, 600.0))
    return Instrument(
        rows=int(np.exp(rng.uniform(np.log(rows[0]), np.log(rows[1])))),
        noise=float(np.exp(rng.uniform(np.log(0.02), np.log(0.2)))),
        correlation=float(rng.uniform(0.3, 0.8)) if rng.random() < 0.25 else 0.0,
        offset=float(rng.uniform(-0.3, 0.3)),
        drift=float(rng.uniform(-0.3, 0.3)),
        pressure_step=float(rng.choice([0.01, 0.02, 0.05, 0.1], p=[0.5, 0.2, 0.15, 0.15])),
        area_step=float(rng.choice([0.001, 0.01, 0.05])),
        jitter=start * float(rng.choice([0.0, 1e-5, 1e-4], p=[0.4, 0.4, 0.2])),
        spikes=int(rng.integers(0, 11)) if rng.random() < 0.6 else 0,
        start_area=start,
        constant_strain=bool(rng.random() < 0.2),
        pauses=int(rng.integers(1, 4)) if rng.random() < 0.15 else 0,
        cycles=bool(rng.random() < 0.15),
        with_time=bool(rng.random() < 0.9),
        pressure_u=0.1 if rng.random() < 0.5 else None,
    )


def _barrier(film: Film, tool: Instrument, rng: np.random.Generator) -> FloatArray:
    """Area per molecule (n,) the barriers really enclose during the first compression."""
    first, last = float(film.area[0]), float(film.area[-1])
    way = np.linspace(0.0, 1.0, tool.rows)
    area = first * (last / first) ** way if tool.constant_strain else first + (last - first) * way
    for _ in range(tool.pauses):
        at = int(rng.integers(1, area.size - 1))
        hold = np.full(int(rng.integers(20, max(21, tool.rows // 10))), area[at])
        area = np.concatenate([area[:at], hold, area[at:]])
    return area


def _later_strokes(
    film: Film, tool: Instrument, rng: np.random.Generator
) -> tuple[FloatArray, FloatArray]:
    """Areas and pressures of an expansion with hysteresis and a second compression."""
    first, last = float(film.area[0]), float(film.area[-1])
    turn = film.truth.collapse.area if film.truth.collapse else last
    rows = max(200, tool.rows // 2)
    out = np.linspace(last, first, rows)
    gap = float(film.pressure[-1]) - float(np.interp(turn, film.area[::-1], film.pressure[::-1]))
    lost = float(rng.uniform(1.002, 1.01))

    def film_at(area: FloatArray, shift: float) -> FloatArray:
        return np.asarray(np.interp(area * shift, film.area[::-1], film.pressure[::-1]))

    healing = np.exp(-(out - last) / (0.01 * last))
    shift = turn / last
    lag = 1 + (lost - 1) * (1 - healing)
    back = film_at(out * lag, shift) + gap * healing
    again = np.linspace(first, last * 1.02, rows)
    return np.concatenate([out, again]), np.concatenate([back, film_at(again, shift * lost)])


def record(film: Film, tool: Instrument, rng: np.random.Generator) -> tuple[Trace, Truth]:
    """Run the film through the instrument: a Trace as the reader would hand it on, and its key."""
    area = _barrier(film, tool, rng)
    pressure = np.interp(area, film.area[::-1], film.pressure[::-1])
    if tool.cycles:
        more_area, more_pressure = _later_strokes(film, tool, rng)
        area = np.concatenate([area, more_area])
        pressure = np.concatenate([pressure, more_pressure])
    n = area.size
    noise = rng.normal(0.0, 1.0, n)
    if tool.correlation:
        from scipy.signal import lfilter

        kept = np.sqrt(1 - tool.correlation**2)
        noise = lfilter([kept], [1.0, -tool.correlation], noise)
    pressure = pressure + tool.noise * noise + tool.offset + tool.drift * np.linspace(0, 1, n)
    for at in rng.choice(n - 2, size=tool.spikes, replace=False):
        size = float(rng.choice([-1, 1]) * rng.uniform(1.0, 15.0))
        pressure[at : at + (2 if rng.random() < 0.3 else 1)] += size
    pressure = np.round(np.round(pressure / tool.pressure_step) * tool.pressure_step, 6)
    per_molecule = tool.start_area / film.area[0]  # cm^2 of trough per nm^2 of molecule
    trough = area * per_molecule + tool.jitter * rng.normal(0.0, 1.0, n)
    trough = np.round(np.round(trough / tool.area_step) * tool.area_step, 6)
    time: FloatArray = np.asarray(
        np.round(np.cumsum(1.0 + 0.01 * rng.normal(0.0, 1.0, n)), 2), dtype=np.float64
    )
    times = time if tool.cycles or tool.pauses or tool.with_time else None
    trace = Trace(
        area=trough / per_molecule,
        pressure=pressure,
        source=Source("simulated", "", n),
        time=times,
        trough_area=trough,
        pressure_u=tool.pressure_u,
    )
    settings: dict[str, float | str] = {
        "rows": n,
        "noise": tool.noise,
        "correlation": tool.correlation,
        "offset": tool.offset,
        "drift": tool.drift,
        "pressure_step": tool.pressure_step,
        "area_step": tool.area_step,
        "spikes": tool.spikes,
        "cycles": float(tool.cycles),
        "pauses": tool.pauses,
        "time": float(times is not None),
    }
    return trace, replace(film.truth, noise=tool.noise, settings=settings)


def record_sparse(film: Film, rng: np.random.Generator) -> tuple[Trace, Truth]:
    """Read 15-60 uneven points off the film's figure, as a person with a digitiser does."""
    points = int(rng.integers(15, 61))
    width, height = film.area[0] - film.area[-1], float(np.ptp(film.pressure))
    # even along the drawn curve, with a hand's unevenness
    length = np.cumsum(
        np.hypot(np.gradient(film.area) / width, np.gradient(film.pressure) / height)
    )
    even = np.linspace(0.0, 1.0, points)
    even[1:-1] += rng.uniform(-0.35, 0.35, points - 2) / (points - 1)
    place = np.interp(even * (length[-1] - length[0]) + length[0], length, film.area)
    noise = float(rng.uniform(0.001, 0.004)) * height
    area = place + rng.normal(0.0, float(rng.uniform(0.0003, 0.0015)) * width, points)
    pressure = np.interp(place, film.area[::-1], film.pressure[::-1])
    pressure = pressure + rng.normal(0.0, noise, points)
    if rng.random() < 0.5:
        area, pressure = area[::-1], pressure[::-1]
    trace = Trace(
        area=np.round(area, 4),
        pressure=np.round(pressure, 2),
        source=Source("simulated", "", points),
    )
    return trace, replace(
        film.truth, family="sparse", noise=noise, settings={"rows": points, "noise": noise}
    )
