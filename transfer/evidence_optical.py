"""Absorbance of the deposited film: so much per layer (Beer–Lambert)."""

from __future__ import annotations

from isotherm.constants import AVOGADRO
from isotherm.quantity import Quantity
from transfer.evidence_ledger import LedgerView
from transfer.evidence_reading import (
    Increment,
    Reading,
    build_reading,
    film_key,
    films_of,
    from_sheet,
    setting,
)
from transfer.evidence_series import EvidenceSeries

__all__ = ["CM2_PER_MOL", "SURFACE_DENSITY", "absorbance_reading"]

# Γ = 1/(N_A A) in mol/cm^2 for A in nm^2: 1 nm^2 = 1e-14 cm^2.
SURFACE_DENSITY = 1e14 / AVOGADRO
# 1 L/(mol cm) = 1e3 cm^2/mol.
CM2_PER_MOL = 1e3


def absorbance_reading(series: EvidenceSeries, ledger: LedgerView) -> Reading:
    """Reduce an absorbance series.

    Expected per layer: faces × orientation × fraction × ε Γ with Γ = 1/(N_A A). `orientation` is 1
    for chromophores lying at random in all directions; in-plane ones seen at normal incidence give 3/2.

    Raises
    ------
    UpstrokeError
        As `build_reading`.
    """
    notes: list[str] = []
    shown = films_of(series, ledger)
    faces = setting(series, "faces", 2, notes)
    inputs: dict[str, Quantity | None] = {
        "absorptivity": from_sheet(series, "absorptivity", shown),
        "orientation": setting(series, "orientation", 1, notes),
        "fraction": setting(series, "fraction", 1, notes),
    }
    increments: dict[str, Increment] = {}
    for film in shown:
        area = film_key("area per molecule", film)
        inputs[area] = film.molecular_area
        increments[film.name] = Increment(
            faces.value * CM2_PER_MOL * SURFACE_DENSITY,
            (("absorptivity", 1.0), ("orientation", 1.0), ("fraction", 1.0), (area, -1.0)),
        )
    return build_reading(
        series,
        ledger,
        symbol="absorbance",
        unit="1",
        increments=increments,
        inputs=inputs,
        shown=shown,
        implies="absorptivity",
        notes=notes,
    )
