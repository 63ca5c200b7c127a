"""The ledger of a multilayer: which film, which way round, how many layers, how thick and how heavy."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import AVOGADRO
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet, StackFilm
from transfer.result import Layer, Stack

__all__ = ["FilmNumbers", "build_stack", "film_numbers"]

FloatArray = NDArray[np.float64]

_NM2_PER_CM2 = 1e14
_NG_PER_G = 1e9
# On the way down the water line curves up along a water-repelling surface and the chains meet it; on the way
# up the head groups meet a wetted surface (Blodgett, J. Am. Chem. Soc. 1935, 57, 1007; Roberts 1990).
_FACES = {"down": "chains", "up": "head groups"}


@dataclass(frozen=True)
class FilmNumbers:
    """One film's layer: thickness nm, mass_per_area ng/cm^2, surface_density 1/nm^2 (at TR = 1)."""

    name: str
    thickness: Quantity | None
    mass_per_area: Quantity | None
    surface_density: Quantity | None


def film_numbers(
    sheet: RunSheet, direction: str, isotherm: IsothermResult | None, pressure: float
) -> FilmNumbers:
    """Numbers of the film that strokes of one direction lay down.

    d from the sheet; mass M/(N_A A) and density 1/A from molar mass and area per molecule at the dipping
    pressure (sheet's film entry, else the isotherm).

    Parameters
    ----------
    sheet : RunSheet
    direction : str
        "down" or "up".
    isotherm : IsothermResult or None
    pressure : float
        mN/m.

    Returns
    -------
    FilmNumbers
    """
    entry = _entry(sheet, direction)
    thickness = sheet.stack.layer_thickness
    molar_mass = _molar_mass(sheet)
    area = None if isotherm is None else _area_at(isotherm, pressure)
    name = sheet.film.name
    if entry is not None:
        name = entry.name
        thickness = entry.layer_thickness or thickness
        molar_mass = entry.molar_mass or (molar_mass if len(sheet.stack.films) <= 1 else None)
        area = entry.molecular_area or (area if len(sheet.stack.films) <= 1 else None)
    density = None
    mass = None
    if area is not None and area.value > 0:
        relative = (area.u or 0.0) / area.value
        density = Quantity(1.0 / area.value, relative / area.value, "1/nm^2")
        if molar_mass is not None:
            value = molar_mass.value / AVOGADRO / area.value * _NM2_PER_CM2 * _NG_PER_G
            both = float(np.hypot(relative, (molar_mass.u or 0.0) / molar_mass.value))
            mass = Quantity(value, value * both, "ng/cm^2")
    return FilmNumbers(name, thickness, mass, density)


def build_stack(
    sheet: RunSheet,
    directions: list[str],
    ratios: FloatArray,
    random: FloatArray,
    systematic: FloatArray,
    *,
    numbers: list[int],
    partial: list[bool],
    isotherm: IsothermResult | None = None,
    pressure: float = 0.0,
) -> Stack:
    """Add up the strokes.

    Parameters
    ----------
    sheet : RunSheet
    directions : list of str
    ratios : (s,) NaN where a stroke cannot be judged (it then adds nothing, and a note says so).
    random, systematic : (s, s) covariances of the ratios.
    numbers : list of int
        Stroke numbers.
    partial : list of bool
        Strokes that crossed less than the usual length.
    isotherm : IsothermResult or None
    pressure : float
        Dipping pressure, mN/m.

    Returns
    -------
    Stack
        Sums with the covariance of the ratios; u of layer thickness, mass and area per molecule are common to
        all layers of one film and are not averaged down.
    """
    films = {d: film_numbers(sheet, d, isotherm, pressure) for d in ("down", "up")}
    good = np.isfinite(ratios)
    values = np.where(good, ratios, 0.0)
    covariance = [np.where(np.outer(good, good), c, 0.0) for c in (random, systematic)]
    ledger: list[Layer] = []
    ones = np.ones(values.size)
    for k, direction in enumerate(directions):
        film = films[direction]
        so_far = np.where(np.arange(values.size) <= k, 1.0, 0.0)
        single = np.where(np.arange(values.size) == k, 1.0, 0.0)
        ledger.append(
            Layer(
                stroke=numbers[k],
                film=film.name,
                faces=_FACES[direction] if values[k] > 0 else "none",
                layers=_sum(single, values, covariance, "1"),
                total=_sum(so_far, values, covariance, "1"),
                thickness=_times(single, directions, films, "thickness", values, covariance),
                mass_per_area=_times(
                    single, directions, films, "mass_per_area", values, covariance
                ),
                surface_density=_times(
                    single, directions, films, "surface_density", values, covariance
                ),
            )
        )
    notes: list[str] = []
    if not good.all():
        notes.append(f"{int((~good).sum())} strokes could not be judged and add no layers here")
    if any(partial):
        which = ", ".join(str(n) for n, p in zip(numbers, partial, strict=True) if p)
        notes.append(
            f"strokes {which} crossed only part of the usual length: the layers counted hold for the part "
            "of the substrate that every stroke reached"
        )
    wanted = {
        "thickness": "stack.layer_thickness",
        "surface_density": "an isotherm or molecular_area",
    }
    for attribute, remedy in wanted.items():
        if any(getattr(films[d], attribute) is None for d in set(directions)):
            notes.append(f"no {attribute.replace('_', ' ')}: give {remedy}")
    totals = {
        attribute: _times(ones, directions, films, attribute, values, covariance)
        for attribute in ("thickness", "mass_per_area", "surface_density")
    }
    return Stack(
        ledger=tuple(ledger),
        layers=_sum(ones, values, covariance, "1"),
        thickness=totals["thickness"],
        mass_per_area=totals["mass_per_area"],
        surface_density=totals["surface_density"],
        notes=tuple(notes),
    )


def _sum(
    weights: FloatArray, values: FloatArray, covariance: list[FloatArray], unit: str
) -> Quantity:
    """Weighted sum of ratios with both parts of its uncertainty."""
    if values.size == 0:
        return Quantity(0.0, 0.0, unit, 0.0, 0.0)
    random, systematic = (
        float(np.sqrt(max(float(weights @ c @ weights), 0.0))) for c in covariance
    )
    return Quantity.combine(float(weights @ values), unit, u_random=random, u_systematic=systematic)


def _times(
    which: FloatArray,
    directions: list[str],
    films: dict[str, FilmNumbers],
    attribute: str,
    values: FloatArray,
    covariance: list[FloatArray],
) -> Quantity | None:
    """Sum of ratio times the film's number per layer; None where a film lacks it."""
    used = {d for d, w in zip(directions, which, strict=True) if w}
    per_film = {d: getattr(films[d], attribute) for d in used}
    if not used or any(q is None for q in per_film.values()):
        return None
    unit = next(iter(per_film.values())).unit
    each = np.asarray(
        [per_film[d].value if d in per_film else 0.0 for d in directions], dtype=np.float64
    )
    weights = which * each
    random, systematic = (float(weights @ c @ weights) for c in covariance)
    # down and up strokes of one film share its number; different films are independent
    shared: dict[str, float] = {}
    for d in used:
        mine = np.asarray([x == d for x in directions], dtype=np.float64)
        part = float((which * mine) @ values) * (per_film[d].u or 0.0)
        key = f"{films[d].name}|{per_film[d].value}"
        shared[key] = shared.get(key, 0.0) + part
    systematic += sum(part**2 for part in shared.values())
    return Quantity.combine(
        float(weights @ values),
        unit,
        u_random=float(np.sqrt(max(random, 0.0))),
        u_systematic=float(np.sqrt(max(systematic, 0.0))),
    )


def _entry(sheet: RunSheet, direction: str) -> StackFilm | None:
    for film in sheet.stack.films:
        if film.strokes in (direction, "both"):
            return film
    return None


def _molar_mass(sheet: RunSheet) -> Quantity | None:
    """Mean molar mass of the spread film, g/mol."""
    components = sheet.film.components
    if not components or any(c.molar_mass is None for c in components):
        return None
    value = variance = 0.0
    for component in components:
        if component.molar_mass is None:
            return None
        fraction = component.mole_fraction.value
        value += fraction * component.molar_mass.value
        variance += (fraction * (component.molar_mass.u or 0.0)) ** 2
    return Quantity(value, float(np.sqrt(variance)), "g/mol")


def _area_at(isotherm: IsothermResult, pressure: float) -> Quantity | None:
    """Area per molecule at the dipping pressure from the isotherm's headline branch, nm^2."""
    branch = isotherm.headline
    curve = branch.curve
    if curve.pressure.size < 2 or not curve.pressure.min() <= pressure <= curve.pressure.max():
        return None
    order = np.argsort(curve.pressure, kind="stable")
    area = float(np.interp(pressure, curve.pressure[order], curve.area[order]))
    modulus = float(np.interp(pressure, curve.pressure[order], curve.modulus[order]))
    relative = isotherm.area_relative_u or 0.0
    shift = (isotherm.pressure_u or 0.0) / modulus if modulus > 0 else 0.0
    return Quantity(area, area * float(np.hypot(relative, shift)), "nm^2")
