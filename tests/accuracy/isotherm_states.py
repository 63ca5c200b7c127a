"""Isotherms from equations of state, recorded otherwise than the other simulators do.

Films: condensed phases of constant modulus in ln A (a tilted one, then an upright one), a fluid branch by
Volmer's equation with cohesion, (Π + Π_c)(A - ω) = n k T, and a coexistence of the two of finite
cooperativity (fraction condensed = logistic of (Π - Π_t) ΔA m / k T). Collapses: level, falling, a peak that
drops at once, a roll-over. Recording: a lagging probe, 1/f drift, digitised readings, rows at odd moments,
jitter of the area.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.constants import Boltzmann
from scipy.signal import lfilter

from isotherm.source import Source
from isotherm.trace import Trace

__all__ = ["KINDS", "StatesTruth", "simulate_states"]

FloatArray = NDArray[np.float64]

KINDS = ("acid", "fluid", "coexistence", "coexistence_kink", "condensed", "gas", "stopped_acid",
         "stopped_fluid")  # fmt: skip
COLLAPSES = ("level", "fall", "peak", "roll")
_KT = Boltzmann * 294.0 * 1e21  # mN/m nm^2 at 21 degC
_CLEAR = 5.0  # mN/m a kink must be from where the run stops, to be asked for


@dataclass(frozen=True)
class StatesTruth:
    """collapse, kinks, onsets: (area nm^2, pressure mN/m); highest: pressure the film can show, mN/m."""

    kind: str
    collapse: tuple[float, float] | None
    kinks: tuple[tuple[float, float], ...]
    coexistences: tuple[float, ...]
    highest: float
    form: str


@dataclass
class _Curve:
    """Area falling and pressure of a film; what it holds."""

    area: FloatArray
    pressure: FloatArray
    kinks: list[tuple[float, float]]
    coexistences: list[float]
    ends_at: float | None  # pressure of the collapse


def _phase(
    pressure: FloatArray, area: float, moduli: tuple[float, float], kink: float
) -> FloatArray:
    """Area of a condensed film: `area` at zero pressure, one modulus below `kink`, another above."""
    below = np.minimum(pressure, kink) / moduli[0]
    above = np.maximum(pressure - kink, 0.0) / moduli[1]
    return area * np.exp(-below - above)


def _fluid(pressure: FloatArray, co_area: float, cohesion: float, count: float) -> FloatArray:
    return co_area + count * _KT / (pressure + cohesion)


def _film(kind: str, rng: np.random.Generator) -> _Curve:
    if kind in ("acid", "stopped_acid", "condensed"):
        soft = float(rng.uniform(60, 220))
        moduli = (soft, soft * float(rng.uniform(2, 6)))
        kink = 1e6 if kind == "condensed" else float(rng.uniform(15, 32))
        area = float(rng.uniform(0.2, 0.24)) * float(np.exp(min(kink, 25.0) / soft))
        top = float(rng.uniform(38, 62))
        pressure = np.linspace(0.0, top, 4000)
        kinks = (
            []
            if kind == "condensed"
            else [(float(_phase(np.array(kink), area, moduli, kink)), kink)]
        )
        return _Curve(_phase(pressure, area, moduli, kink), pressure, kinks, [], top)
    if kind in ("fluid", "stopped_fluid", "gas"):
        top = float(rng.uniform(1.5, 4.0) if kind == "gas" else rng.uniform(35, 48))
        pressure = np.linspace(0.0, top, 4000)
        state = float(rng.uniform(0.35, 0.5)), float(rng.uniform(5, 15)), float(rng.uniform(1, 2.5))
        return _Curve(_fluid(pressure, *state), pressure, [], [], None if kind == "gas" else top)
    state = float(rng.uniform(0.38, 0.48)), float(rng.uniform(4, 10)), float(rng.uniform(1, 2))
    level, top = float(rng.uniform(4, 16)), float(rng.uniform(45, 68))
    expanded = float(_fluid(np.array(level), *state))
    condensed = min(float(rng.uniform(0.45, 0.6)), 0.75 * expanded)
    soft = float(rng.uniform(120, 300))
    moduli = (soft, soft * float(rng.uniform(1.8, 4)))
    kink = float(rng.uniform(level + 12, top - 10)) if kind == "coexistence_kink" else 1e6
    pressure = np.linspace(0.0, top, 60_000)
    stiff = _phase(pressure - level, condensed, moduli, kink - level)
    drive = (pressure - level) * (expanded - condensed) * float(rng.uniform(60, 600)) / _KT
    share = 1.0 / (1.0 + np.exp(-np.clip(drive, -500.0, 500.0)))
    area = share * stiff + (1.0 - share) * _fluid(pressure, *state)
    kinks = [(float(np.interp(kink, pressure, stiff)), kink)] if kind == "coexistence_kink" else []
    return _Curve(area, pressure, kinks, [level], top)


def _beyond(top: float, form: str, rng: np.random.Generator) -> tuple[FloatArray, FloatArray]:
    """Share of area lost after the collapse, and the pressure there."""
    lost = np.linspace(0.0, 1.0 - float(rng.uniform(0.75, 0.92)), 1200)[1:]
    if form == "level":
        return lost, top + float(rng.uniform(0, 5)) * lost
    if form == "fall":
        return lost, top - float(rng.uniform(20, 80)) * lost * np.exp(-3.0 * lost)
    if form == "peak":
        drop, within = float(rng.uniform(4, 15)), float(rng.uniform(0.004, 0.02))
        return lost, top - drop * (1.0 - np.exp(-lost / within))
    return lost, top + float(rng.uniform(2, 4)) * (1.0 - np.exp(-lost / 0.03))


def simulate_states(seed: int) -> tuple[Trace, StatesTruth]:
    """Simulate one run; even seeds are for tuning, odd ones for reporting."""
    rng = np.random.default_rng([seed, 77])
    kind = KINDS[(seed // 2) % len(KINDS)]
    curve = _film(kind, rng)
    lift = curve.area[0]
    start = np.linspace(lift * float(rng.uniform(1.05, 2.0)), lift, 800)[:-1]
    area = np.concatenate([start, curve.area])
    pressure = np.concatenate([np.zeros(start.size), curve.pressure])
    collapse, form, highest = None, "", float(pressure[-1])
    kinks = curve.kinks
    if kind.startswith("stopped") and curve.ends_at is not None:
        stop = float(rng.uniform(0.55, 0.9)) * curve.ends_at
        stop = max(stop, *(p + _CLEAR for _, p in kinks)) if kinks else stop
        area, pressure = area[pressure <= stop], pressure[pressure <= stop]
        highest = stop
    elif curve.ends_at is not None:
        form = COLLAPSES[int(rng.integers(len(COLLAPSES)))]
        collapse = (float(area[-1]), curve.ends_at)
        lost, after = _beyond(curve.ends_at, form, rng)
        area = np.concatenate([area, area[-1] * (1.0 - lost)])
        pressure = np.concatenate([pressure, after])
        highest = float(pressure.max())
    trace = _record(area, pressure, rng)
    truth = StatesTruth(kind, collapse, tuple(kinks), tuple(curve.coexistences), highest, form)
    return trace, truth


def _record(area: FloatArray, pressure: FloatArray, rng: np.random.Generator) -> Trace:
    """Compress at a steady speed and read: lag, noise, drift, offset, digits, jitter."""
    rows = int(np.exp(rng.uniform(np.log(600), np.log(15_000))))
    moment = np.linspace(0.0, 1.0, rows)
    if rng.random() < 0.3:
        moment = np.sort(np.concatenate([[0.0, 1.0], rng.random(rows - 2)]))
    fine = np.linspace(0.0, 1.0, 40_000)
    seen = np.interp(-(area[0] + (area[-1] - area[0]) * fine), -area, pressure)
    lag = float(rng.uniform(1e-5, 0.0015))  # share of the run
    gain = 1.0 - np.exp(-(fine[1] - fine[0]) / lag)
    seen = lfilter([gain], [1.0, gain - 1.0], seen, zi=[seen[0] * (1.0 - gain)])[0]
    noise = float(np.exp(rng.uniform(np.log(0.01), np.log(0.2))))
    reading = np.interp(moment, fine, seen) + noise * rng.standard_normal(rows)
    reading = (
        reading + float(rng.uniform(0, 0.25)) * _wander(rows, rng) + float(rng.uniform(-0.3, 0.3))
    )
    digit = (0.0, 0.01, 0.05, 0.1)[int(rng.integers(4))]
    if digit:
        reading = np.round(reading / digit) * digit
    at = area[0] + (area[-1] - area[0]) * moment
    at = at + area[0] * float(rng.uniform(0, 1e-4)) * rng.standard_normal(rows)
    return Trace(at, reading, Source("simulated.txt", "", rows), time=moment * 3600.0)


def _wander(rows: int, rng: np.random.Generator) -> FloatArray:
    """1/f noise from zero, of range one."""
    frequency = np.fft.rfftfreq(rows)
    frequency[0] = frequency[1]
    series = np.fft.irfft(np.fft.rfft(rng.standard_normal(rows)) / np.sqrt(frequency), rows)
    return np.asarray((series - series[0]) / max(float(np.ptp(series)), 1e-12))
