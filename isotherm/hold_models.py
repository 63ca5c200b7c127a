"""Published laws of film loss, each as the growing part g(t) of y(t) = y0 [1 - L g(t)].

y is the area of an isobaric hold or the pressure of an isochoric one, t the time since the set point was
reached.

constant     L = 0: no loss.
desorption   g = sqrt(t): early dissolution limited by diffusion into the subphase, A/A0 = 1 - k sqrt(t)
             (Ter Minassian-Saraga, J. Colloid Sci. 1956, 11, 398; Gaines, Insoluble Monolayers at
             Liquid-Gas Interfaces, Interscience 1966, ch. 4). From memory as to pages.
dissolution  g = t: steady dissolution through a diffusion layer of constant thickness (same sources),
             A/A0 = 1 - r t.
nucleation   g = 1 - exp[-ln 2 (t / t_half)^x]: centres of the bulk phase appear and grow at the expense
             of the film (Vollhardt & Retter, J. Phys. Chem. 1991, 95, 3723), (A0 - A)/(A0 - A_inf) =
             1 - exp(-K t^x) with K = ln 2 / t_half^x and A_inf = A0 (1 - L).
relaxation   g = 1 - exp(-t / tau): first-order approach to a bound, the whole change being L.

The exponent of `nucleation` follows from the convolution V(t) = integral of N'(s) v(t - s) ds of the
nucleation rate N' with the volume v a centre reaches, overlap of the centres taken into account after
Avrami, 1 - exp(-V). Film molecules join a centre along its edge on the surface, so dv/dt is proportional
to its perimeter: v ~ t^(3/2) for a hemisphere (v ~ r^3), v ~ t^2 for a disc of constant height (v ~ r^2).
Instantaneous nucleation (N' a pulse) leaves the power as it is, progressive nucleation (N' constant) adds
one: x = 1.5, 2.5 (hemisphere) and 2, 3 (disc). Here x is free within the bounds below, because real
nucleation lies between the two limits; the nearest limit is named in the result.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["LAWS", "Law", "growth", "growth_rate", "nucleation_type"]

FloatArray = NDArray[np.float64]

LN2 = float(np.log(2.0))
# Exponents of edge growth lie between 1.5 and 3, up to 4 for centres growing freely in three dimensions;
# a margin on both sides lets the estimate reach its bounds without being cut.
EXPONENT_BOUNDS = (1.2, 4.5)


@dataclass(frozen=True)
class Law:
    """One law of film loss.

    name : as in the module's docstring.
    times : number of time constants (0 or 1) among its shape parameters.
    exponent : whether it has an exponent.
    bounded : whether L is the whole change, hence at most 1.
    signed : whether a gain (L < 0) is physically meaningful.
    parameters : free parameters of the level (the noise's not counted).
    """

    name: str
    times: int
    exponent: bool
    bounded: bool
    signed: bool
    parameters: int


LAWS: dict[str, Law] = {
    "constant": Law("constant", 0, False, False, False, 1),
    "desorption": Law("desorption", 0, False, False, False, 2),
    "dissolution": Law("dissolution", 0, False, False, True, 2),
    "relaxation": Law("relaxation", 1, False, True, True, 3),
    "nucleation": Law("nucleation", 1, True, True, False, 4),
}

_TYPES = {
    1.5: "instantaneous nucleation, hemispherical edge growth",
    2.0: "instantaneous nucleation, disc edge growth",
    2.5: "progressive nucleation, hemispherical edge growth",
    3.0: "progressive nucleation, disc edge growth",
}


def nucleation_type(exponent: float) -> str:
    """Name the limiting case of Vollhardt & Retter (1991) whose exponent is nearest."""
    return _TYPES[min(_TYPES, key=lambda x: abs(x - exponent))]


def growth(
    name: str, time: FloatArray, time_constant: FloatArray, exponent: FloatArray
) -> FloatArray:
    """Growing part g(t) of a law.

    Parameters
    ----------
    name : str
        Key of `LAWS`.
    time : (m,) array
        s, not negative.
    time_constant : (k,) array
        tau or t_half, s; not used by laws without one.
    exponent : (k,) array
        x of `nucleation`; not used by the others.

    Returns
    -------
    (m, k) array
        g; s^0.5 for desorption, s for dissolution, else dimensionless. k = 1 for laws without shape.
    """
    t = np.maximum(np.asarray(time, dtype=float), 0.0)[:, None]
    if name == "constant":
        return np.asarray(np.zeros_like(t))
    if name == "desorption":
        return np.asarray(np.sqrt(t))
    if name == "dissolution":
        return np.asarray(t.copy())
    if name == "relaxation":
        return np.asarray(-np.expm1(-t / time_constant))
    return np.asarray(-np.expm1(-LN2 * (t / time_constant) ** exponent))


def growth_rate(
    name: str, time: FloatArray, time_constant: FloatArray, exponent: FloatArray
) -> FloatArray:
    """Time derivative of `growth` (per second times its unit), same parameters and shape."""
    t = np.asarray(time, dtype=float)[:, None]
    if name == "constant":
        return np.asarray(np.zeros_like(t))
    if name == "desorption":
        with np.errstate(divide="ignore"):
            return np.asarray(0.5 / np.sqrt(t))
    if name == "dissolution":
        return np.asarray(np.ones_like(t))
    if name == "relaxation":
        return np.asarray(np.exp(-t / time_constant) / time_constant)
    scaled = t / time_constant
    slope = LN2 * exponent / time_constant * scaled ** (exponent - 1.0)
    return np.asarray(slope * np.exp(-LN2 * scaled**exponent))
