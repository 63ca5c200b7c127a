"""Fit a sinusoid with harmonics and drift to one signal of an oscillation."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import robust_noise

__all__ = ["HARMONICS", "Sinusoid", "fit_sinusoid", "refine_frequency"]

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

HARMONICS: Final = 3
_DRIFT_TERMS: Final = 3  # level, slope and bend over the stretch
# time constants of a transient, in periods: shorter ones die at once, longer ones are drift
_TRANSIENTS: Final = (0.1, 0.15, 0.2, 0.3, 0.4, 0.6, 0.8, 1.1, 1.6, 2.2)
_TRANSIENT_P: Final = 1e-3
_WIDEST: Final = 5.0  # times ω, up to which wander is looked for
_WAVES: Final = 40


@dataclass(frozen=True)
class Sinusoid:
    """y = drift + Re Σ_k phasor_k e^{i k ω t}, t from the start of the stretch.

    phasors : (3,) in the unit of y. u : standard uncertainty of the real and of the imaginary part of
    each phasor. level, slope : of the drift, in y and y/s, at mid-stretch. residual : (n,).
    """

    phasors: ComplexArray
    u: float
    drift: FloatArray
    level: float
    slope: float
    residual: FloatArray
    settling: float | None


def _design(time: FloatArray, omega: float) -> FloatArray:
    span = float(time[-1] - time[0])
    x = 2.0 * (time - time[0]) / span - 1.0
    columns = [x**k for k in range(_DRIFT_TERMS)]
    for k in range(1, HARMONICS + 1):
        phase = k * omega * (time - time[0])
        columns += [np.cos(phase), np.sin(phase)]
    return np.column_stack(columns)


def refine_frequency(time: FloatArray, y: FloatArray, period: float) -> float:
    """Angular frequency (rad/s) of the best fit near 2π/`period`: four-parameter sine fit.

    The search stays inside the main lobe, a third of a cycle over the whole stretch (IEEE Std 1057, from
    memory, uses the same least squares).
    """
    from scipy.optimize import minimize_scalar

    span = float(time[-1] - time[0])
    first = 2.0 * math.pi / period
    lobe = 2.0 * math.pi * 0.33 / span

    def cost(omega: float) -> float:
        design = _design(time, omega)
        gram = design.T @ design
        gram[np.diag_indices_from(gram)] *= 1.0 + 1e-12
        projected = design.T @ y
        return -float(projected @ np.linalg.solve(gram, projected))

    found = minimize_scalar(
        cost, bounds=(first - lobe, first + lobe), method="bounded", options={"xatol": 1e-9 * first}
    )
    return float(found.x)


def fit_sinusoid(time: FloatArray, y: FloatArray, omega: float) -> Sinusoid:
    """Least squares at a known frequency.

    Parameters
    ----------
    time : (n,) s; need not be even
    y : (n,)
    omega : float
        rad/s.

    Returns
    -------
    Sinusoid
        u comes from the scatter of the residuals, or from their slow part where that is more: the wander
        of a pressure reading is not white.
    """
    design = _design(time, omega)
    settling, design = _with_transient(time, y, omega, design)
    fit = np.linalg.lstsq(design, y, rcond=None)[0]
    residual = y - design @ fit
    n, k = design.shape
    white = float(residual @ residual) / max(n - k, 1) * 2.0 / n
    variance = max(white, _wander_floor(time, residual, omega))
    last = _DRIFT_TERMS + 2 * HARMONICS
    waves = fit[_DRIFT_TERMS:last]
    phasors = waves[0::2] - 1j * waves[1::2]
    span = float(time[-1] - time[0])
    return Sinusoid(
        phasors=np.asarray(phasors, dtype=np.complex128),
        u=math.sqrt(variance),
        drift=np.asarray(y - residual - design[:, _DRIFT_TERMS:last] @ waves),
        level=float(fit[0]),
        slope=float(2.0 * fit[1] / span),
        residual=residual,
        settling=settling,
    )


def _with_transient(
    time: FloatArray, y: FloatArray, omega: float, design: FloatArray
) -> tuple[float | None, FloatArray]:
    """Add the decay of a film that was at rest before, where it earns its place.

    A linear film set into motion answers with the wave and a transient that dies with its own
    relaxation time; over few cycles the transient would bend amplitude and phase.
    """
    from scipy.special import fdtrc

    n, k = design.shape
    gram = design.T @ design
    rest = y - design @ np.linalg.solve(gram, design.T @ y)
    power = float(rest @ rest)
    period = 2.0 * math.pi / omega
    best, gain, column = 0.0, 0.0, None
    for part in _TRANSIENTS:
        decay = np.exp(-(time - time[0]) / (part * period))
        own = decay - design @ np.linalg.solve(gram, design.T @ decay)
        size = float(own @ own)
        if size < 1e-6 * float(decay @ decay):
            continue
        got = float(own @ rest) ** 2 / size
        if got > gain:
            best, gain, column = part * period, got, decay
    if column is None or power <= 0:
        return None, design
    scatter = max(power - gain, 1e-300) / (n - k - 2)
    # two parameters, strength and time constant
    if float(fdtrc(2, n - k - 2, gain / 2.0 / scatter)) > _TRANSIENT_P:
        return None, design
    return best, np.column_stack([design, column])


def _wander_floor(time: FloatArray, residual: FloatArray, omega: float) -> float:
    """Variance of a phasor's parts at ω from waves of the residual that were not fitted.

    White noise is the same at every frequency; the wander of a pressure reading falls as its square
    (a random walk). Its size is fitted to the residual's waves between half and five times ω, away from
    the fitted ones, and read at ω, which few cycles leave no wave beside.
    """
    n = len(residual)
    span = float(time[-1] - time[0])
    cycles = omega * span / (2.0 * math.pi)
    places = np.arange(max(1.0, math.ceil(0.5 * cycles)), math.floor(_WIDEST * cycles) + 1.0)
    for k in range(1, HARMONICS + 1):
        # waves within a cycle of a fitted one were fitted away with it
        places = places[np.abs(places - k * cycles) >= 1.0]
    if len(places) == 0:
        return 0.0
    if len(places) > _WAVES:
        places = places[np.linspace(0, len(places) - 1, _WAVES).round().astype(int)]
    t = (time - time[0]) / span
    powers = np.empty(len(places))
    for i, place in enumerate(places):  # a fixed number of waves
        phase = 2.0 * math.pi * place * t
        c, s = float(residual @ np.cos(phase)), float(residual @ np.sin(phase))
        powers[i] = 2.0 * (c * c + s * s) / n**2
    white = 2.0 * robust_noise(residual) ** 2 / n
    shape = (cycles / places) ** 2
    return white + max(float((powers - white) @ shape) / float(shape @ shape), 0.0)
