"""The printed form of an isotherm result."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    join_blocks,
    paragraph,
    plain_number,
    quantity_cells,
    range_text,
    shown,
    source_block,
    table,
)
from isotherm.quantity import Quantity
from isotherm.result import Branch, IsothermResult

__all__ = ["isotherm_text"]

FEATURES = [
    Column(""),
    Column("value ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("unit"),
]


def isotherm_text(result: IsothermResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [heading(result.title or "Isotherm", width), source_block(result.source, width)]
    for branch in result.branches:
        blocks.extend(_branch_blocks(branch, width))
    blocks.append(paragraph(COVERAGE_NOTE, width))
    warnings = list(result.warnings)
    for branch in result.branches:
        warnings += [f"{_name(branch).lower()}: {text}" for text in branch.warnings]
    if warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(warnings, width)}")
    return join_blocks(blocks)


def _name(branch: Branch) -> str:
    return f"{branch.direction.capitalize()} {branch.cycle}"


def _branch_blocks(branch: Branch, width: int) -> list[str]:
    said = [f"{branch.rows:,} rows"]
    if branch.time is not None:
        said.append(f"{branch.time[0]:.0f} s to {branch.time[1]:.0f} s")
    said.append(f"noise {plain_number(branch.noise, 2)} mN/m")
    title = heading(f"{_name(branch)} ({', '.join(said)})", width)
    blocks = [f"{title}\n{table(FEATURES, _feature_rows(branch), width)}"]
    phases = [
        [p.name, range_text(p.area, 3), range_text(p.pressure, 1), shown(p.modulus)]
        for p in branch.phases
    ]
    columns = [
        Column("phase"),
        Column("area, nm²", "right"),
        Column("pressure, mN/m", "right"),
        Column("modulus, mN/m", "sign"),
    ]
    blocks.append(table(columns, phases, width))
    at = [[plain_number(a.pressure), shown(a.area), shown(a.modulus)] for a in branch.area_at]
    columns = [
        Column("at pressure, mN/m", "right"),
        Column("area, nm²", "sign"),
        Column("modulus, mN/m", "sign"),
    ]
    blocks.append(table(columns, at, width))
    return blocks


def _feature_rows(branch: Branch) -> list[list[str]]:
    rows: list[list[str]] = []

    def add(label: str, quantity: Quantity | None) -> None:
        rows.append([label, *quantity_cells(quantity)])

    if branch.lift_off is not None:
        add("lift-off area", branch.lift_off)
    for transition in branch.transitions:
        for label, point in (
            ("kink", transition.at),
            ("coexistence onset", transition.onset),
            ("coexistence end", transition.end),
        ):
            if point is not None:
                add(f"{label}, area", point.area)
                add(f"{label}, pressure", point.pressure)
        if transition.kind == "coexistence" and transition.end is None:
            rows.append(["coexistence end", "not reached", "", "", ""])
    if branch.collapse is not None:
        rows.append(["collapse", branch.collapse.kind, "", "", ""])
        add("collapse, area", branch.collapse.area)
        add("collapse, pressure", branch.collapse.pressure)
    elif branch.direction == "compression":
        rows.append(["collapse", "not reached", "", "", ""])
    add("highest pressure", branch.highest_pressure)
    if branch.limiting_area is not None:
        add("limiting area", branch.limiting_area)
    if branch.modulus_max is not None:
        add("largest modulus", branch.modulus_max.modulus)
        add("largest modulus, at pressure", branch.modulus_max.pressure)
    add("zero subtracted", branch.zero_offset)
    return rows
