"""The printed form of repeated cycles, and their rows."""

from __future__ import annotations

from typing import Any

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    join_blocks,
    paragraph,
    scaled,
    shown,
    source_block,
    table,
)
from isotherm.cycles_result import AreaShift, Cycle, CyclesResult, molar
from isotherm.quantity import Quantity

__all__ = ["cycles_text", "shift_rows"]

WORKS = [
    Column("cycle", "right"),
    Column("compression", "sign"),
    Column("expansion", "sign"),
    Column("hysteresis", "sign"),
    Column("lost, %", "sign"),
]
SHIFTS = [
    Column("at, mN/m", "right"),
    Column("branch"),
    Column("cycle", "right"),
    Column("area, nm²", "sign"),
    Column("since the first, %", "sign"),
]


def cycles_text(result: CyclesResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    works = [_work_cells(cycle) for cycle in result.cycles]
    blocks = [
        heading(result.title or "Cycles", width),
        source_block(result.source, width),
        f"{heading('Work, kJ/mol', width)}\n{table(WORKS, works, width)}",
        f"{heading('Area at fixed pressures', width)}\n"
        + table(SHIFTS, [_shift_cells(shift) for shift in result.shifts], width),
        paragraph(
            "Work done on the film by compression, given back by expansion. Hysteresis: the "
            "difference over the areas both branches cover; lost: its part of the work. Zero "
            f"subtracted: {shown(result.zero_offset)} mN/m. {COVERAGE_NOTE}",
            width,
        ),
    ]
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _molar(energy: Quantity | None) -> str:
    return "–" if energy is None else shown(molar(energy))


def _percent(part: Quantity | None) -> str:
    return "–" if part is None else shown(scaled(part, 100.0, "%"))


def _work_cells(cycle: Cycle) -> list[str]:
    back = cycle.expansion
    return [
        f"{cycle.number}",
        _molar(cycle.compression.work),
        _molar(None if back is None else back.work),
        _molar(cycle.hysteresis),
        _percent(cycle.lost_part),
    ]


def _shift_cells(shift: AreaShift) -> list[str]:
    return [
        f"{shift.pressure:g}",
        shift.direction,
        f"{shift.cycle}",
        shown(shift.area),
        _percent(shift.part),
    ]


def _cells(name: str, quantity: Quantity | None) -> dict[str, Any]:
    if quantity is None:
        return {name: None, f"u_{name}": None}
    return {name: quantity.value, f"u_{name}": quantity.u}


def shift_rows(result: CyclesResult) -> list[dict[str, Any]]:
    """Return one row for each branch of each cycle: its work and its areas at the pressures asked.

    Works mN/m nm^2 per molecule, areas nm^2; u_ columns are standard uncertainties.
    """
    rows = []
    for cycle in result.cycles:
        for branch in (cycle.compression, cycle.expansion):
            if branch is None:
                continue
            row: dict[str, Any] = {
                "cycle": cycle.number,
                "direction": branch.direction,
                **_cells("work", branch.work),
                **_cells("hysteresis", cycle.hysteresis),
            }
            for shift in result.shifts:
                if shift.cycle == cycle.number and shift.direction == branch.direction:
                    row.update(_cells(f"area_at_{shift.pressure:g}", shift.area))
                    row.update(_cells(f"since_first_at_{shift.pressure:g}", shift.from_first))
            rows.append(row)
    return rows
