"""Pressure of a bare subphase: its zero, its drift with time and its rise as the barriers close.

Four descriptions are fitted by generalised least squares with correlated noise (`hold_noise`): level;
level and drift; level and rise; level, drift and rise. The rise starts at a hinge area and grows linearly
as the surface shrinks, as swept-up contamination does once it is packed enough to show; the hinge is
searched on a grid. The zero is averaged over hinge, noise and descriptions by their weights (as for holds:
AICc, Burnham & Anderson 2002); rise and drift come from the fullest description.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.hold_fit import aicc
from isotherm.hold_noise import NOISE_PARAMETERS, NoiseGrid, noise_grid
from isotherm.quantity import Quantity

__all__ = ["BareFit", "fit_bare"]

FloatArray = NDArray[np.float64]

_HINGES = 24
_HOUR = 3600.0
# Time and area run so closely together above this correlation that drift and rise cannot be told apart.
_TELLABLE = 0.95
_INDEPENDENT = (
    1e-10  # least eigenvalue of scaled normal equations that rounding leaves sure of its sign
)
_WORTH = 18.0  # -2 ln weight beyond which a node carries nothing


@dataclass(frozen=True)
class BareFit:
    """What one record of the bare subphase says.

    zero : pressure at the start (largest area), mN/m.  rise : at the smallest area against the start, drift
    taken out where it could be told apart, mN/m; None without area.
    drift : mN/m/h; None without time, or where it cannot be told from the rise.
    hinge : area where the rise begins, None where no rise is supported.
    fitted : (m,) mN/m.  separable : whether drift and rise were told apart.
    """

    zero: Quantity
    rise: Quantity | None
    drift: Quantity | None
    hinge: Quantity | None
    fitted: FloatArray
    separable: bool


@dataclass(frozen=True)
class _Described:
    """One description at every hinge (i) and covariance (j), flattened to q nodes."""

    score: float
    parameters: int
    effective: float
    weight: FloatArray  # (q,) sums to 1
    beta: FloatArray  # (q, p)
    covariance: FloatArray  # (q, p, p)
    hinge: FloatArray  # (q,)
    deviance: float


def _told_apart(columns: FloatArray) -> NDArray[np.bool_]:
    """Which of (i, m, p) sets of columns are independent, (i,)."""
    size = np.sqrt(np.einsum("iap,iap->ip", columns, columns))
    scaled = columns / np.where(size > 0, size, 1.0)[:, None, :]
    least = np.linalg.eigvalsh(np.einsum("iap,iaq->ipq", scaled, scaled))[:, 0]
    return np.asarray(least > _INDEPENDENT)


def _solve(
    columns: FloatArray, y: FloatArray, grid: NoiseGrid, hinges: FloatArray, parameters: int
) -> _Described:
    """Generalised least squares of y on (i, m, p) columns for every covariance."""
    kept = _told_apart(columns)
    if not kept.any():
        raise UpstrokeError(
            "time and area of the bare record change together in every way: nothing can be told apart",
            remedy="record a bare compression at constant speed, with a row at least every few seconds",
        )
    columns, hinges = columns[kept], hinges[kept]
    n = y.size
    p = columns.shape[2]
    wx = np.einsum("jab,ibp->jiap", grid.whitener, columns, optimize=True)
    wy = grid.whitener @ y
    normal = np.einsum("jiap,jiaq->jipq", wx, wx, optimize=True)
    right = np.einsum("jiap,ja->jip", wx, wy, optimize=True)
    inverse = np.linalg.inv(normal)
    beta = np.einsum("jipq,jiq->jip", inverse, right)
    rss = np.einsum("ja,ja->j", wy, wy)[:, None] - np.einsum("jip,jip->ji", beta, right)
    rss = np.maximum(rss, 1e-12 * max(float(y @ y), 1e-12))
    plain = np.einsum("iap,iaq->ipq", columns, columns)
    log_plain = np.linalg.slogdet(plain)[1]
    deviance = n * np.log(rss / n) + grid.log_det[:, None]
    log_weight = -0.5 * (
        grid.log_det[:, None]
        + np.linalg.slogdet(normal)[1]
        - log_plain[None, :]
        + (n - p) * np.log(rss)
    )
    best = int(np.argmin(deviance))
    freedom = np.maximum(grid.effective - p, 3.0)
    variance = rss / max(n - p, 1) * (freedom / (freedom - 2.0))[:, None]
    flat = log_weight.ravel()
    worth = np.flatnonzero(flat > flat.max() - _WORTH / 2.0)
    weight = np.exp(flat[worth] - flat.max())
    row, column = np.unravel_index(worth, deviance.shape)
    return _Described(
        score=0.0,
        parameters=parameters + NOISE_PARAMETERS,
        effective=float(grid.effective[np.unravel_index(best, deviance.shape)[0]]),
        weight=weight / weight.sum(),
        beta=beta[row, column],
        covariance=inverse[row, column] * variance[row, column][:, None, None],
        hinge=hinges[column],
        deviance=float(deviance.ravel()[best]),
    )


def _mixed(parts: list[tuple[float, _Described, FloatArray]], unit: str) -> Quantity:
    """Mean and u of a linear function (p,) of each description's parameters, over all nodes."""
    weight, value, variance = [], [], []
    for share, one, by in parts:
        weight.append(share * one.weight)
        value.append(one.beta @ by)
        variance.append(np.einsum("p,qpr,r->q", by, one.covariance, by))
    w, v, s = np.concatenate(weight), np.concatenate(value), np.concatenate(variance)
    mean = float(w @ v)
    return Quantity(mean, float(np.sqrt(w @ ((v - mean) ** 2 + s))), unit)


def fit_bare(
    time: FloatArray, area: FloatArray | None, pressure: FloatArray, *, timed: bool
) -> BareFit:
    """Fit zero, drift and rise to a condensed record of a bare subphase.

    Parameters
    ----------
    time : (m,) array
        s from the start (or row number where `timed` is False), increasing.
    area : (m,) array or None
        Any unit; None for a record whose barriers stand still.
    pressure : (m,) array
        mN/m, block means.
    timed : bool
        Whether `time` is time: without it no drift is fitted.

    Returns
    -------
    BareFit
    """
    grid = noise_grid(time)
    hours = (time - time[0]) / _HOUR
    one = np.ones_like(time)
    none = np.zeros(1)
    described: dict[str, _Described] = {
        "level": _solve(np.stack([one], axis=-1)[None], pressure, grid, none, 1)
    }
    if timed:
        described["drift"] = _solve(np.stack([one, hours], axis=-1)[None], pressure, grid, none, 2)
    separable = area is None
    if area is not None:
        low, high = float(area.min()), float(area.max())
        separable = bool(timed and abs(np.corrcoef(time, area)[0, 1]) < _TELLABLE)
        hinges = np.linspace(low, high, _HINGES + 2)[1:-1]
        if separable:
            # the whole range may rise only where drift can be told from it
            hinges = np.append(hinges, high)
        shape = np.maximum(hinges[:, None] - area[None, :], 0.0) / (hinges - low)[:, None]
        level = np.broadcast_to(one, shape.shape)
        described["rise"] = _solve(np.stack([level, shape], axis=-1), pressure, grid, hinges, 3)
        if timed:
            clock = np.broadcast_to(hours, shape.shape)
            columns = np.stack([level, clock, shape], axis=-1)
            described["drift and rise"] = _solve(columns, pressure, grid, hinges, 4)
    likeliest = min(described.values(), key=lambda d: d.deviance + 2 * d.parameters)
    score = {
        name: aicc(d.deviance, d.parameters, likeliest.effective) for name, d in described.items()
    }
    least = min(score.values())
    total = sum(float(np.exp(-0.5 * (s - least))) for s in score.values())
    share = {name: float(np.exp(-0.5 * (s - least))) / total for name, s in score.items()}

    def averaged(by: dict[str, list[float]], unit: str) -> Quantity:
        return _mixed([(share[k], described[k], np.array(v)) for k, v in by.items()], unit)

    span = float(hours[-1])
    zero_by = {
        "level": [1.0],
        "drift": [1.0, 0.0],
        "rise": [1.0, 0.0],
        "drift and rise": [1.0, 0.0, 0.0],
    }
    zero = averaged({k: v for k, v in zero_by.items() if k in described}, "mN/m")
    rise = None
    if area is not None:
        # The fullest description says it without leaning towards none: against a limit, a rise too small
        # to be seen must keep its u. What time and area did together counts as rise where they cannot be
        # told apart.
        drifted = 0.0 if separable else span
        by = np.array([0.0, drifted, 1.0] if timed else [0.0, 1.0])
        rise = _mixed([(1.0, described["drift and rise" if timed else "rise"], by)], "mN/m")
    drift = None
    if timed and separable:
        name = "drift" if area is None else "drift and rise"
        slope = np.array([0.0, 1.0] if area is None else [0.0, 1.0, 0.0])
        drift = _mixed([(1.0, described[name], slope)], "mN/m/h")
    best = min(score, key=lambda name: score[name])
    hinge = None
    rising = share.get("rise", 0.0) + share.get("drift and rise", 0.0)
    if best in ("rise", "drift and rise") and rising > _SUPPORTED:
        chosen = described[best]
        mean = float(chosen.weight @ chosen.hinge)
        step = (float(area.max()) - float(area.min())) / (_HINGES + 1) if area is not None else 0.0
        u = np.hypot(np.sqrt(chosen.weight @ (chosen.hinge - mean) ** 2), step / np.sqrt(12.0))
        hinge = Quantity(mean, float(u), "")
    return BareFit(zero, rise, drift, hinge, _fitted(described[best], best, hours, area), separable)


# Share of weight above which a rise is called one (odds of 19 to 1).
_SUPPORTED = 0.95


def _fitted(
    chosen: _Described, name: str, hours: FloatArray, area: FloatArray | None
) -> FloatArray:
    """Pressure of the likeliest description, averaged over its nodes, (m,)."""
    values = chosen.weight[:, None] * chosen.beta
    out = np.full(hours.size, float(values[:, 0].sum()))
    if "drift" in name:
        out = out + float(values[:, 1].sum()) * hours
    if "rise" in name and area is not None:
        low = float(area.min())
        hinges = chosen.hinge[:, None]
        shape = np.maximum(hinges - area[None, :], 0.0) / (hinges - low)
        out = out + values[:, -1] @ shape
    return np.asarray(out)
