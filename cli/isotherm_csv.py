"""The condensed curves of isotherm results as one CSV table."""

from __future__ import annotations

from collections.abc import Sequence

from cli.serialise import csv_bytes
from isotherm.result import IsothermResult

__all__ = ["isotherm_csv"]

HEADER = (
    "trace",
    "branch",
    "direction",
    "cycle",
    "area_nm2",
    "u_area_nm2",
    "pressure_mN_per_m",
    "u_pressure_mN_per_m",
    "modulus_mN_per_m",
    "u_modulus_mN_per_m",
    "trough_area_cm2",
    "potential_mV",
)


def isotherm_csv(results: Sequence[IsothermResult]) -> bytes:
    """Return one row for each point of each branch's condensed curve, compression order.

    Areas nm^2 (trough area cm^2), pressures and moduli mN/m, potential mV; u_ columns are standard
    uncertainties: of area the common part of the run, of pressure and modulus the random part.
    """
    rows: list[list[object]] = []
    for result in results:
        relative = result.area_relative_u
        for number, branch in enumerate(result.branches, start=1):
            curve = branch.curve
            lead: list[object] = [result.source.path, number, branch.direction, branch.cycle]
            area = curve.area.tolist()
            columns: list[list[float | None]] = [
                area,
                [None if relative is None else relative * a for a in area],
                curve.pressure.tolist(),
                curve.u_pressure.tolist(),
                curve.modulus.tolist(),
                curve.u_modulus.tolist(),
                [None] * len(area) if curve.trough_area is None else curve.trough_area.tolist(),
                [None] * len(area) if curve.potential is None else curve.potential.tolist(),
            ]
            rows.extend([*lead, *values] for values in zip(*columns, strict=True))
    return csv_bytes(HEADER, rows)
