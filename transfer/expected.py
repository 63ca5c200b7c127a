"""What a stack should show: thickness, mass, absorbance, frequency shift and capacitance."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from isotherm.quantity import Quantity
from transfer.evidence_capacitance import ELASTANCE_PER_NM
from transfer.evidence_ledger import FilmInputs, LedgerView
from transfer.evidence_optical import CM2_PER_MOL, SURFACE_DENSITY
from transfer.evidence_resonator import mass_sensitivity

__all__ = [
    "Contraction",
    "ExpectedNumbers",
    "contraction",
    "expected_build",
    "expected_design",
    "per_layer",
]

_NG_PER_G = 1e9


@dataclass(frozen=True)
class ExpectedNumbers:
    """What a number of layers should show; None where the sheet does not say enough.

    layers 1; thickness nm; surface_density mol/cm^2 and mass_per_area ng/cm^2 of one face; absorbance and
    frequency_shift (Hz) of the faces coated; elastance cm^2/µF added to the bare interface's 1/C, and its
    inverse, the film's own capacitance, µF/cm^2.
    """

    what: str
    layers: Quantity
    thickness: Quantity | None
    surface_density: Quantity | None
    mass_per_area: Quantity | None
    absorbance: Quantity | None
    frequency_shift: Quantity | None
    elastance: Quantity | None
    capacitance: Quantity | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        out: dict[str, Any] = {"what": self.what}
        for name in (
            "layers",
            "thickness",
            "surface_density",
            "mass_per_area",
            "absorbance",
            "frequency_shift",
            "elastance",
            "capacitance",
        ):
            quantity = getattr(self, name)
            out[name] = None if quantity is None else quantity.to_json()
        return out


@dataclass(frozen=True)
class Contraction:
    """What a change of area per molecule on the way from water to substrate means.

    ratio : transfer ratio of a film that covers the substrate wholly. covered : part of the substrate that
    a transfer ratio of `measured` covers.
    """

    ratio: Quantity
    measured: Quantity
    covered: Quantity

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "full_cover_ratio": self.ratio.to_json(),
            "measured_ratio": self.measured.to_json(),
            "covered": self.covered.to_json(),
        }


def contraction(on_water: Quantity, in_film: Quantity, measured: Quantity) -> Contraction:
    """Transfer ratio expected when molecules pack differently on the substrate.

    A film of `on_water` nm^2 per molecule that packs at `in_film` on the substrate gives up
    on_water/in_film of floating area for every area covered: above 1 when it contracts. A measured ratio
    of 1 then covers in_film/on_water of the substrate.

    Parameters
    ----------
    on_water, in_film : Quantity, nm^2
    measured : Quantity, 1
        Transfer ratio found.
    """
    relative = math.hypot(_relative(on_water), _relative(in_film))
    ratio = on_water.value / in_film.value
    covered = measured.value / ratio
    u_covered = abs(covered) * math.hypot(relative, _relative(measured))
    return Contraction(
        Quantity(ratio, ratio * relative or None, "1"),
        measured,
        Quantity(covered, u_covered or None, "1"),
    )


def expected_design(
    films: tuple[FilmInputs, ...],
    layers: int,
    *,
    crystal_frequency: Quantity | None = None,
    faces: int = 2,
) -> ExpectedNumbers:
    """The stack as designed: `layers` layers at a transfer ratio of 1, films taken in turn.

    Parameters
    ----------
    films : tuple of FilmInputs
        In the order they are laid down, repeated as often as needed.
    layers : int
    crystal_frequency : Quantity or None, Hz
    faces : int
        Faces coated that absorbance and resonator see.
    """
    order = [films[n % len(films)] for n in range(layers)]
    amount = {name: float(sum(f.name == name for f in order)) for name in {f.name for f in films}}
    return _numbers(
        "as designed",
        Quantity(float(layers), None, "1"),
        {f.name: f for f in films},
        amount,
        dict.fromkeys(amount, 0.0),
        crystal_frequency,
        faces,
    )


def expected_build(
    ledger: LedgerView, *, crystal_frequency: Quantity | None = None, faces: int = 2
) -> ExpectedNumbers:
    """The stack as built: the ledger's layers with their uncertainty.

    Parameters
    ----------
    ledger : LedgerView
    crystal_frequency : Quantity or None, Hz
    faces : int
    """
    films = {f.name: f for f in ledger.inputs}
    amount, variance = {}, {}
    for name in dict.fromkeys(ledger.films):
        mine = np.array([film == name for film in ledger.films], dtype=float)
        amount[name] = float(mine @ ledger.added)
        variance[name] = max(float(mine @ ledger.covariance @ mine), 0.0)
    return _numbers("as built", ledger.total, films, amount, variance, crystal_frequency, faces)


def per_layer(
    film: FilmInputs, crystal_frequency: Quantity | None, faces: int
) -> dict[str, Quantity | None]:
    """What one layer of `film` adds, by the names of `ExpectedNumbers`."""
    d, mass, area = film.layer_thickness, film.molar_mass, film.molecular_area
    density = _product(SURFACE_DENSITY, "mol/cm^2", (area, -1.0))
    return {
        "thickness": d,
        "surface_density": density,
        "mass_per_area": _product(
            SURFACE_DENSITY * _NG_PER_G, "ng/cm^2", (mass, 1.0), (area, -1.0)
        ),
        "absorbance": _product(
            faces * CM2_PER_MOL * SURFACE_DENSITY, "1", (film.absorptivity, 1.0), (area, -1.0)
        ),
        "frequency_shift": _product(
            -faces * mass_sensitivity(1.0) * SURFACE_DENSITY,
            "Hz",
            (crystal_frequency, 2.0),
            (mass, 1.0),
            (area, -1.0),
        ),
        "elastance": _product(ELASTANCE_PER_NM, "cm^2/µF", (d, 1.0), (film.permittivity, -1.0)),
    }


def _numbers(
    what: str,
    layers: Quantity,
    films: dict[str, FilmInputs],
    amount: dict[str, float],
    variance: dict[str, float],
    crystal_frequency: Quantity | None,
    faces: int,
) -> ExpectedNumbers:
    found = {
        name: per_layer(films.get(name, FilmInputs(name)), crystal_frequency, faces)
        for name in amount
    }
    keys = next(iter(found.values())).keys() if found else ()
    total: dict[str, Quantity | None] = {}
    for key in keys:
        each = {name: one[key] for name, one in found.items()}
        if any(q is None for q in each.values()):
            total[key] = None
            continue
        value = inputs = strokes = 0.0
        unit = ""
        for name, q in each.items():
            if q is None:
                continue
            value += amount[name] * q.value
            strokes += variance[name] * q.value**2
            # inputs of one film are common to all its layers
            inputs += (amount[name] * (q.u or 0.0)) ** 2
            unit = q.unit
        random, systematic = math.sqrt(strokes), math.sqrt(inputs)
        total[key] = (
            Quantity.combine(value, unit, u_random=random, u_systematic=systematic)
            if random or systematic
            else Quantity(value, None, unit)
        )
    elastance = total.get("elastance")
    capacitance = None
    if elastance is not None and elastance.value > 0:
        c = 1.0 / elastance.value
        capacitance = Quantity(
            c, None if elastance.u is None else c * _relative(elastance), "µF/cm^2"
        )
    return ExpectedNumbers(
        what=what,
        layers=layers,
        thickness=total.get("thickness"),
        surface_density=total.get("surface_density"),
        mass_per_area=total.get("mass_per_area"),
        absorbance=total.get("absorbance"),
        frequency_shift=total.get("frequency_shift"),
        elastance=elastance,
        capacitance=capacitance,
    )


def _relative(quantity: Quantity) -> float:
    return (quantity.u or 0.0) / abs(quantity.value) if quantity.value else 0.0


def _product(
    constant: float, unit: str, *factors: tuple[Quantity | None, float]
) -> Quantity | None:
    """constant × Π q^power with relative uncertainties in quadrature; None when a factor is unknown."""
    value, relative = constant, 0.0
    for quantity, power in factors:
        if quantity is None or not quantity.value > 0:
            return None
        value *= quantity.value**power
        relative += (power * _relative(quantity)) ** 2
    u = abs(value) * math.sqrt(relative)
    return Quantity(value, u if u > 0 else None, unit)
