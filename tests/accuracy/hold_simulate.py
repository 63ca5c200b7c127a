"""Simulated holds with known truth: film laws, barrier and probe noise, slow wander, set-point settling.

The film laws are integrated here from rates or written from the physics, not taken from the code under
test. Amplitudes are those of ordinary troughs: barrier encoder 0.01 cm², controller jitter correlated over
seconds to a minute, wander over tens of minutes (room temperature, level), settling over a minute or so.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["KINDS", "LAWS", "SimulatedHold", "simulate_hold"]

FloatArray = NDArray[np.float64]
LAWS = ("constant", "desorption", "dissolution", "nucleation", "relaxation")
KINDS = ("isobaric", "isochoric")


@dataclass(frozen=True)
class SimulatedHold:
    """Rows of one hold and the truth behind them."""

    kind: str
    law: str
    time: FloatArray
    area: FloatArray
    pressure: FloatArray
    truth_loss_4h: float
    settling: float  # s, five time constants of the settling
    parameters: dict[str, float]
    truth: FloatArray  # relative level at `time`


def _correlated(rng: np.random.Generator, n: int, dt: float, tau: float) -> FloatArray:
    """Unit-variance first-order autoregressive noise of correlation time `tau`."""
    from scipy.signal import lfilter

    rho = np.exp(-dt / tau)
    start = rng.normal()
    drive = rng.normal(size=n) * np.sqrt(1 - rho**2)
    out, _ = lfilter([1.0], [1.0, -rho], drive, zi=[rho * start])
    return np.asarray(out, dtype=float)


def _nucleation(t: FloatArray, half: float, power: float, nucleation_rate: float) -> FloatArray:
    """Overgrown part from the convolution of a nucleation rate with growth, overlap after Avrami."""
    fine = np.linspace(0.0, float(t[-1]), 4001)
    step = fine[1]
    rate = nucleation_rate * np.exp(-nucleation_rate * fine)  # centres per second, normalised
    growth = fine**power
    extended = np.convolve(rate, growth)[: fine.size] * step
    reference = np.interp(half, fine, extended)
    return 1.0 - np.exp(-np.log(2.0) * np.interp(t, fine, extended) / reference)


def _level(rng: np.random.Generator, law: str, t: FloatArray, loss: float, duration: float):  # type: ignore[no-untyped-def]
    """Relative level A/A0 (or Π/Π0) at `t`, losing `loss` at the end of the hold."""
    if law == "constant":
        return np.ones_like(t), {}
    if law == "desorption":
        return 1.0 - loss * np.sqrt(t / duration), {"k": loss / np.sqrt(duration)}
    if law == "dissolution":
        return 1.0 - loss * t / duration, {"rate": loss / duration}
    if law == "relaxation":
        tau = duration * float(np.exp(rng.uniform(np.log(0.08), np.log(0.6))))
        bound = loss / (1.0 - np.exp(-duration / tau))
        return 1.0 - bound * (1.0 - np.exp(-t / tau)), {"tau": tau, "bound": bound}
    half = duration * rng.uniform(0.25, 0.75)
    power = float(rng.choice([1.5, 2.0]))
    # instantaneous: all centres in the first part of the hold; progressive: appearing throughout
    nucleation_rate = float(rng.choice([200.0, 0.05])) / duration
    done = _nucleation(np.append(t, max(4 * 3600.0, duration) * 1.5), half, power, nucleation_rate)
    bound = loss / float(np.interp(duration, t, done[:-1]))
    return 1.0 - bound * done[:-1], {"half": half, "power": power, "bound": bound}


def simulate_hold(
    rng: np.random.Generator, law: str, kind: str = "isobaric", noise: float = 1.0
) -> SimulatedHold:
    """One hold of 1.5 to 5 h; `noise` multiplies what the module's docstring adds to the film's law."""
    duration = rng.uniform(1.5, 5.0) * 3600.0
    dt = float(rng.choice([0.5, 1.0, 2.0, 5.0, 10.0]))
    t = np.arange(0.0, duration, dt)
    n = t.size
    loss = float(np.exp(rng.uniform(np.log(0.02), np.log(0.25)))) if law != "constant" else 0.0
    span = np.append(t, np.linspace(duration, max(duration, 4 * 3600.0) * 1.01, 400))
    level, parameters = _level(rng, law, span, loss, duration)
    truth_4h = 1.0 - float(np.interp(4 * 3600.0, span, level))
    level = level[:n]
    area0 = rng.uniform(60.0, 300.0)
    set_pressure = rng.uniform(12.0, 42.0)
    modulus = rng.uniform(80.0, 400.0)
    tau_settle = float(rng.uniform(8.0, 90.0))
    period = tau_settle * rng.uniform(1.0, 4.0)
    amplitude = rng.uniform(-1.0, 1.0) * 2.0 if rng.random() < 0.8 else 0.0
    transient = amplitude * np.exp(-t / tau_settle) * np.cos(2 * np.pi * t / period)
    jitter_tau = float(rng.uniform(3.0, 60.0))
    wander_tau = float(rng.uniform(600.0, 1800.0))
    if kind == "isobaric":
        area = area0 * level * (1.0 - transient / modulus)
        area += noise * rng.uniform(0.005, 0.05) * rng.normal(size=n)
        area += noise * area0 * rng.uniform(1e-4, 5e-4) * _correlated(rng, n, dt, jitter_tau)
        area += noise * area0 * rng.uniform(0.5e-4, 4e-4) * _correlated(rng, n, dt, wander_tau)
        pressure = set_pressure + transient
        pressure += noise * 0.03 * rng.normal(size=n) + noise * 0.05 * _correlated(
            rng, n, dt, jitter_tau
        )
        area = np.round(area, 3)
        pressure = np.round(pressure, 2)
    else:
        tau_settle = rng.uniform(2.0, 15.0)  # the barrier slows to its stop
        area = area0 + 0.002 * area0 * np.exp(-t / tau_settle) * (amplitude != 0.0)
        area += 0.003 * rng.normal(size=n)
        pressure = (
            set_pressure * level * (1.0 - 0.005 * np.exp(-t / tau_settle) * (amplitude != 0.0))
        )
        pressure += noise * rng.uniform(0.01, 0.06) * rng.normal(size=n)
        pressure += noise * rng.uniform(0.005, 0.04) * _correlated(rng, n, dt, jitter_tau)
        pressure += (
            noise * set_pressure * rng.uniform(0.5e-4, 8e-4) * _correlated(rng, n, dt, wander_tau)
        )
        area = np.round(area, 2)
        pressure = np.round(pressure, 3)
    return SimulatedHold(
        kind,
        law,
        t,
        area,
        pressure,
        truth_4h,
        5.0 * tau_settle * (amplitude != 0.0),
        parameters,
        level,
    )


@dataclass(frozen=True)
class SimulatedRecord:
    """A whole record: waiting, compressions and holds in turn, and the holds' places and truths."""

    time: FloatArray
    area: FloatArray
    pressure: FloatArray
    holds: tuple[SimulatedHold, ...]
    starts: tuple[float, ...]  # s, when each set point was reached
    stops: tuple[float, ...]


# Pressure against relative area of the simulated film: gas, expanded, plateau, condensed.
_FILM_AREA = np.array([0.5, 0.56, 0.62, 0.66, 0.8, 0.95, 1.0, 1.1, 3.0])
_FILM_PRESSURE = np.array([62.0, 48.0, 20.0, 9.0, 8.6, 3.0, 0.6, 0.02, 0.0])


def simulate_record(rng: np.random.Generator, holds: list[tuple[str, str]]) -> SimulatedRecord:
    """Compress, hold, compress on, hold...: `holds` lists (law, kind), set pressures increase."""
    made = [simulate_hold(rng, law, kind) for law, kind in holds]
    dt = float(made[0].time[1] - made[0].time[0])
    targets = np.sort(rng.uniform(12.0, 42.0, len(made)))
    speed = rng.uniform(0.05, 0.4)  # cm^2/s
    scale = rng.uniform(80.0, 160.0)  # cm^2 at relative area 1
    t0 = rng.uniform(0.0, 900.0)
    now, area_now = t0, scale * rng.uniform(1.3, 2.0)
    waiting = np.arange(0.0, t0, dt)
    times, areas = (
        [waiting],
        [np.full(waiting.size, area_now) + 0.01 * rng.normal(size=waiting.size)],
    )
    pressures = [0.03 * rng.normal(size=waiting.size)]
    starts, stops, used = [], [], []
    for hold, target in zip(made, targets, strict=True):
        goal = scale * float(np.interp(target, _FILM_PRESSURE[::-1], _FILM_AREA[::-1]))
        ramp = np.arange(0.0, max(area_now - goal, 0.0) / speed, dt)
        moving = area_now - speed * ramp
        times.append(now + ramp)
        areas.append(moving + 0.01 * rng.normal(size=ramp.size))
        pressures.append(
            np.interp(moving / scale, _FILM_AREA, _FILM_PRESSURE)
            + 0.03 * rng.normal(size=ramp.size)
        )
        now += ramp.size * dt
        step = float(hold.time[1] - hold.time[0])
        keep = slice(None, None, max(1, round(dt / step))) if step < dt else slice(None)
        t = hold.time[keep]
        starts.append(now)
        times.append(now + t)
        if hold.kind == "isobaric":
            areas.append(hold.area[keep] * goal / float(hold.area[0]))
            pressures.append(hold.pressure[keep] + target - float(np.median(hold.pressure)))
            scale *= float(hold.truth[-1])
            area_now = float(areas[-1][-1])
        else:
            areas.append(hold.area[keep] + goal - float(np.median(hold.area)))
            pressures.append(hold.pressure[keep] * target / float(hold.pressure[0]))
            area_now = goal
            last = float(pressures[-1][-1])
            scale = goal / float(np.interp(last, _FILM_PRESSURE[::-1], _FILM_AREA[::-1]))
        now = float(times[-1][-1]) + dt
        stops.append(now)
        used.append(hold)
    return SimulatedRecord(
        np.concatenate(times), np.concatenate(areas), np.concatenate(pressures),
        tuple(used), tuple(starts), tuple(stops),
    )  # fmt: skip
