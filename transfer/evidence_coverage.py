"""Electroactive coverage: so many molecules per area and layer, from charge or voltammogram."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from isotherm.constants import FARADAY
from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_average import weighted_mean
from transfer.evidence_fit import fit_line
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
from transfer.evidence_series import EvidencePoint, EvidenceSeries, Voltammogram
from transfer.evidence_sweeps import split_sweeps
from transfer.evidence_wave import Wave, measure_wave

__all__ = ["ScanRateCheck", "coverage_reading", "scan_rate_check"]

# Peak height against scan rate: exponent 1 when bound to the surface, 1/2 when it diffuses to it
# (Bard & Faulkner, Electrochemical Methods, 2nd ed. 2001, eqs 6.2.18 and 14.3.12; memory).
_BOUND = 1.0
_DIFFUSING = 0.5
_FEWEST_RATES = 3
# Anodic and cathodic charge of a chemically reversible couple agree; beyond this many u they do not.
_DIFFERENT = 3.0


@dataclass(frozen=True)
class ScanRateCheck:
    """How the peak grows with scan rate: height ∝ rate^exponent. `linear`: exponent agrees with 1."""

    exponent: Quantity
    linear: bool

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {"exponent": self.exponent.to_json(), "linear": self.linear}


def scan_rate_check(rates: Sequence[Quantity], heights: Sequence[Quantity]) -> ScanRateCheck | None:
    """Fit ln height against ln rate; None with fewer than three different rates.

    Parameters
    ----------
    rates : sequence of Quantity, V/s
    heights : sequence of Quantity, A
    """
    v = np.log([r.value for r in rates])
    if len(np.unique(v)) < _FEWEST_RATES:
        return None
    h = np.log([q.value for q in heights])
    u_h = np.array([max((q.u or 0.0) / q.value, 1e-4) for q in heights])
    u_v = np.array([(r.u or 0.0) / r.value for r in rates])
    fit = fit_line(v - v.mean(), h, np.diag(u_h**2), np.diag(u_v**2))
    scale = max(1.0, math.sqrt(fit.chi_square / fit.dof)) if fit.dof else 1.0
    from scipy.stats import t as student

    u = fit.u_slope * scale
    limit = float(student.ppf(0.975, fit.dof)) if scale > 1.0 else 1.96
    return ScanRateCheck(Quantity(fit.slope, u, "1"), abs(fit.slope - _BOUND) <= limit * u)


def coverage_reading(series: EvidenceSeries, ledger: LedgerView) -> Reading:
    """Reduce a coverage series to mol/cm^2: Γ = Q/(n F A R), R the roughness factor.

    Expected per layer: fraction/(N_A A_molecule). Values given in mol/cm^2 are taken as they are.

    Raises
    ------
    UpstrokeError
        A charge without electrode area; a voltammogram without a wave; else as `build_reading`.
    """
    notes: list[str] = []
    shown = films_of(series, ledger)
    details: dict[str, Any] = {}
    charges = [_charge(point, details, notes, series.label) for point in series.points]
    unit = charges[0].unit
    factor = 1.0
    scale = 1.0  # takes the inputs already used in the values out of the expectation again
    powers: tuple[tuple[str, float], ...] = ()
    inputs: dict[str, Quantity | None] = {}
    if unit != "mol/cm^2":
        electrons = setting(series, "electrons", 1, notes)
        roughness = setting(series, "roughness", 1, notes)
        inputs["roughness"] = roughness
        scale /= roughness.value
        factor = 1.0 / (electrons.value * FARADAY * roughness.value)
        powers = (("roughness", 1.0),)
        if unit == "C":
            area = series.quantity("electrode_area")
            if area is None:
                raise UpstrokeError(
                    "a charge without the electrode's area gives no coverage",
                    where=series.where,
                    remedy='give it as "0.196 ± 0.004 cm^2"',
                )
            inputs["electrode area"] = area
            scale /= area.value
            factor /= area.value
            powers = (*powers, ("electrode area", 1.0))
    fraction = setting(series, "fraction", 1, notes) if series.quantity("fraction") else None
    increments: dict[str, Increment] = {}
    for film in shown:
        name = film_key("area per molecule", film)
        inputs[name] = film.molecular_area
        law = (*powers, (name, -1.0))
        if fraction is not None:
            inputs["fraction"] = fraction
            law = (*law, ("fraction", 1.0))
        increments[film.name] = Increment(SURFACE_DENSITY * scale, law)
    applied = inputs.get("roughness")
    details["roughness"] = None if applied is None else applied.to_json()
    return build_reading(
        series,
        ledger,
        symbol="coverage",
        unit="mol/cm^2",
        increments=increments,
        inputs=inputs,
        shown=shown,
        implies=film_key("area per molecule", shown[0]),
        values=[
            Quantity(q.value * factor, None if q.u is None else q.u * factor, "mol/cm^2")
            for q in charges
        ],
        details=details,
        notes=notes,
        zero_is_natural=True,
    )


def _charge(
    point: EvidencePoint, details: dict[str, Any], notes: list[str], label: str
) -> Quantity:
    if point.value is not None:
        return point.value
    charges, rates, heights = [], [], []
    for record in point.records:
        if not isinstance(record.curve, Voltammogram) or record.scan_rate is None:
            continue
        waves = [
            measure_wave(sweep, record.scan_rate, record.curve.path)
            for sweep in split_sweeps(record.curve)
        ]
        charges.append(weighted_mean([w.charge for w in waves]))
        rates.append(record.scan_rate)
        heights.append(weighted_mean([w.height for w in waves]))
        details.setdefault("waves", []).extend(
            _wave_json(w, record.curve.path, record.scan_rate) for w in waves
        )
        _reversible(waves, record.curve.path, notes)
    check = scan_rate_check(rates, heights)
    at = f"{point.axis} {point.position}" if point.axis == "stroke" else f"{point.position} layers"
    if check is not None:
        details.setdefault("scan_rate_checks", []).append({"after": at, **check.to_json()})
        if not check.linear:
            nearer = abs(check.exponent.value - _DIFFUSING) < abs(check.exponent.value - _BOUND)
            notes.append(
                f"{label}, {at}: the peak grows as scan rate to the power {check.exponent}, not 1:"
                + (" the couple diffuses" if nearer else " it is not fully bound, or too fast")
            )
    return weighted_mean(charges)


def _reversible(waves: Sequence[Wave], path: str, notes: list[str]) -> None:
    sides = {}
    for direction in ("anodic", "cathodic"):
        found = [w.charge for w in waves if w.direction == direction]
        if found:
            sides[direction] = weighted_mean(found)
    if len(sides) < 2:
        return
    a, c = sides["anodic"], sides["cathodic"]
    u = math.hypot(a.u or 0.0, c.u or 0.0)
    if abs(a.value - c.value) > _DIFFERENT * u:
        notes.append(
            f"{path}: anodic charge {a.value:.3g} C and cathodic charge {c.value:.3g} C differ by more"
            " than their u; their mean was taken and its u enlarged"
        )


def _wave_json(wave: Wave, path: str, rate: Quantity) -> dict[str, Any]:
    return {
        "file": path,
        "sweep": wave.direction,
        "scan_rate": rate.to_json(),
        "potential": wave.potential.to_json(),
        "height": wave.height.to_json(),
        "width": wave.width.to_json(),
        "charge": wave.charge.to_json(),
    }
