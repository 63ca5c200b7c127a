"""How many molecules were spread, and how well that is known."""

from __future__ import annotations

import math
from typing import Final

from isotherm.constants import AVOGADRO
from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.sheet import Film

__all__ = ["NM2_PER_CM2", "mean_molar_mass", "molecules_spread"]

NM2_PER_CM2: Final = 1e14  # (10^7 nm/cm)^2
_LITRE_PER_MICROLITRE: Final = 1e-6
_GRAM_PER_MICROLITRE_AT_1_MG_PER_ML: Final = 1e-6  # 1 mg/mL = 1 µg/µL
_MOL_PER_MMOL: Final = 1e-3


def mean_molar_mass(film: Film) -> Quantity | None:
    """Σ x_i M_i of the film in g/mol, with u from every x_i and M_i; None where a mass is missing.

    The mole fractions are taken as independent: their sum is one by construction of the mixture, and
    for two components this overstates u slightly rather than hiding it.
    """
    if not film.components or any(c.molar_mass is None for c in film.components):
        return None
    value = 0.0
    variance = 0.0
    for component in film.components:
        mass, fraction = component.molar_mass, component.mole_fraction
        if mass is None:  # unreachable, for the type checker
            return None
        value += fraction.value * mass.value
        variance += (fraction.value * (mass.u or 0.0)) ** 2
        variance += ((fraction.u or 0.0) * mass.value) ** 2
    return Quantity.combine(value, "g/mol", u_random=None, u_systematic=math.sqrt(variance))


def molecules_spread(film: Film) -> Quantity:
    """Number of molecules spread, unit "1"; u is the spreading budget, common to the whole run.

    n = N_A V c / M for a mass concentration (mg/mL), N_A V c for a molar one (mmol/L), times purity.

    Raises
    ------
    UpstrokeError
        Where volume, concentration or molar mass is missing, or the number is not positive.
    """
    volume, concentration = film.volume, film.concentration
    missing = [
        name
        for name, given in (("volume", volume), ("concentration", concentration))
        if given is None
    ]
    if volume is None or concentration is None:
        raise UpstrokeError(
            f"the number of molecules spread is unknown: [film] lacks {' and '.join(missing)}",
            where="run sheet",
            remedy='add, for example, volume = "50 ± 0.5 µL" and concentration = "1.00 ± 0.01 mg/mL"',
        )
    factors = [volume, concentration]
    if concentration.unit == "mmol/L":
        moles = volume.value * _LITRE_PER_MICROLITRE * concentration.value * _MOL_PER_MMOL
    else:
        mass = mean_molar_mass(film)
        if mass is None:
            raise UpstrokeError(
                "a mass concentration needs the molar mass",
                where="run sheet, [film]",
                remedy='add, for example, molar_mass = "284.48 g/mol"',
            )
        factors.append(mass)
        grams = volume.value * concentration.value * _GRAM_PER_MICROLITRE_AT_1_MG_PER_ML
        moles = grams / mass.value
    if film.purity is not None:
        factors.append(film.purity)
        moles *= film.purity.value
    number = AVOGADRO * moles
    if not (math.isfinite(number) and number > 0):
        raise UpstrokeError(
            f"the number of molecules spread comes out as {number:.3g}",
            where="run sheet, [film]",
            remedy="volume, concentration, molar mass and purity must all be positive",
        )
    relative = math.sqrt(sum(((f.u or 0.0) / f.value) ** 2 for f in factors))
    stated = any(f.u for f in factors)
    return Quantity.combine(
        number, "1", u_random=None, u_systematic=number * relative if stated else None
    )
