"""From a transfer result to the ledger that evidence is tested against."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import AVOGADRO
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet, StackFilm
from transfer.evidence_ledger import FilmInputs, LedgerView
from transfer.result import TransferResult
from transfer.stack import FilmNumbers, film_numbers

__all__ = ["film_inputs", "ledger_from_result"]

FloatArray = NDArray[np.float64]

# A stroke whose ratio cannot be judged laid down something between no layer and one: the mean and
# standard deviation of a uniform distribution (GUM 4.3.7).
_UNKNOWN_LAYERS = 0.5
_UNKNOWN_U = 1.0 / 12.0**0.5
# ng/cm^2 per nm^-2 into g/mol.
_MOLAR = AVOGADRO / 1e14 / 1e9


def ledger_from_result(
    result: TransferResult, sheet: RunSheet, *, isotherm: IsothermResult | None = None
) -> LedgerView:
    """Take layers per stroke, their covariance and each film's numbers out of a transfer result.

    Parameters
    ----------
    result : TransferResult
    sheet : RunSheet
        Layer thickness, molar mass and what else describes a film.
    isotherm : IsothermResult or None
        Gives the area per molecule at the dipping pressure when the sheet does not.

    Returns
    -------
    LedgerView
    """
    strokes = result.strokes
    judged = np.array([s.ratio is not None for s in strokes], dtype=bool)
    added = np.array(
        [_UNKNOWN_LAYERS if s.ratio is None else s.ratio.value for s in strokes], dtype=np.float64
    )
    covariance = np.asarray(result.ratio_covariance, dtype=np.float64)
    covariance = np.where(np.outer(judged, judged) & np.isfinite(covariance), covariance, 0.0)
    covariance = covariance + np.diag(np.where(judged, 0.0, _UNKNOWN_U**2))
    warnings = []
    if not judged.all():
        which = ", ".join(
            str(s.number) for s, good in zip(strokes, judged, strict=True) if not good
        )
        warnings.append(
            f"stroke {which} could not be judged; against the evidence it counts as 0.5 ± 0.3 layers"
        )
    inputs = {d: film_inputs(sheet, d, isotherm, result.pressure_target) for d in ("down", "up")}
    return LedgerView(
        strokes=np.array([s.number for s in strokes], dtype=np.int64),
        added=added,
        covariance=covariance,
        films=tuple(inputs[s.direction].name for s in strokes),
        inputs=tuple({film.name: film for film in inputs.values()}.values()),
        lays_film=_lays_film(result),
        designed_layers=sheet.stack.layers,
        warnings=tuple(warnings),
    )


def film_inputs(
    sheet: RunSheet, direction: str, isotherm: IsothermResult | None, pressure: float
) -> FilmInputs:
    """Numbers of the film that strokes of `direction` lay down, as the ledger of the build uses them.

    Parameters
    ----------
    sheet : RunSheet
    direction : "down" | "up"
    isotherm : IsothermResult or None
    pressure : float, mN/m
    """
    numbers = film_numbers(sheet, direction, isotherm, pressure)
    entry = next((f for f in sheet.stack.films if f.strokes in (direction, "both")), None)
    area = _inverse(numbers.surface_density)
    return FilmInputs(
        name=numbers.name,
        layer_thickness=numbers.thickness,
        molar_mass=_molar_mass(numbers),
        molecular_area=area,
        permittivity=_own(entry, "permittivity") or sheet.stack.permittivity,
        absorptivity=_own(entry, "absorptivity") or sheet.stack.absorptivity,
    )


def _own(entry: StackFilm | None, key: str) -> Quantity | None:
    found = None if entry is None else getattr(entry, key)
    return found if isinstance(found, Quantity) else None


def _inverse(density: Quantity | None) -> Quantity | None:
    if density is None or not density.value > 0:
        return None
    value = 1.0 / density.value
    return Quantity(value, None if not density.u else value * density.u / density.value, "nm^2")


def _molar_mass(numbers: FilmNumbers) -> Quantity | None:
    """Molar mass back from mass and density: the mass's u beyond the density's is its own."""
    mass, density = numbers.mass_per_area, numbers.surface_density
    if mass is None or density is None or not density.value > 0:
        return None
    value = mass.value / density.value * _MOLAR
    own = ((mass.u or 0.0) / mass.value) ** 2 - ((density.u or 0.0) / density.value) ** 2
    u = value * own**0.5 if own > 1e-18 else None
    return Quantity(value, u, "g/mol")


def _lays_film(result: TransferResult) -> NDArray[np.bool_]:
    """Strokes that count as a layer: those of the type's direction, less an empty first dip."""
    only = {"X": "down", "Z": "up"}.get(result.deposition.type or "")
    return np.array([s.counted and only in (None, s.direction) for s in result.strokes], dtype=bool)
