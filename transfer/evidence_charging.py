"""Capacitance from raw records: charging current of voltammograms, or impedance at a frequency."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_average import weighted_mean
from transfer.evidence_fit import fit_line
from transfer.evidence_series import Impedance, RawRecord, Voltammogram
from transfer.evidence_sweeps import Sweep, split_sweeps

__all__ = ["Capacitance", "capacitance_of_impedance", "capacitance_of_voltammograms"]

FloatArray = NDArray[np.float64]

# Charging current is read from a straight line through this part of the window on either side of
# the potential: long enough to average noise, short enough to be straight.
_READ_PART = 0.05
_FEWEST_ROWS = 5
# A spectrum is smoothed over half a decade on either side of the frequency asked for.
_DECADES = 0.5
# Below this phase angle the element is no longer mainly a capacitor (that of −79° has 20 % of |Z| real).
_CAPACITIVE_PHASE = 80.0


@dataclass(frozen=True)
class Capacitance:
    """Capacitance (F), where it was read (V or Hz), and what was noticed."""

    value: Quantity
    read_at: Quantity
    offset: Quantity | None = None  # A, charging current left at no scan rate
    notes: tuple[str, ...] = ()


def capacitance_of_voltammograms(
    records: Sequence[RawRecord], at: Quantity | None, where: str
) -> Capacitance:
    """Slope of the charging current against scan rate.

    The charging current is half the difference between the sweeps at one potential (the middle of the
    window unless `at`, V, says otherwise): what does not reverse with the sweep drops out.

    Raises
    ------
    UpstrokeError
        `at` lies outside a record's window, or the charging current is not positive.
    """
    rates, currents, notes = [], [], []
    place = at
    for record in records:
        if not isinstance(record.curve, Voltammogram) or record.scan_rate is None:
            raise UpstrokeError(
                "voltammograms and impedance are mixed in one point",
                where=where,
                remedy="give them as series with different labels",
            )
        sweeps = split_sweeps(record.curve)
        low = max(float(s.potential[0]) for s in sweeps)
        high = min(float(s.potential[-1]) for s in sweeps)
        if place is None:
            place = Quantity(0.5 * (low + high), None, "V")
        if not low < place.value < high:
            raise UpstrokeError(
                f"{place.value:.3g} V lies outside the sweeps ({low:.3g} to {high:.3g} V)",
                where=record.curve.path,
                remedy='choose a potential inside with at = "0.10 V"',
            )
        sides = []
        for direction in ("anodic", "cathodic"):
            found = [
                _current_at(s, place.value, record.curve.path)
                for s in sweeps
                if s.direction == direction
            ]
            if found:
                sides.append(weighted_mean(found))
        if len(sides) == 1:
            notes.append(f"{record.curve.path}: one direction only; steady current not taken away")
        u = math.sqrt(sum((s.u or 0.0) ** 2 for s in sides)) / len(sides)
        currents.append(Quantity(sum(s.value for s in sides) / len(sides), u, "A"))
        rates.append(record.scan_rate)
    if place is None:
        raise UpstrokeError("no voltammogram given", where=where, remedy="name a file")
    value, offset = _slope(rates, currents)
    if len(rates) == 1:
        notes.append(
            f"{records[0].curve.path}: one scan rate; that the current grows with it is untested"
        )
    if value.value <= 0:
        raise UpstrokeError(
            f"the charging current at {place.value:.3g} V gives no positive capacitance",
            where=where,
            remedy="check sign and scan rates",
        )
    return Capacitance(value, place, offset, tuple(notes))


def _current_at(sweep: Sweep, potential: float, path: str) -> Quantity:
    span = float(sweep.potential[-1] - sweep.potential[0])
    near = np.abs(sweep.potential - potential) <= _READ_PART * span
    if np.count_nonzero(near) < _FEWEST_ROWS:
        raise UpstrokeError(
            f"{np.count_nonzero(near)} rows near {potential:.3g} V",
            where=path,
            remedy="give a record with more rows",
        )
    design = np.vander((sweep.potential[near] - potential) / span, 2, increasing=True)
    current = sweep.current[near]
    coefficients = np.linalg.lstsq(design, current, rcond=None)[0]
    rest = current - design @ coefficients
    variance = float(rest @ rest) / max(len(current) - 2, 1)
    variance *= float(np.linalg.pinv(design.T @ design)[0, 0])
    floor = 1e-9 * abs(float(coefficients[0])) + 1e-300
    return Quantity(float(coefficients[0]), max(math.sqrt(variance), floor), "A")


def _slope(
    rates: Sequence[Quantity], currents: Sequence[Quantity]
) -> tuple[Quantity, Quantity | None]:
    """Capacitance and the current left at no scan rate (None with fewer than three rates)."""
    v = np.array([r.value for r in rates])
    i = np.array([c.value for c in currents])
    size = float(np.max(np.abs(i))) or 1.0
    u_i = np.array([c.u or 0.0 for c in currents]) / size
    u_v = np.array([r.u or 0.0 for r in rates])
    distinct = len(np.unique(v))
    fit = fit_line(v, i / size, np.diag(u_i**2), np.diag(u_v**2), free_intercept=distinct >= 3)
    scale = max(1.0, math.sqrt(fit.chi_square / fit.dof)) if fit.dof > 0 else 1.0
    value = Quantity(fit.slope * size, fit.u_slope * scale * size, "F")
    if not fit.free_intercept:
        return value, None
    u_offset = float(np.sqrt(fit.covariance[0, 0])) * scale * size
    return value, Quantity(fit.intercept * size, u_offset, "A")


def capacitance_of_impedance(record: RawRecord, where: str) -> Capacitance:
    """Capacitance in series, C = −1/(2π f Im Z), at the record's frequency.

    In a spectrum ln C is smoothed by a parabola in ln f over half a decade on either side, which also
    gives u. A single row gives no u.

    Raises
    ------
    UpstrokeError
        The frequency lies outside the spectrum, or Im Z there is not negative.
    """
    curve = record.curve
    if not isinstance(curve, Impedance):
        raise UpstrokeError(
            "voltammograms and impedance are mixed in one point",
            where=where,
            remedy="give them as series with different labels",
        )
    wanted = float(curve.frequency[0]) if record.frequency is None else record.frequency.value
    distance = np.log10(curve.frequency / wanted)
    if not (distance.min() <= 1e-6 and distance.max() >= -1e-6):
        raise UpstrokeError(
            f"{wanted:g} Hz lies outside the spectrum"
            f" ({curve.frequency.min():g} to {curve.frequency.max():g} Hz)",
            where=curve.path,
            remedy="choose a frequency inside",
        )
    near = np.abs(distance) <= _DECADES
    if np.count_nonzero(near) < _FEWEST_ROWS:
        near = np.abs(distance) <= np.sort(np.abs(distance))[min(1, len(distance) - 1)] + 1e-12
    if np.any(curve.imaginary[near] >= 0):
        raise UpstrokeError(
            f"the imaginary part is not negative at {wanted:g} Hz: no capacitor",
            where=curve.path,
            remedy="check the sign of the column (head it -Im Z when it is positive) and the frequency",
        )
    capacitance = -1.0 / (2.0 * math.pi * curve.frequency[near] * curve.imaginary[near])
    phase = np.degrees(np.arctan2(curve.imaginary[near], curve.real[near]))
    nearest = int(np.argmin(np.abs(distance[near])))
    notes: tuple[str, ...] = ()
    if abs(phase[nearest]) < _CAPACITIVE_PHASE:
        notes = (
            f"{curve.path}: phase angle {phase[nearest]:.0f}° at {wanted:g} Hz; a series capacitor"
            " does not describe the electrode well there",
        )
    value, u = _smoothed(distance[near], np.log(capacitance))
    return Capacitance(Quantity(value, u, "F"), Quantity(wanted, None, "Hz"), None, notes)


def _smoothed(distance: FloatArray, log_capacitance: FloatArray) -> tuple[float, float | None]:
    n = len(distance)
    if n < _FEWEST_ROWS:
        order = np.argsort(distance)
        at = float(np.interp(0.0, distance[order], log_capacitance[order]))
        return math.exp(at), None
    design = np.vander(distance, 3, increasing=True)
    coefficients = np.linalg.lstsq(design, log_capacitance, rcond=None)[0]
    rest = log_capacitance - design @ coefficients
    spread = float(rest @ rest) / (n - 3) * float(np.linalg.pinv(design.T @ design)[0, 0])
    value = math.exp(float(coefficients[0]))
    return value, value * max(math.sqrt(spread), 1e-9)
