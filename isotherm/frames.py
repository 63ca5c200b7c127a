"""Results as pandas tables."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from isotherm.quantity import Quantity
from isotherm.result import Branch, IsothermResult, Point

if TYPE_CHECKING:
    import pandas as pd

    from isotherm.hold_result import HoldResult

__all__ = ["curve_frame", "quantity_row", "to_frame"]

Row = dict[str, Any]


def to_frame(result: Any) -> pd.DataFrame:
    """Return the numbers of a result as a table.

    Parameters
    ----------
    result : IsothermResult, HoldResult, or any result with `rows()`
        An isotherm gives one row a feature, a hold one row a quantity, with the columns value, u, u_random,
        u_systematic and unit. Every other result gives the rows of its CSV.

    Returns
    -------
    pandas.DataFrame

    Raises
    ------
    TypeError
        It is no result.
    """
    import pandas as pd

    if isinstance(result, IsothermResult):
        rows = [row for branch in result.branches for row in _branch_rows(branch)]
    elif hasattr(result, "holds"):
        rows = _hold_rows(result)
    elif callable(getattr(result, "rows", None)):
        rows = list(result.rows())
    else:
        raise TypeError(f"a {type(result).__name__} is no result with a table")
    return pd.DataFrame(rows)


def curve_frame(branch: Branch) -> pd.DataFrame:
    """Return the smoothed curve of a branch, one row a node.

    Columns: area (nm^2), pressure and modulus with their u (mN/m), and where known trough_area (cm^2) and
    potential (mV).
    """
    import pandas as pd

    curve = branch.curve
    columns = {
        "area": curve.area,
        "pressure": curve.pressure,
        "u_pressure": curve.u_pressure,
        "modulus": curve.modulus,
        "u_modulus": curve.u_modulus,
        "trough_area": curve.trough_area,
        "potential": curve.potential,
    }
    return pd.DataFrame({name: values for name, values in columns.items() if values is not None})


def quantity_row(quantity: Quantity | None) -> Row:
    """Return the cells of a quantity; NaN where there is none."""
    nothing = float("nan")
    if quantity is None:
        return {
            "value": nothing,
            "u": nothing,
            "u_random": nothing,
            "u_systematic": nothing,
            "unit": "",
        }

    def known(u: float | None) -> float:
        return nothing if u is None or not np.isfinite(u) else float(u)

    return {
        "value": float(quantity.value),
        "u": known(quantity.u),
        "u_random": known(quantity.u_random),
        "u_systematic": known(quantity.u_systematic),
        "unit": quantity.unit,
    }


def _branch_rows(branch: Branch) -> list[Row]:
    name = f"{branch.direction} {branch.cycle}"
    found: list[tuple[str, Quantity | None]] = [
        ("zero_offset", branch.zero_offset),
        ("lift_off_area", branch.lift_off),
    ]

    def add(label: str, point: Point | None) -> None:
        if point is not None:
            found.extend([(f"{label}_area", point.area), (f"{label}_pressure", point.pressure)])

    for transition in branch.transitions:
        add("kink", transition.at)
        add("coexistence_onset", transition.onset)
        add("coexistence_end", transition.end)
    if branch.collapse is not None:
        add("collapse", Point(branch.collapse.area, branch.collapse.pressure))
    found.append(("highest_pressure", branch.highest_pressure))
    found.append(("limiting_area", branch.limiting_area))
    if branch.modulus_max is not None:
        found.append(("modulus_max", branch.modulus_max.modulus))
        found.append(("modulus_max_pressure", branch.modulus_max.pressure))
    for at in branch.area_at:
        found.append((f"area_at_{at.pressure:g}", at.area))
        found.append((f"modulus_at_{at.pressure:g}", at.modulus))
    return [
        {"branch": name, "feature": label, **quantity_row(quantity)}
        for label, quantity in found
        if quantity is not None
    ]


def _hold_rows(result: HoldResult) -> list[Row]:
    rows: list[Row] = []
    for hold in result.holds:
        found = [("pressure", hold.pressure), ("start_level", hold.start_level),
                 ("loss_hold", hold.loss_hold), ("loss_planned", hold.loss_planned)]  # fmt: skip
        found += [(f"rate_after_{seconds:.0f}_s", rate) for seconds, rate in hold.rates]
        rows += [
            {"hold": hold.number, "law": hold.chosen, "feature": label, **quantity_row(quantity)}
            for label, quantity in found
            if quantity is not None
        ]
    return rows
