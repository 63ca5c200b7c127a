"""Area of each cycle at a fixed pressure, and how far it moves from cycle to cycle."""

from __future__ import annotations

import numpy as np

from isotherm.cycles_result import AreaShift, BranchCurve, BranchWork
from isotherm.quantity import Quantity
from isotherm.straight_line import straight_line

__all__ = ["area_at", "area_shifts"]

_REACH = 4  # blocks on each side of the crossing, for the line through it


def area_at(curve: BranchCurve, pressure: float) -> Quantity | None:
    """Area at which a branch passes a pressure, nm^2.

    Parameters
    ----------
    curve : BranchCurve
        Largest area first.
    pressure : float
        mN/m.

    Returns
    -------
    Quantity or None
        Random u from the scatter of a straight line through the blocks around the crossing; None where the
        branch does not pass the pressure on its way up.
    """
    above = np.flatnonzero(curve.pressure >= pressure)
    if above.size == 0 or above[0] == 0 or curve.pressure[0] >= pressure:
        return None
    crossing = int(above[0])
    part = slice(max(crossing - _REACH, 0), crossing + _REACH)
    area, level = curve.area[part], curve.pressure[part]
    centre = float(area.mean())
    slope, middle = straight_line(area - centre, level)
    if slope >= 0:
        return None
    shift = (pressure - middle) / slope
    spread = float(((area - centre) ** 2).sum())
    scatter = (
        float(np.std(level - middle - slope * (area - centre), ddof=2)) if area.size > 2 else 0.0
    )
    noise = max(curve.noise, scatter)
    u = noise / abs(slope) * np.sqrt(1.0 / area.size + shift**2 / spread)
    return Quantity(centre + float(shift), float(u), "nm^2")


def _difference(later: Quantity, earlier: Quantity, relative_u: float | None) -> Quantity:
    """Difference of two areas of one run: the scale's error is common, so it only scales the difference."""
    value = later.value - earlier.value
    random = float(np.hypot(later.u_random or 0.0, earlier.u_random or 0.0))
    return Quantity.combine(
        value, "nm^2", u_random=random, u_systematic=(relative_u or 0.0) * abs(value)
    )


def area_shifts(
    works: list[tuple[int, BranchWork]],
    pressure: float,
    relative_u: float | None,
    pressure_u: float,
) -> list[AreaShift]:
    """Area at one pressure for every branch that passes it, with its shifts.

    Parameters
    ----------
    works : list of (cycle number, BranchWork)
        Branches of one direction, in order.
    pressure : float
        mN/m.
    relative_u : float or None
        Relative u of the area scale, common to all cycles.
    pressure_u : float
        Systematic u of pressure, mN/m, common to all cycles.

    Returns
    -------
    list of AreaShift
    """
    shifts: list[AreaShift] = []
    for number, work in works:
        found = area_at(work.curve, pressure)
        if found is None:
            continue
        near = int(np.argmin(np.abs(work.curve.area - found.value)))
        part = slice(max(near - _REACH, 0), near + _REACH + 1)
        slope = straight_line(work.curve.area[part], work.curve.pressure[part])[0]
        by_pressure = pressure_u / abs(float(slope)) if slope else 0.0
        scale = (relative_u or 0.0) * found.value
        area = Quantity.combine(
            found.value,
            "nm^2",
            u_random=found.u,
            u_systematic=float(np.hypot(scale, by_pressure)),
        )
        first, previous = (shifts[0], shifts[-1]) if shifts else (None, None)
        from_first = _difference(area, first.area, relative_u) if first else None
        part_lost = None
        if first is not None and from_first is not None:
            ratio = from_first.value / first.area.value
            u = (from_first.u_random or 0.0) / first.area.value
            part_lost = Quantity(ratio, float(u), "1")
        shifts.append(
            AreaShift(
                pressure=pressure,
                direction=work.direction,
                cycle=number,
                area=area,
                from_previous=_difference(area, previous.area, relative_u) if previous else None,
                from_first=from_first,
                part=part_lost,
            )
        )
    return shifts
