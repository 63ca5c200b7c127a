"""Film loss at any pressure and time, between the holds that were recorded."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_result import Hold, HoldResult
from isotherm.quantity import Quantity
from transfer.target_film import FilmAxis

__all__ = ["LossMap", "loss_map"]

FloatArray = NDArray[np.float64]

_TIMES = 33  # the laws are smooth in time; between these the loss is interpolated


@dataclass(frozen=True)
class LossMap:
    """Part of the film lost, by pressure and time.

    pressure : (h,) mN/m, rising. time : (t,) s, from 0 to the planned time. loss, u_loss : (h, t), 1.
    notes : what was assumed.
    """

    pressure: FloatArray
    time: FloatArray
    loss: FloatArray
    u_loss: FloatArray
    notes: tuple[str, ...] = ()

    @property
    def planned(self) -> float:
        """Planned time, s."""
        return float(self.time[-1])

    def total(self, pressure: FloatArray, k: float = 0.0) -> FloatArray:
        """Loss over the planned time plus k of its u, (n,); NaN above the highest pressure held."""
        value = np.interp(pressure, self.pressure, self.loss[:, -1])
        u = np.interp(pressure, self.pressure, self.u_loss[:, -1])
        return np.asarray(np.where(pressure > self.pressure[-1], np.nan, value + k * u))

    def total_at(self, pressure: float) -> Quantity | None:
        """Loss over the planned time at one pressure, None above the highest pressure held."""
        at = np.array([pressure])
        value = float(self.total(at)[0])
        if not np.isfinite(value):
            return None
        return Quantity(value, float(self.total(at, 1.0)[0]) - value, "1")

    def left(self, pressure: float, time: FloatArray) -> FloatArray:
        """Part of the film left after `time` ((n,) s) at one pressure; the nearest hold beyond the last."""
        return np.asarray(1.0 - self._over_time(self.loss, pressure, time))

    def u_left(self, pressure: float, time: FloatArray) -> FloatArray:
        """Its standard uncertainty, (n,)."""
        return self._over_time(self.u_loss, pressure, time)

    def moved(self, k: float) -> LossMap:
        """The same map with every loss moved by k of its u."""
        return replace(self, loss=self.loss + k * self.u_loss)

    def _over_time(self, values: FloatArray, pressure: float, time: FloatArray) -> FloatArray:
        column = np.array([np.interp(pressure, self.pressure, row) for row in values.T])
        return np.asarray(np.interp(time, self.time, column))


def loss_map(holds: tuple[HoldResult, ...], planned: float, film: FilmAxis) -> LossMap | None:
    """Tabulate the loss every hold foretells over the planned time.

    Parameters
    ----------
    holds : tuple of HoldResult
        Isobaric holds give the loss of area; an isochoric one loses pressure, and dA/A = -dP/M turns that
        into film with the modulus M there (small changes).
    planned : float
        s.
    film : FilmAxis
        The film's modulus.

    Returns
    -------
    LossMap or None
        None without a usable hold. Holds at one pressure are averaged.
    """
    time = planned * np.linspace(0.0, 1.0, _TIMES) ** 2  # the laws change fastest at the start
    rows: list[tuple[float, float, FloatArray, FloatArray]] = []
    notes: list[str] = []
    for hold in (h for result in holds for h in result.holds):
        factor = _film_per_level(hold, film)
        if factor is None:
            notes.append(
                f"the hold at {hold.pressure.value:.1f} mN/m kept the area and lies where the isotherm "
                "gives no modulus: left out"
            )
            continue
        losses = [hold.loss_over(float(t)) for t in time[1:]]
        value = np.array([0.0, *(loss.value * factor for loss in losses)])
        u = np.array([0.0, *((loss.u or 0.0) * factor for loss in losses)])
        rows.append((hold.pressure.value, hold.pressure.u or 0.0, value, u))
        if planned > 1.01 * hold.duration_s:
            notes.append(
                f"the hold at {hold.pressure.value:.1f} mN/m lasted {hold.duration_s / 3600:.2g} h, the "
                f"dipping takes {planned / 3600:.2g} h: its loss is extrapolated"
            )
    if not rows:
        return None
    groups = _by_pressure(sorted(rows, key=lambda row: row[0]))
    means = [_mean(group) for group in groups]
    return LossMap(
        pressure=np.array([m[0] for m in means]),
        time=time,
        loss=np.array([m[1] for m in means]),
        u_loss=np.array([m[2] for m in means]),
        notes=tuple(notes),
    )


def _film_per_level(hold: Hold, film: FilmAxis) -> float | None:
    """Relative film loss per relative loss of the drifting level."""
    if hold.kind == "isobaric":
        return 1.0
    pressure = hold.pressure.value
    modulus = float(film.modulus_at(np.array([pressure]))[0])
    if not (film.lowest <= pressure <= film.highest and modulus > 0):
        return None
    return pressure / modulus


def _by_pressure(
    rows: list[tuple[float, float, FloatArray, FloatArray]],
) -> list[list[tuple[float, float, FloatArray, FloatArray]]]:
    """Neighbours that agree within their uncertainty (k = 2) are repeats of one pressure."""
    groups = [[rows[0]]]
    for row in rows[1:]:
        first = groups[-1][0]
        if row[0] - first[0] <= 2.0 * float(np.hypot(row[1], first[1])):
            groups[-1].append(row)
        else:
            groups.append([row])
    return groups


def _mean(
    group: list[tuple[float, float, FloatArray, FloatArray]],
) -> tuple[float, FloatArray, FloatArray]:
    """Mean of repeats; u holds their own u and how far they disagree, not averaged down."""
    losses = np.array([row[2] for row in group])
    own = np.array([row[3] for row in group])
    scatter = losses.std(axis=0, ddof=1) if len(group) > 1 else np.zeros(losses.shape[1])
    u = np.hypot(np.sqrt((own**2).mean(axis=0)), scatter)
    return float(np.mean([row[0] for row in group])), losses.mean(axis=0), u
