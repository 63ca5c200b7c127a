"""A plate's reading turned into tension, and the probe's two-point calibration."""

from __future__ import annotations

import math
from dataclasses import dataclass

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity

__all__ = ["Calibration", "two_point_calibration", "wilhelmy_tension"]


def wilhelmy_tension(
    force: Quantity, perimeter: Quantity, contact_angle: Quantity | None = None
) -> Quantity:
    """Surface tension from the pull on a plate: gamma = F / (P cos theta).

    Parameters
    ----------
    force : Quantity
        Pull on the plate with its lower edge at the level of the undisturbed surface (no buoyancy), mN.
    perimeter : Quantity
        Wetted perimeter, mm.
    contact_angle : Quantity, optional
        Degrees; 0 where not given, as for a roughened plate wetted completely.

    Returns
    -------
    Quantity
        mN/m. u by GUM eq. 10, with the second-order term of the angle (GUM 5.1.2, note), which is all the
        angle contributes near 0.

    Raises
    ------
    UpstrokeError
        When force or perimeter is not above zero, or the angle is not below 90 degrees.

    Notes
    -----
    L. Wilhelmy, Ann. Phys. 1863, 195, 177.
    """
    degrees = contact_angle.value if contact_angle is not None else 0.0
    if force.value <= 0 or perimeter.value <= 0 or not 0 <= degrees < 90:
        raise UpstrokeError(
            f"a plate pulled by {force.value:g} mN over {perimeter.value:g} mm at {degrees:g} degrees "
            "has no tension",
            where="run sheet, [check]",
            remedy="force and perimeter must be above 0, the contact angle from 0 to below 90",
        )
    angle = math.radians(degrees)
    tension = 1e3 * force.value / (perimeter.value * math.cos(angle))  # mN/mm -> mN/m
    parts = [q.u / q.value for q in (force, perimeter) if q.u is not None]
    if contact_angle is not None and contact_angle.u is not None:
        u = math.radians(contact_angle.u)
        second = 1.0 + 2.0 * math.tan(angle) ** 2  # (1/gamma) d2 gamma / d theta2
        parts += [math.tan(angle) * u, second * u**2 / math.sqrt(2.0)]
    known = tension * math.hypot(*parts) if parts else None
    return Quantity(tension, known, "mN/m")


@dataclass(frozen=True)
class Calibration:
    """true = gain × reading + offset. gain : dimensionless.  offset : mN/m."""

    gain: Quantity
    offset: Quantity


def two_point_calibration(
    low_reading: Quantity, low_true: Quantity, high_reading: Quantity, high_true: Quantity
) -> Calibration:
    """Gain and offset of the probe from two known points.

    Parameters
    ----------
    low_reading, low_true, high_reading, high_true : Quantity
        Readings and known values at two points, mN/m.

    Returns
    -------
    Calibration
        u by GUM eq. 10, the four values taken as independent.

    Raises
    ------
    UpstrokeError
        When the two readings are the same.
    """
    span = high_reading.value - low_reading.value
    if span == 0:
        raise UpstrokeError(
            "both calibration readings are the same",
            where="run sheet, [check]",
            remedy="read the probe at two known values well apart",
        )
    gain = (high_true.value - low_true.value) / span
    offset = low_true.value - gain * low_reading.value
    given = (low_reading, low_true, high_reading, high_true)
    by_gain = (gain / span, -1.0 / span, -gain / span, 1.0 / span)
    low = low_reading.value
    by_offset = (
        -gain - low * gain / span, 1.0 + low / span, low * gain / span, -low / span
    )  # fmt: skip
    known = any(q.u is not None for q in given)

    def combined(by: tuple[float, ...]) -> float | None:
        if not known:
            return None
        return math.hypot(*(d * (q.u or 0.0) for d, q in zip(by, given, strict=True)))

    return Calibration(
        Quantity(gain, combined(by_gain), "1"), Quantity(offset, combined(by_offset), "mN/m")
    )
