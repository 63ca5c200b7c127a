"""The holds of a record as a CSV table."""

from __future__ import annotations

from typing import Any

from cli.serialise import rows_csv
from isotherm.hold_result import HoldResult
from isotherm.quantity import Quantity

__all__ = ["hold_csv"]


def _cells(name: str, quantity: Quantity | None) -> dict[str, Any]:
    if quantity is None:
        return {name: None, f"u_{name}": None}
    return {name: quantity.value, f"u_{name}": quantity.u}


def hold_csv(results: list[HoldResult]) -> bytes:
    """Return one row for each law fitted to each hold; u_ columns are standard uncertainties.

    Losses are parts of one, rates 1/s, times s, pressures mN/m.
    """
    rows: list[dict[str, Any]] = []
    for result in results:
        for hold in result.holds:
            for law in hold.laws:
                row: dict[str, Any] = {
                    "record": result.source.path,
                    "hold": hold.number,
                    "kind": hold.kind,
                    "from_s": hold.from_s,
                    "to_s": hold.to_s,
                    "settling_s": hold.settling_s,
                    **_cells("pressure_mN_per_m", hold.pressure),
                    **_cells("loss_hold", hold.loss_hold),
                    "planned_time_s": hold.planned_time,
                    **_cells("loss_planned", hold.loss_planned),
                    **_cells("rate_end_per_s", hold.rate_at(hold.duration_s)),
                    "law": law.name,
                    "chosen": int(law.name == hold.chosen),
                    "weight": law.weight,
                    "delta_aicc": law.delta,
                    **_cells("law_loss", law.loss),
                }
                for name, value in law.parameters.items():
                    row.update(_cells(name, value))
                rows.append(row)
    return rows_csv(rows)
