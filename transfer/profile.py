"""Transfer along the substrate inside one stroke: where it starts, where it fails, how even it is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from transfer.contact import Contact, immersion
from transfer.geometry import Geometry
from transfer.ratio_curves import RemovalCurve
from transfer.result import ProfileWindow

__all__ = ["StrokeProfile", "stroke_profile"]

FloatArray = NDArray[np.float64]

# Numbers of windows to try, finest first.
_MOST_WINDOWS = (10, 7, 5, 3, 1)
_LEAST_MM = 2.0
# cm^4; below, the film is gone to nothing and the inverse is no number.
_LEAST_VARIANCE = 1e-100
# A window is worth having when its own uncertainty is below this.
_WANTED_U = 0.03
# Local ratio below this part of the stroke's usual one: film is not taken there.
_FAILS = 0.5
# Chance at which evenness is given up; with 32 strokes a log is then falsely called uneven once in 30 logs.
_CHANCE = 1e-3
# Unevenness below this is of no consequence to anyone, however clear.
_UNEVEN = 0.1
_CLEAR = 3.0


@dataclass(frozen=True)
class StrokeProfile:
    """Windows from the lower edge upwards, and what they show."""

    windows: tuple[ProfileWindow, ...]
    flags: tuple[str, ...]


def stroke_profile(
    curves: list[RemovalCurve], geometry: Geometry, contact: Contact, direction: str
) -> StrokeProfile:
    """Local ratio dA_film/dA_coated along the substrate.

    A continuous broken line through film removed against area coated, anchored at the dwells on both
    sides, by weighted least squares; its slopes are the local ratios, its covariance their uncertainty.

    Parameters
    ----------
    curves : list of RemovalCurve
        The moves of one stroke, in order.
    geometry : Geometry
    contact : Contact
    direction : str
        "down" or "up".

    Returns
    -------
    StrokeProfile
    """
    heights, crossed, removed, variance = _gather(curves, geometry, contact)
    total = float(crossed.max() - crossed.min())
    low, high = float(heights.min()), float(heights.max())
    if total <= 0 or high - low < _LEAST_MM or crossed.size < 6:
        return StrokeProfile((), ())
    most = min(_MOST_WINDOWS[0], int((high - low) / _LEAST_MM), crossed.size // 3)
    fit = None
    for count in _MOST_WINDOWS:
        if count > max(most, 1):
            continue
        fit = _fit(heights, crossed, removed, variance, geometry, direction, count)
        if fit is not None and float(np.median(np.sqrt(np.diag(fit[2])))) <= _WANTED_U:
            break
    if fit is None:
        return StrokeProfile((), ())
    edges, slopes, covariance = fit
    u = np.sqrt(np.diag(covariance))
    windows = tuple(
        ProfileWindow(float(a), float(b), Quantity(float(s), float(v), "1"))
        for a, b, s, v in zip(edges, edges[1:], slopes, u, strict=False)
    )
    return StrokeProfile(windows, _flags(edges, slopes, u, covariance, direction))


def _gather(
    curves: list[RemovalCurve], geometry: Geometry, contact: Contact
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Water line on the substrate (mm), area crossed (cm^2), film removed (cm^2) and its variance."""
    gone = 0.0
    parts: list[tuple[FloatArray, ...]] = []
    for curve in curves:
        reading = np.concatenate([[curve.start], curve.reading, [curve.end]])
        removed = gone + np.concatenate([[0.0], curve.removed, [curve.total]])
        end = max(curve.u_total**2, 1e-12)
        variance = np.concatenate([[end], curve.variance, [end]])
        immersed = immersion(contact, reading)
        area = geometry.mean_coated(immersed, curve.bin_width)
        area[[0, -1]] = geometry.coated(immersed[[0, -1]])
        parts.append((immersed, removed, variance, area))
        gone += curve.total
    area = np.concatenate([p[3] for p in parts])
    return (
        np.maximum(np.concatenate([p[0] for p in parts]), 0.0),
        np.abs(area - area[0]),
        np.concatenate([p[1] for p in parts]),
        np.concatenate([p[2] for p in parts]),
    )


def _fit(
    heights: FloatArray,
    crossed: FloatArray,
    removed: FloatArray,
    variance: FloatArray,
    geometry: Geometry,
    direction: str,
    count: int,
) -> tuple[FloatArray, FloatArray, FloatArray] | None:
    """Edges (mm, rising), local ratios and their covariance for `count` windows; None when undetermined."""
    edges = np.linspace(float(heights.min()), float(heights.max()), count + 1)
    area = geometry.coated(np.where(edges > 0, edges, -1.0))
    path = np.abs(area - (area[0] if direction == "down" else area[-1]))
    if direction == "up":
        path = path[::-1]
    steps = np.diff(path)
    if (steps <= 0).any() or (variance < _LEAST_VARIANCE).any():
        return None
    # film removed at a place = sum of slope x part of each window already crossed
    basis = np.clip(crossed[:, None] - path[None, :-1], 0.0, steps[None, :])
    basis = np.concatenate([basis, np.ones((basis.shape[0], 1))], axis=1)
    weight = 1.0 / variance
    normal = basis.T @ (basis * weight[:, None])
    try:
        inverse = np.linalg.inv(normal)
    except np.linalg.LinAlgError:
        return None
    solution = inverse @ (basis.T @ (weight * removed))
    residual = removed - basis @ solution
    freedom = max(1, crossed.size - count - 1)
    scale = max(1.0, float(residual**2 @ weight) / freedom)
    slopes = np.asarray(solution[:-1], dtype=np.float64)
    covariance = np.asarray(inverse[:-1, :-1] * scale, dtype=np.float64)
    if not (np.isfinite(covariance).all() and (np.diag(covariance) > 0).all()):
        return None  # inverted by rounding alone
    if direction == "up":
        slopes, covariance = slopes[::-1], covariance[::-1, ::-1]
    return edges, slopes, covariance


def _flags(
    edges: FloatArray, slopes: FloatArray, u: FloatArray, covariance: FloatArray, direction: str
) -> tuple[str, ...]:
    """What the windows show, in the order in which they crossed the surface."""
    count = slopes.size
    if count < 3 or float(np.ptp(slopes)) < _UNEVEN:
        return ()
    from scipy.special import chdtrc  # upper tail of chi-squared; scipy.stats is slow to import

    usual = float(np.median(slopes))
    weights = np.linalg.inv(covariance)
    mean = float(weights.sum(axis=0) @ slopes / weights.sum())
    misfit = float((slopes - mean) @ weights @ (slopes - mean))
    if float(chdtrc(count - 1, misfit)) > _CHANCE:
        return ()
    best = float(np.quantile(slopes, 0.75))
    if best < 0.2:
        return ()
    failed = (slopes < _FAILS * best) & (slopes + _CLEAR * u < best)
    order = np.arange(count) if direction == "down" else np.arange(count)[::-1]
    run = failed[order]
    flags: list[str] = []
    at_start = int(np.argmin(run)) if not run.all() else count
    at_end = int(np.argmin(run[::-1])) if not run.all() else 0
    if at_start:
        flags.append(f"late start: little film taken {_span(edges, order[:at_start])}")
    if at_end:
        flags.append(f"transfer fails {_span(edges, order[count - at_end :])}")
    inner = run[at_start : count - at_end]
    if inner.any():
        where = order[at_start : count - at_end][inner]
        flags.append(f"transfer fails part of the way, {_span(edges, where)}")
    if not flags:
        flags.append(
            f"uneven transfer: {slopes.min():.2f} to {slopes.max():.2f} along the substrate "
            f"(usual {usual:.2f})"
        )
    return tuple(flags)


def _span(edges: FloatArray, windows: NDArray[np.intp]) -> str:
    """Words for a stretch of substrate."""
    return (
        f"from {edges[windows.min()]:.1f} to {edges[windows.max() + 1]:.1f} mm above the lower edge"
    )
