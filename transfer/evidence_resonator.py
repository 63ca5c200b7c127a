"""Frequency of a quartz resonator: each layer's mass lowers it (Sauerbrey)."""

from __future__ import annotations

import math
from typing import Final

from isotherm.quantity import Quantity
from transfer.evidence_ledger import LedgerView
from transfer.evidence_optical import SURFACE_DENSITY
from transfer.evidence_reading import (
    Increment,
    Reading,
    build_reading,
    film_key,
    films_of,
    setting,
)
from transfer.evidence_series import EvidenceSeries

__all__ = ["QUARTZ_DENSITY", "QUARTZ_SHEAR_MODULUS", "mass_sensitivity", "resonator_reading"]

# AT-cut quartz, as used by Sauerbrey, Z. Phys. 1959, 155, 206, and since.
QUARTZ_DENSITY: Final = 2.648  # g/cm^3
QUARTZ_SHEAR_MODULUS: Final = 2.947e11  # g/(cm s^2)


def mass_sensitivity(crystal_frequency: float, overtone: float = 1.0) -> float:
    """Frequency lost per mass gained, Hz per (g/cm^2): 2 n f0² / √(ρq μq).

    Parameters
    ----------
    crystal_frequency : float, Hz
        Fundamental of the bare crystal, f0.
    overtone : float
        n, 1 for the fundamental.

    Source: Sauerbrey, Z. Phys. 1959, 155, 206.
    """
    return 2.0 * overtone * crystal_frequency**2 / math.sqrt(QUARTZ_DENSITY * QUARTZ_SHEAR_MODULUS)


def resonator_reading(series: EvidenceSeries, ledger: LedgerView) -> Reading:
    """Reduce a resonator series (frequency, or its change, in Hz; falling as mass is added).

    Expected per layer: −faces × sensitivity × M/(N_A A). A dipped crystal is coated on both faces
    and both load it; `faces` says how many count. Sauerbrey's relation holds for thin rigid films.

    Raises
    ------
    UpstrokeError
        As `build_reading`.
    """
    notes: list[str] = []
    shown = films_of(series, ledger)
    faces = setting(series, "faces", 2, notes)
    overtone = setting(series, "overtone", 1, notes)
    name = "crystal frequency"
    inputs: dict[str, Quantity | None] = {name: series.quantity("crystal_frequency")}
    increments: dict[str, Increment] = {}
    for film in shown:
        mass = film_key("molar mass", film)
        area = film_key("area per molecule", film)
        inputs[mass] = film.molar_mass
        inputs[area] = film.molecular_area
        increments[film.name] = Increment(
            -faces.value * mass_sensitivity(1.0, overtone.value) * SURFACE_DENSITY,
            ((name, 2.0), (mass, 1.0), (area, -1.0)),
        )
    return build_reading(
        series,
        ledger,
        symbol="frequency",
        unit="Hz",
        increments=increments,
        inputs=inputs,
        shown=shown,
        implies=film_key("area per molecule", shown[0]),
        notes=notes,
    )
