"""The printed form of many runs: one line each."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from cli.render import Column, heading, join_blocks, paragraph, shown, table
from isotherm.quantity import Quantity

if TYPE_CHECKING:
    from isotherm.series import Row

__all__ = ["batch_text"]

COLUMNS = [
    Column("run"),
    Column("lift-off, nm²", "sign"),
    Column("limiting, nm²", "sign"),
    Column("collapse, mN/m", "sign"),
    Column("knees", "right"),
]


def batch_text(rows: Sequence[Row], width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    bad = sum(bool(row["error"]) for row in rows)
    title = f"{len(rows)} runs" + (f", {bad} could not be analysed" if bad else "")
    return join_blocks(
        [
            heading(title, width),
            table(COLUMNS, [_cells(row) for row in rows], width),
            paragraph(
                "Knees: transitions found. Everything else is in the CSV. ± is the expanded "
                "uncertainty U = 2u (k = 2, coverage about 95 %).",
                width,
            ),
        ]
    )


def _cells(row: Row) -> list[str]:
    name = Path(str(row["path"])).name
    if row["error"]:
        return [name, "failed", "", "", ""]
    knees = int(row["coexistences"] or 0) + int(row["kinks"] or 0)
    return [
        name,
        _quantity(row, "lift_off_area", "nm^2"),
        _quantity(row, "limiting_area", "nm^2"),
        _quantity(row, "collapse_pressure", "mN/m"),
        f"{knees}",
    ]


def _quantity(row: Row, name: str, unit: str) -> str:
    value, u = row[name], row[f"u_{name}"]
    if not isinstance(value, (int, float)):
        return "–"
    return shown(Quantity(float(value), None if u is None else float(u), unit))
