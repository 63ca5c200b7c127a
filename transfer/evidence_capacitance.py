"""Interfacial capacitance: each layer is one more capacitor in series."""

from __future__ import annotations

from typing import Any

from isotherm.constants import EPSILON_0
from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_charging import (
    Capacitance,
    capacitance_of_impedance,
    capacitance_of_voltammograms,
)
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
from transfer.evidence_series import EvidencePoint, EvidenceSeries, Impedance

__all__ = ["ELASTANCE_PER_NM", "capacitance_reading"]

_SMALLEST = 1e-18  # F or F/cm^2; less is no electrode
# d/ε0 in cm^2/µF for d in nm: 1e-9 m / (F/m) = m^2/F, and 1 m^2/F = 1e4 cm^2 / 1e6 µF.
ELASTANCE_PER_NM = 1e-9 / EPSILON_0 * 1e-2


def capacitance_reading(series: EvidenceSeries, ledger: LedgerView) -> Reading:
    """Reduce a capacitance series to 1/C in cm^2/µF of true area.

    1/C = 1/C_0 + N d/(ε0 ε_r): the bare interface in series with N layers. C is divided by the
    electrode's area (values in F) and by the roughness factor.

    Raises
    ------
    UpstrokeError
        A capacitance that is not positive, or in F without electrode area; else as `build_reading`.
    """
    notes: list[str] = []
    shown = films_of(series, ledger)
    details: dict[str, Any] = {}
    at = series.quantity("at")
    measured = [_capacitance(point, at, details, notes) for point in series.points]
    units = {q.unit for q in measured}
    if len(units) > 1:
        raise UpstrokeError(
            "capacitance mixes F/cm^2 with raw records or values in F",
            where=series.where,
            remedy="give them as series with different labels",
        )
    roughness = setting(series, "roughness", 1, notes)
    details["roughness"] = roughness.to_json()
    inputs: dict[str, Quantity | None] = {"roughness": roughness}
    powers: tuple[tuple[str, float], ...] = (("roughness", -1.0),)
    true_area = roughness.value
    if units == {"F"}:
        area = series.quantity("electrode_area")
        if area is None:
            raise UpstrokeError(
                "a capacitance in F without the electrode's area",
                where=series.where,
                remedy='give electrode_area = "0.196 ± 0.004 cm^2", or the capacitance in F/cm^2',
            )
        inputs["electrode area"] = area
        powers = (*powers, ("electrode area", -1.0))
        true_area *= area.value
    permittivity = from_sheet(series, "permittivity", shown)
    inputs["permittivity"] = permittivity
    increments: dict[str, Increment] = {}
    for film in shown:
        name = film_key("layer thickness", film)
        inputs[name] = film.layer_thickness
        increments[film.name] = Increment(
            ELASTANCE_PER_NM * true_area, (*powers, (name, 1.0), ("permittivity", -1.0))
        )
    if len(shown) > 1 and permittivity is not None:
        notes.append(f"{series.label}: one relative permittivity was taken for all films")
    # F (or F/cm^2) into µF/cm^2 of true area
    scale = 1e6 / true_area
    return build_reading(
        series,
        ledger,
        symbol="1/C",
        unit="cm^2/µF",
        increments=increments,
        inputs=inputs,
        shown=shown,
        implies="permittivity",
        values=[_inverse(Quantity(q.value * scale, _scaled(q.u, scale), "")) for q in measured],
        details=details,
        notes=notes,
    )


def _scaled(u: float | None, factor: float) -> float | None:
    return None if u is None else u * factor


def _inverse(c: Quantity) -> Quantity:
    return Quantity(1.0 / c.value, None if c.u is None else c.u / c.value**2, "cm^2/µF")


def _capacitance(
    point: EvidencePoint, at: Quantity | None, details: dict[str, Any], notes: list[str]
) -> Quantity:
    if point.value is not None:
        if not point.value.value > _SMALLEST:
            raise UpstrokeError(
                f"capacitance is {point.value.value:g}",
                where=point.where,
                remedy="give it above zero",
            )
        if (point.value.u or 0.0) >= point.value.value:
            raise UpstrokeError(
                "the u of a capacitance is as large as its value",
                where=point.where,
                remedy="leave it out; its inverse says nothing",
            )
        return point.value
    if isinstance(point.records[0].curve, Impedance):
        found = [capacitance_of_impedance(record, point.where) for record in point.records]
        if len(found) > 1:
            raise UpstrokeError(
                "several impedance records at one point",
                where=point.where,
                remedy="give each as a point of its own",
            )
        result: Capacitance = found[0]
    else:
        result = capacitance_of_voltammograms(point.records, at, point.where)
    notes.extend(result.notes)
    details.setdefault("raw", []).append(
        {
            "files": [r.curve.path for r in point.records],
            "capacitance": result.value.to_json(),
            "read_at": result.read_at.to_json(),
            "offset": None if result.offset is None else result.offset.to_json(),
        }
    )
    return result.value
