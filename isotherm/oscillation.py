"""Barrier oscillations: complex dilational modulus at every frequency of a record."""

from __future__ import annotations

import cmath
import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.oscillation_checks import amplitude_checks, quasi_static
from isotherm.oscillation_fit import Sinusoid, fit_sinusoid, refine_frequency
from isotherm.oscillation_result import OscillationResult, OscillationSegment
from isotherm.oscillation_segments import OscillatingStretch, find_stretches
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.trace import Trace

__all__ = ["NONLINEARITY_LIMIT", "analyse_oscillation"]

FloatArray = NDArray[np.float64]

# Harmonics above this part of the first call the response non-linear. Practice: 5 %, for the user to set.
NONLINEARITY_LIMIT: Final = 0.05
_SETTLING_CYCLES: Final = 1.0  # left out where more than _LONG cycles follow: the film settles
_LONG: Final = 4.0
_SAMPLES_A_PERIOD: Final = 8.0  # fewer: instruments that average between readings flatten the wave
_LARGE_STRAIN: Final = 0.10  # practice: beyond it no film is linear
_DRAWN: Final = 4000  # points of the record kept for the figure
_LOOP: Final = 600  # points of a loop kept for the figure


def analyse_oscillation(
    trace: Trace,
    *,
    isotherm: IsothermResult | None = None,
    delay: Quantity | None = None,
    limit: float = NONLINEARITY_LIMIT,
) -> OscillationResult:
    """Complex dilational modulus of every stretch of constant frequency and amplitude.

    Parameters
    ----------
    trace : Trace
        With time. Only ratios of area matter, so its scale does not.
    isotherm : IsothermResult, optional
        For the quasi-static modulus at the same pressure.
    delay : Quantity, optional
        s, by which pressure readings come later than area readings; corrected, with its u.
    limit : float
        Largest part of unexplained harmonics of a linear response, 1.

    Returns
    -------
    OscillationResult

    Raises
    ------
    UpstrokeError
        Without time, or where no oscillation of two cycles is found.

    Notes
    -----
    E* = dγ/d ln A = -Π̃/ln Ã, phasors of e^{iωt}; E' storage, E'' = ω η_d loss (Lucassen & van den
    Tempel, Chem. Eng. Sci. 1972, 27, 1283; from memory). Frequency and phase are fitted on the area, the
    pressure at the same frequency; both with drift and harmonics.
    """
    path = trace.source.path
    if trace.time is None:
        raise UpstrokeError(
            "no time in this record", where=path, remedy="export time beside area and pressure"
        )
    good = np.isfinite(trace.time) & (trace.area > 0) & np.isfinite(trace.pressure)
    time, area, pressure = trace.time[good], trace.area[good], trace.pressure[good]
    stretches = find_stretches(time, area)
    if not stretches:
        raise UpstrokeError(
            "no oscillation of two cycles or more in the area",
            where=path,
            remedy="give the record of the oscillating barriers, with the area as it moved",
        )
    segments = tuple(
        _segment(i, s, time, area, pressure, trace, isotherm, delay, limit)
        for i, s in enumerate(stretches, start=1)
    )
    warnings = []
    if delay is None:
        warnings.append(
            "no delay of the pressure reading is given: whatever it is, it is in phase and loss modulus"
        )
    if len(time) != len(trace.area):
        warnings.append(
            f"{len(trace.area) - len(time)} rows without time, area or pressure left out"
        )
    step = max(1, len(time) // _DRAWN)
    return OscillationResult(
        name=trace.title or path,
        path=path,
        segments=segments,
        amplitude_checks=amplitude_checks(segments),
        time=time[::step],
        area=area[::step],
        pressure=pressure[::step],
        limit=limit,
        warnings=tuple(warnings),
    )


def _segment(
    number: int,
    stretch: OscillatingStretch,
    time: FloatArray,
    area: FloatArray,
    pressure: FloatArray,
    trace: Trace,
    isotherm: IsothermResult | None,
    delay: Quantity | None,
    limit: float,
) -> OscillationSegment:
    rows = slice(stretch.first, stretch.last)
    t, strain, wave = time[rows], np.log(area[rows]), pressure[rows]
    if 0.5 * stretch.half_cycles > _LONG:
        settled = t >= t[0] + _SETTLING_CYCLES * stretch.period
        t, strain, wave = t[settled], strain[settled], wave[settled]
    omega = refine_frequency(t, strain, stretch.period)
    of_area, of_pressure = fit_sinusoid(t, strain, omega), fit_sinusoid(t, wave, omega)
    late = 0.0 if delay is None else delay.value
    orders = np.arange(1, len(of_area.phasors) + 1)
    response = of_pressure.phasors * np.exp(1j * orders * omega * late)
    modulus = complex(-response[0] / of_area.phasors[0])
    size = abs(of_area.phasors[0])
    # noise of both phasors is alike in its two parts, and so is that of their ratio
    random = math.hypot(of_pressure.u, abs(modulus) * of_area.u) / size
    turned = omega * (delay.u or 0.0) if delay is not None else 0.0
    angle = cmath.phase(modulus)
    unexplained = response[1:] + modulus * of_area.phasors[1:]
    first = abs(response[0])
    nonlinear = float(np.sqrt(np.sum(np.abs(unexplained) ** 2))) / first
    u_nonlinear = math.sqrt(len(unexplained)) * random * size / first
    span = float(t[-1] - t[0])
    cycles = omega * span / (2.0 * math.pi)
    frequency = omega / (2.0 * math.pi)
    # frequency of a fitted sinusoid: √6/(π T) of its relative amplitude error (Cramér-Rao)
    u_frequency = math.sqrt(6.0) / (math.pi * span) * of_area.u / size
    mean_pressure = Quantity.combine(
        of_pressure.level,
        "mN/m",
        u_random=float(np.std(of_pressure.residual)) / math.sqrt(len(t)),
        u_systematic=trace.pressure_u,
    )
    flags = _flags(t, stretch, size, of_pressure, first, cycles)
    storage = Quantity.combine(
        modulus.real, "mN/m", u_random=random, u_systematic=abs(modulus.imag) * turned
    )
    loss = Quantity.combine(
        modulus.imag, "mN/m", u_random=random, u_systematic=abs(modulus.real) * turned
    )
    whole = Quantity(abs(modulus), random, "mN/m")
    thin = max(1, len(t) // _LOOP)
    return OscillationSegment(
        number=number,
        start=float(t[0]),
        end=float(t[-1]),
        cycles=cycles,
        frequency=Quantity(frequency, u_frequency, "Hz"),
        amplitude=Quantity(size, of_area.u, "1"),
        pressure=mean_pressure,
        pressure_amplitude=Quantity(first, of_pressure.u, "mN/m"),
        storage=storage,
        loss=loss,
        modulus=whole,
        phase=Quantity(
            math.degrees(angle), math.degrees(math.hypot(random / abs(modulus), turned)), "deg"
        ),
        viscosity=Quantity(loss.value / omega, (loss.u or 0.0) / omega, "mN s/m"),
        area_distortion=_distortion(of_area),
        pressure_distortion=_distortion(of_pressure),
        nonlinearity=Quantity(nonlinear, u_nonlinear, "1"),
        linear=bool(nonlinear - 2.0 * u_nonlinear < limit),
        quasi_static=quasi_static(whole, mean_pressure, isotherm),
        strain=(strain - of_area.drift)[::thin],
        pressure_wave=(wave - of_pressure.drift)[::thin],
        flags=flags,
    )


def _distortion(wave: Sinusoid) -> float:
    return float(np.sqrt(np.sum(np.abs(wave.phasors[1:]) ** 2)) / abs(wave.phasors[0]))


def _flags(
    time: FloatArray,
    stretch: OscillatingStretch,
    size: float,
    of_pressure: Sinusoid,
    first: float,
    cycles: float,
) -> tuple[str, ...]:
    found: list[str] = []
    per_period = len(time) / max(cycles, 1e-9)
    if per_period < _SAMPLES_A_PERIOD:
        found.append(f"only {per_period:.0f} readings a period")
    if size > _LARGE_STRAIN:
        found.append(f"amplitude {100 * size:.0f} %: hardly linear for any film")
    if first < 3.0 * of_pressure.u:
        found.append("the pressure does not follow beyond its noise")
    if cycles < 3.0:
        found.append(f"only {cycles:.1f} cycles")
    moved = abs(of_pressure.slope) * stretch.period
    if moved > 0.1 * first:
        found.append(f"pressure drifts by {moved:.2g} mN/m a period: the film relaxes or is lost")
    return tuple(found)
