"""Surface tension of pure water against temperature."""

from __future__ import annotations

from typing import Final

from isotherm.errors import UpstrokeError

__all__ = ["surface_tension", "surface_tension_slope"]

# IAPWS R1-76(2014), Revised Release on Surface Tension of Ordinary Water Substance.
CRITICAL_TEMPERATURE: Final = 647.096  # K
AMPLITUDE: Final = 235.8  # mN/m
EXPONENT: Final = 1.256  # 1
CORRECTION: Final = 0.625  # 1
TRIPLE_POINT: Final = 273.16  # K
# The release reports reasonable extrapolation into the supercooled region down to -25 °C.
LOWEST_TEMPERATURE: Final = 248.15  # K


def surface_tension(kelvin: float) -> float:
    """Surface tension of ordinary water against its vapour.

    Parameters
    ----------
    kelvin : float
        Temperature, K, from 248.15 to 647.096.

    Returns
    -------
    float
        Tension, mN/m.

    Raises
    ------
    UpstrokeError
        Outside the range of the equation.

    Notes
    -----
    IAPWS R1-76(2014): 235.8 (1 - T/Tc)^1.256 [1 - 0.625 (1 - T/Tc)] mN/m.
    """
    tau = _reduced(kelvin)
    return float(AMPLITUDE * tau**EXPONENT * (1.0 - CORRECTION * tau))


def surface_tension_slope(kelvin: float) -> float:
    """dγ/dT of ordinary water, mN/m/K, at `kelvin` (K): the derivative of `surface_tension`."""
    tau = _reduced(kelvin)
    by_tau = AMPLITUDE * (
        EXPONENT * tau ** (EXPONENT - 1.0) - CORRECTION * (EXPONENT + 1.0) * tau**EXPONENT
    )
    return float(-by_tau / CRITICAL_TEMPERATURE)


def _reduced(kelvin: float) -> float:
    if not LOWEST_TEMPERATURE <= kelvin <= CRITICAL_TEMPERATURE:
        raise UpstrokeError(
            f"no surface tension of water at {kelvin - 273.15:.1f} degC",
            remedy="give a temperature between -25 and 373 degC, or the measured tension of the clean "
            "subphase as [subphase] tension",
        )
    return 1.0 - kelvin / CRITICAL_TEMPERATURE
