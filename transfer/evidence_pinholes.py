"""Bare area of a coated electrode: from capacitance in parallel, and from a blocking test."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_average import weighted_mean
from transfer.evidence_ledger import LedgerView
from transfer.evidence_line import KindLine
from transfer.evidence_result import Pinholes
from transfer.evidence_series import EvidenceSeries

__all__ = ["blocking_pinholes", "capacitance_pinholes"]

# One-sided 95 % limit of a normal distribution.
_ONE_SIDED = 1.645
_STEP = 1e-3  # of u, for derivatives by differences


def _limit(fraction: float, u: float | None) -> float | None:
    return None if u is None else max(fraction, 0.0) + _ONE_SIDED * u


def capacitance_pinholes(line: KindLine, ledger: LedgerView) -> Pinholes | None:
    """Fraction f of bare area in C = (1 − f) C_film + f C_bare at the most layers measured.

    C_bare is measured (layers = 0); C_film is that of the intact film, 1/C_film = 1/C_bare + N d/(ε0 ε_r).
    None without a bare electrode or without an expectation. An f below zero within its u means no
    pinholes found.
    """
    reading = line.reading
    if line.ratio is None or line.expected_increment is None or reading.u_from_scatter:
        return None
    bare = reading.index == 0
    last = int(np.max(reading.index))
    if not np.any(bare) or last == 0:
        return None

    def at(rows: NDArray[np.bool_]) -> Quantity:
        return weighted_mean(
            [
                Quantity(float(y), float(u), "")
                for y, u in zip(reading.y[rows], reading.u[rows], strict=True)
            ]
        )

    y_bare, y_now = at(bare), at(reading.index == last)
    chosen = np.flatnonzero(reading.index == last)[0]
    x, u_x = float(line.x[chosen]), float(line.u_x[chosen])
    rise = line.expected_increment * x
    relative = sum(
        (p * (reading.inputs[n].u or 0.0) / reading.inputs[n].value) ** 2
        for n, p in line.powers.items()
    )
    u_rise = abs(rise) * math.sqrt(relative + (u_x / x) ** 2 if x else relative)

    def fraction(b: float, n: float, r: float) -> float:
        film = 1.0 / (b + r)
        return (1.0 / n - film) / (1.0 / b - film)

    if min(y_bare.value, y_now.value, rise) <= 0:
        return None
    inputs = ((y_bare.value, y_bare.u or 0.0), (y_now.value, y_now.u or 0.0), (rise, u_rise))
    middle = [value for value, _ in inputs]
    f = fraction(*middle)
    variance = 0.0
    for n, (value, u) in enumerate(inputs):
        up, down = list(middle), list(middle)
        up[n], down[n] = value + _STEP * u, value - _STEP * u
        variance += ((fraction(*up) - fraction(*down)) / (2.0 * _STEP)) ** 2
    u_f = math.sqrt(variance)
    note = (
        "no more than its uncertainty"
        if f < 2.0 * u_f
        else "above that of the intact film; a thinner film or a larger permittivity shows the same"
    )
    return Pinholes(reading.label, x, Quantity(f, u_f, "1"), _limit(f, u_f), note)


def blocking_pinholes(series: EvidenceSeries, ledger: LedgerView) -> tuple[Pinholes, ...]:
    """Apparent bare fraction of a blocking test at each number of layers measured.

    Current or charge of a dissolved couple: f = i/i_bare. Charge-transfer resistance: f = R_bare/R
    (Amatore, Savéant & Tessier, J. Electroanal. Chem. 1983, 147, 39, for the assumption of widely linear
    diffusion). Either is an upper limit: electrons also tunnel through a thin intact film, and small
    scattered pinholes draw more current than their area.

    Raises
    ------
    UpstrokeError
        Without a value for the bare electrode, or a value that is not above zero.
    """
    points = [
        (ledger.index_after(p.axis, p.position, p.where), p) for p in series.points if p.value
    ]
    for _, point in points:
        if point.value is not None and not point.value.value > 0:
            raise UpstrokeError(
                f"blocking_test is {point.value.value:g}",
                where=point.where,
                remedy="give it above zero",
            )
    bare = [p.value for index, p in points if index == 0 and p.value is not None]
    if not bare:
        raise UpstrokeError(
            "blocking_test has no value for the bare electrode",
            where=series.where,
            remedy="give the same measurement at layers = 0",
        )
    reference = weighted_mean(bare)
    out = []
    for index in sorted({index for index, _ in points if index > 0}):
        now = weighted_mean([p.value for i, p in points if i == index and p.value is not None])
        ratio = now.value / reference.value
        f = 1.0 / ratio if reference.unit.startswith("ohm") else ratio
        u = None
        if now.u is not None and reference.u is not None:
            u = f * math.hypot(now.u / now.value, reference.u / reference.value)
        note = "upper limit: tunnelling and radial diffusion add to it"
        out.append(
            Pinholes(
                series.label,
                float(ledger.cumulative[index]),
                Quantity(f, u, "1"),
                _limit(f, u),
                note,
            )
        )
    return tuple(out)
