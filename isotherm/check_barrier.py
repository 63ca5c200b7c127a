"""Barrier travel against the area the instrument reports."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import robust_noise
from isotherm.quantity import Quantity
from isotherm.straight_line import straight_line
from isotherm.table import Table

__all__ = ["BarrierCheck", "check_barrier"]

FloatArray = NDArray[np.float64]

_FEWEST_ROWS = 12
_PARTS = 24


@dataclass(frozen=True)
class BarrierCheck:
    """departure : largest departure of the area from a straight line in barrier travel, part of its range.

    width : trough width the slope amounts to, mm.
    """

    departure: Quantity
    width: Quantity


def check_barrier(table: Table) -> BarrierCheck | None:
    """Fit trough area against barrier position.

    Parameters
    ----------
    table : Table
        With `area` (cm^2) and `barrier_position` (mm, one or two barriers).

    Returns
    -------
    BarrierCheck or None
        None where either column is missing or nothing moves.
    """
    if "area" not in table.values or "barrier_position" not in table.values:
        return None
    area, position = table.values["area"], table.values["barrier_position"]
    columns = position[:, None] if position.ndim == 1 else position
    good = np.isfinite(area) & np.isfinite(columns).all(axis=1)
    area, columns = area[good], columns[good]
    if area.size < _FEWEST_ROWS or np.ptp(area) == 0 or np.ptp(columns) == 0:
        return None
    # both barriers of a pair move together: one travel, the mean of what each covers towards the other
    signs = [np.sign(straight_line(area, columns[:, i])[0]) or 1.0 for i in range(columns.shape[1])]
    travel = (columns * np.array(signs)).sum(axis=1)
    slope, level = straight_line(travel, area)
    residual = area - slope * travel - level
    order = np.argsort(travel, kind="stable")
    parts = np.array_split(residual[order], min(_PARTS, area.size // 3))
    means = np.array([part.mean() for part in parts])
    scatter = robust_noise(area) if area.size > 3 else 0.0
    u = scatter / np.sqrt(min(part.size for part in parts))
    reach = float(np.ptp(area))
    worst = int(np.argmax(np.abs(means)))
    spread = float(np.sqrt(((travel - travel.mean()) ** 2).sum()))
    u_slope = max(scatter, float(np.std(residual))) / spread
    return BarrierCheck(
        departure=Quantity(float(means[worst]) / reach, float(u) / reach, "1"),
        width=Quantity(abs(float(slope)) * 100.0, float(u_slope) * 100.0, "mm"),  # cm^2/mm -> mm
    )
