"""Charge of a surface-bound wave: find it, take its baseline away, integrate."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_sweeps import Sweep

__all__ = ["Wave", "measure_wave"]

FloatArray = NDArray[np.float64]

# Full width at half maximum of sech²((E − E0)/w) is 2 arcosh(√2) w.
_FWHM_PER_WIDTH = 2.0 * math.acosh(math.sqrt(2.0))
# Beyond two widths at half maximum on either side an ideal wave holds 0.17 % of its charge.
_ZONE = 2.0
# Part of the window that must be left for the baseline on each side of the wave.
_BASELINE_PART = 0.05
# An amplitude of six of its own u, after a search over some hundred places and widths, comes by
# chance in about 1 of 10^6 sweeps when the noise is normal.
_DETECTION = 6.0
_SEARCH_POINTS = 400
_CENTRES = 61
_WIDTHS = 14
_DEGREE = 3
# exp(−(k z)²) falls to one half where sech² z does.
_NORMAL = math.sqrt(math.log(2.0)) / math.acosh(math.sqrt(2.0))


@dataclass(frozen=True)
class Wave:
    """One wave of one sweep.

    potential V (peak), height A (above the baseline), width V (full at half maximum), charge C;
    baseline (k,) polynomial coefficients of (E − centre)/half-window, lowest first; zone V.
    """

    direction: str
    potential: Quantity
    height: Quantity
    width: Quantity
    charge: Quantity
    zone: tuple[float, float]
    baseline: tuple[float, ...]
    centre: float
    half_window: float

    def baseline_at(self, potential: FloatArray) -> FloatArray:
        """Baseline current at `potential` (V), A, (m,)."""
        e = (np.asarray(potential, dtype=float) - self.centre) / self.half_window
        current: FloatArray = np.polynomial.polynomial.polyval(e, np.array(self.baseline))
        return current


def measure_wave(sweep: Sweep, scan_rate: Quantity, path: str) -> Wave:
    """Find the wave of `sweep` and integrate it.

    The wave is found as the bell sech²((E − E0)/w), the ideal form of a surface-bound couple
    (Laviron, J. Electroanal. Chem. 1979, 101, 19), on a cubic baseline; only its place and width are
    used. The baseline then is a polynomial through the current outside ± 2 widths (its degree chosen
    by AICc), and the charge is the integral of what lies above it, divided by the scan rate, whatever
    its shape. u holds noise, baseline (with its correlation from row to row and the choice of its
    degree), and the scan rate's.

    Parameters
    ----------
    sweep : Sweep
    scan_rate : Quantity, V/s
    path : str
        File, for messages.

    Raises
    ------
    UpstrokeError
        No wave stands out of the noise, it is cut by the window, or its charge is negative.
    """
    centre = 0.5 * float(sweep.potential[0] + sweep.potential[-1])
    half = 0.5 * float(sweep.potential[-1] - sweep.potential[0])
    e = (sweep.potential - centre) / half
    current = sweep.current
    scale = float(np.std(current)) or 1.0
    found = _search(e, current / scale)
    if found is None:
        raise UpstrokeError(
            f"no peak stands out of the baseline of the {sweep.direction} sweep",
            where=path,
            remedy="give a voltammogram whose window holds the wave, or leave the point out",
        )
    place, width = found.place, found.width
    fwhm = _FWHM_PER_WIDTH * width
    if abs(place) > 1.0 - fwhm / 2.0:
        raise UpstrokeError(
            f"the peak at {centre + half * place:.3f} V is cut by the potential window of the"
            f" {sweep.direction} sweep",
            where=path,
            remedy="give a record whose window reaches past the wave on both sides",
        )
    zone = (
        max(place - _ZONE * fwhm, -1.0 + 2.0 * _BASELINE_PART),
        min(place + _ZONE * fwhm, 1.0 - 2.0 * _BASELINE_PART),
    )
    inside = (e >= zone[0]) & (e <= zone[1])
    outside_current = current / scale - found.bell(e)
    choices = [_baseline(e[~inside], outside_current[~inside], d) for d in range(1, _DEGREE + 1)]
    best = min(choices, key=lambda c: c.score)
    other = min((c for c in choices if c is not best), key=lambda c: c.score)
    area, spread = _integral(e, current / scale, inside, best)
    tail = found.tail(zone)
    rival, _ = _integral(e, current / scale, inside, other)
    to_charge = scale * half / scan_rate.value
    charge = (area + tail) * to_charge
    # half the correction for what lies outside the zone, which leans on the bell's form
    u_form = math.hypot((area - rival) / math.sqrt(3.0), 0.5 * tail)
    u_charge = math.hypot(spread, u_form) * to_charge
    u_rate = charge * (scan_rate.u or 0.0) / scan_rate.value
    if charge <= 0:
        raise UpstrokeError(
            f"the charge of the {sweep.direction} wave comes out negative ({charge:.2g} C)",
            where=path,
            remedy="check the sign of the current and the window",
        )
    height, u_height = _height(e, current / scale, place, width, best)
    u_place = width * best.noise / max(height, 1e-300) * math.sqrt(2.0 / max(width * len(e), 1.0))
    return Wave(
        direction=sweep.direction,
        potential=Quantity(centre + half * place, half * u_place, "V"),
        height=Quantity(height * scale, u_height * scale, "A"),
        width=Quantity(half * fwhm, None, "V"),
        charge=Quantity(charge, math.hypot(u_charge, u_rate), "C"),
        zone=(centre + half * zone[0], centre + half * zone[1]),
        baseline=tuple(float(c) * scale for c in best.coefficients),
        centre=centre,
        half_window=half,
    )


@dataclass(frozen=True)
class _Bell:
    """Place and width of the wave with the share of two forms of equal width at half maximum."""

    place: float
    width: float
    ideal: float
    normal: float

    def bell(self, e: FloatArray) -> FloatArray:
        z = (e - self.place) / self.width
        out: FloatArray = self.ideal * _sech2(z) + self.normal * _normal(z)
        return out

    def tail(self, zone: tuple[float, float]) -> float:
        """Area of the bell outside `zone`."""
        low, high = ((edge - self.place) / self.width for edge in zone)
        ideal = 2.0 - math.tanh(high) + math.tanh(low)
        root = math.sqrt(math.pi) / 2.0 / _NORMAL
        normal = root * (math.erfc(high * _NORMAL) + math.erfc(-low * _NORMAL))
        return self.width * (self.ideal * ideal + self.normal * normal)


@dataclass(frozen=True)
class _Baseline:
    coefficients: FloatArray
    covariance: FloatArray
    noise: float
    inflation: float
    score: float


def _sech2(z: FloatArray) -> FloatArray:
    out: FloatArray = 1.0 / np.cosh(np.clip(z, -300.0, 300.0)) ** 2
    return out


def _normal(z: FloatArray) -> FloatArray:
    out: FloatArray = np.exp(-((_NORMAL * z) ** 2))
    return out


def _search(e: FloatArray, current: FloatArray) -> _Bell | None:
    """Find the bell that stands out most; None when none does."""
    bins = np.clip(((e + 1.0) / 2.0 * _SEARCH_POINTS).astype(int), 0, _SEARCH_POINTS - 1)
    count = np.bincount(bins, minlength=_SEARCH_POINTS)
    used = count > 0
    x = np.bincount(bins, e, minlength=_SEARCH_POINTS)[used] / count[used]
    y = np.bincount(bins, current, minlength=_SEARCH_POINTS)[used] / count[used]
    centres = np.linspace(-0.95, 0.95, _CENTRES)
    widths = np.geomspace(0.015, 0.25, _WIDTHS)
    grid = np.array([(c, w) for w in widths for c in centres])
    bells = _sech2((x[None, :] - grid[:, :1]) / grid[:, 1:])
    base = np.linalg.qr(np.vander(x, _DEGREE + 1))[0]
    bells = bells - (bells @ base) @ base.T
    left = y - base @ (base.T @ y)
    norm = np.linalg.norm(bells, axis=1)
    projected = (bells @ left) / np.maximum(norm, 1e-12)
    gain = np.where(norm > 0.2, projected, 0.0)
    best = int(np.argmax(gain))
    if gain[best] <= 0:
        return None
    from scipy.optimize import least_squares

    def forms(p: FloatArray) -> FloatArray:
        z = (x - p[0]) / np.exp(p[1])
        both = np.column_stack([_sech2(z), _normal(z)])
        return both - base @ (base.T @ both)

    def miss(p: FloatArray) -> FloatArray:
        both = forms(p)
        out: FloatArray = left - both @ np.linalg.lstsq(both, left, rcond=None)[0]
        return out

    start = np.array([grid[best, 0], math.log(grid[best, 1])])
    solved = least_squares(miss, start, bounds=([-1.0, math.log(0.008)], [1.0, math.log(0.4)]))
    both = forms(solved.x)
    shares = np.linalg.lstsq(both, left, rcond=None)[0]
    bell = both @ (shares / max(abs(float(shares.sum())), 1e-300))
    amplitude = float(shares.sum())
    rest = left - both @ shares
    dof = max(len(x) - _DEGREE - 5, 1)
    noise = math.sqrt(float(rest @ rest) / dof) * math.sqrt(_correlation(rest))
    if amplitude <= _DETECTION * noise / math.sqrt(max(float(bell @ bell), 1e-12)):
        return None
    return _Bell(float(solved.x[0]), float(np.exp(solved.x[1])), float(shares[0]), float(shares[1]))


def _correlation(rest: FloatArray) -> float:
    """Variance inflation of sums of `rest` by its row-to-row correlation (first-order)."""
    total = float(rest @ rest)
    if total <= 0 or len(rest) < 8:
        return 1.0
    lag = float(rest[1:] @ rest[:-1]) / total
    lag = min(max(lag, 0.0), 0.95)
    return (1.0 + lag) / (1.0 - lag)


def _baseline(e: FloatArray, current: FloatArray, degree: int) -> _Baseline:
    design = np.vander(e, degree + 1, increasing=True)
    coefficients = np.linalg.lstsq(design, current, rcond=None)[0]
    rest = current - design @ coefficients
    n = len(e)
    dof = max(n - degree - 1, 1)
    rss = float(rest @ rest)
    variance = max(rss / dof, 1e-30)
    inflation = _correlation(rest)
    # rows that follow each other closely say less than independent ones
    effective = max(n / inflation, degree + 4.0)
    score = effective * math.log(max(rss, 1e-30) / n) + 2.0 * (degree + 2) * effective / max(
        effective - degree - 3.0, 0.5
    )
    covariance = variance * inflation * np.linalg.pinv(design.T @ design)
    return _Baseline(
        coefficients.astype(np.float64),
        covariance.astype(np.float64),
        math.sqrt(variance),
        inflation,
        score,
    )


def _integral(
    e: FloatArray, current: FloatArray, inside: NDArray[np.bool_], baseline: _Baseline
) -> tuple[float, float]:
    """Area above the baseline inside the zone and its u, in scaled units."""
    x, y = e[inside], current[inside]
    step = np.diff(x)
    share = np.zeros_like(x)
    share[:-1] += step / 2.0
    share[1:] += step / 2.0
    design = np.vander(x, len(baseline.coefficients), increasing=True)
    area = float(share @ (y - design @ baseline.coefficients))
    lever = share @ design
    variance = float(lever @ baseline.covariance @ lever)
    variance += baseline.noise**2 * baseline.inflation * float(share @ share)
    return area, math.sqrt(variance)


def _height(
    e: FloatArray, current: FloatArray, place: float, width: float, baseline: _Baseline
) -> tuple[float, float]:
    """Peak height above the baseline: vertex of a parabola through the top, and its u."""
    top = np.abs(e - place) <= 0.5 * width
    x = e[top] - place
    row = np.vander(np.array([place]), len(baseline.coefficients), increasing=True)[0]
    under = float(row @ baseline.coefficients)
    design = np.vander(x, 3, increasing=True)
    coefficients = np.linalg.lstsq(design, current[top], rcond=None)[0]
    spread = np.linalg.pinv(design.T @ design)[0, 0] * baseline.noise**2 * baseline.inflation
    spread += float(row @ baseline.covariance @ row)
    return float(coefficients[0]) - under, math.sqrt(spread)
