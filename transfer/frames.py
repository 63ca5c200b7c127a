"""Results of a build as pandas tables."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import isotherm.frames
from isotherm.quantity import Quantity
from transfer.evidence_result import EvidenceResult
from transfer.result import TransferResult
from transfer.target_result import TargetResult

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["to_frame"]

Row = dict[str, Any]


def to_frame(result: Any) -> pd.DataFrame:
    """Return the numbers of a result as a table.

    Parameters
    ----------
    result : TransferResult, TargetResult, EvidenceResult or any result of `isotherm`
        A build gives one row a stroke (areas cm^2, pressures mN/m, times s), a target one row a planned
        stroke, evidence one row a kind.

    Returns
    -------
    pandas.DataFrame

    Raises
    ------
    TypeError
        It is no result.
    """
    import pandas as pd

    if isinstance(result, TransferResult):
        return pd.DataFrame(_stroke_rows(result))
    if isinstance(result, TargetResult):
        return pd.DataFrame([_plain(row.to_json()) for row in result.plan])
    if isinstance(result, EvidenceResult):
        return pd.DataFrame(_evidence_rows(result))
    return isotherm.frames.to_frame(result)


def _pair(name: str, quantity: Quantity | None) -> Row:
    cells = isotherm.frames.quantity_row(quantity)
    return {name: cells["value"], f"u_{name}": cells["u"]}


def _stroke_rows(result: TransferResult) -> list[Row]:
    return [
        {
            "number": stroke.number,
            "direction": stroke.direction,
            "start_s": stroke.start_s,
            "end_s": stroke.end_s,
            **_pair("coated_area", stroke.coated_area),
            **_pair("film_removed", stroke.film_removed),
            **_pair("ratio", stroke.ratio),
            "ratio_uncorrected": stroke.ratio_uncorrected,
            "pressure_mean": stroke.pressure_mean,
            "pressure_sd": stroke.pressure_sd,
            "speed_mm_per_s": stroke.speed_mm_per_s,
            "flags": "; ".join(stroke.flags),
        }
        for stroke in result.strokes
    ]


def _evidence_rows(result: EvidenceResult) -> list[Row]:
    return [
        {
            "kind": kind.kind,
            "label": kind.label,
            **_pair("layers", kind.layers),
            "p_value": kind.p_value,
            "consistent": kind.consistent,
            "reason": kind.reason,
        }
        for kind in result.kinds
    ]


def _plain(row: Row) -> Row:
    """Spread the quantities of a JSON row over columns."""
    out: Row = {}
    for key, value in row.items():
        if isinstance(value, dict) and "value" in value:
            out[key], out[f"u_{key}"] = value["value"], value["u"]
        else:
            out[key] = value
    return out
