"""The printed form of a dipping pressure and its film budget: a sheet to take to the trough."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    duration_text,
    heading,
    join_blocks,
    paragraph,
    plain_number,
    pretty_unit,
    quantity_cells,
    scaled,
    shown,
    source_block,
    table,
    with_unit,
)
from isotherm.quantity import Quantity
from transfer.target_budget import Budget
from transfer.target_intervals import Interval
from transfer.target_result import TargetResult

__all__ = ["target_text"]

VALUES = [
    Column(""),
    Column("value ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("unit"),
]
LIMITS = [
    Column("rule"),
    Column("allows, mN/m", "right"),
    Column("margin", "right"),
    Column("in u", "right"),
    Column(""),
]
PLAN = [
    Column("stroke", "right"),
    Column("way"),
    Column("at min", "right"),
    Column("removes, cm²", "sign"),
    Column("from, cm²", "right"),
    Column("end at, cm²", "sign"),
    Column(""),
]
SENSITIVITY = [
    Column("input moved by its u"),
    Column("u", "right"),
    Column("unit"),
    Column("up: shift", "right"),
    Column("down: shift", "right"),
]


def target_text(result: TargetResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [
        heading(result.title or "Dipping pressure", width),
        source_block(result.source, width),
        _answer(result, width),
        f"{heading('What each rule allows', width)}\n{table(LIMITS, _limit_rows(result), width)}",
        _left_out(result, width),
        _relaxations(result, width),
        _at_the_pressure(result, width),
    ]
    if result.budget is not None:
        blocks.extend(_budget_blocks(result.budget, width))
    blocks.append(_sensitivity(result, width))
    blocks.append(paragraph(COVERAGE_NOTE, width))
    if result.cautions:
        said = [
            f"{caution.found}: {caution.text}" if caution.found else caution.text
            for caution in result.cautions
        ]
        blocks.append(f"{heading('Cautions', width)}\n{bullets(said, width)}")
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _range(interval: Interval) -> str:
    return f"{interval.low:.1f} to {interval.high:.1f}"


def _answer(result: TargetResult, width: int) -> str:
    if result.recommended is None:
        lines = [heading("No pressure meets every rule", width)]
    else:
        lines = [heading(f"Dip at {with_unit(result.recommended)}", width)]
        if result.window is not None:
            lines.append(paragraph(f"Window {_range(result.window)} mN/m.", width))
    lines.append(paragraph(f"Binding: {result.binding}", width))
    if result.asked is not None:
        asked = result.asked
        verdict = (
            "meets every rule"
            if asked.admissible
            else f"is excluded by: {', '.join(asked.breaks) or 'no rule that can be named'}"
        )
        said = f"The sheet's {asked.pressure:g} mN/m {verdict}."
        if asked.budget is not None:
            said += f" Strokes one filling serves there: {asked.budget.strokes_possible}."
        lines.append(paragraph(said, width))
    return "\n".join(lines)


def _limit_rows(result: TargetResult) -> list[list[str]]:
    return [
        [
            limit.label,
            "nothing" if limit.allowed is None else _range(limit.allowed),
            plain_number(None if limit.margin is None else limit.margin.value, 2),
            plain_number(limit.normalised, 2),
            "binds" if limit.binding else "",
        ]
        for limit in result.limits
    ]


def _left_out(result: TargetResult, width: int) -> str:
    if not result.left_out:
        return ""
    lines = [f"{item.rule}: {item.why}" for item in result.left_out]
    return f"{heading('Rules left out', width)}\n{bullets(lines, width)}"


def _relaxations(result: TargetResult, width: int) -> str:
    if not result.relaxations:
        return ""
    lines = [item.text for item in result.relaxations]
    return f"{heading('What would open a window', width)}\n{bullets(lines, width)}"


def _at_the_pressure(result: TargetResult, width: int) -> str:
    rows = []

    def add(label: str, quantity: Quantity | None) -> None:
        if quantity is not None:
            rows.append([label, *quantity_cells(quantity)])

    percent = result.packing_error
    add("packing error", None if percent is None else scaled(percent, 100.0, "%"))
    add("film lost while dipping", None if result.loss is None else scaled(result.loss, 100.0, "%"))
    add("modulus", result.modulus)
    add("area per molecule", result.molecular_area)
    return f"{heading('There', width)}\n{table(VALUES, rows, width)}" if rows else ""


def _budget_blocks(budget: Budget, width: int) -> list[str]:
    rows: list[list[str]] = []

    def add(label: str, quantity: Quantity | None) -> None:
        if quantity is not None:
            rows.append([label, *quantity_cells(quantity)])

    add("trough area of a fresh film", budget.area)
    add("smallest area", budget.smallest_area)
    add("coated by a stroke", budget.stroke.coated)
    add("ratio foreseen", budget.stroke.ratio)
    add("film a stroke takes", budget.stroke.film)
    counts = [
        ("strokes one filling serves", budget.strokes_possible),
        ("  of which with about 95 % certainty", budget.strokes_sure),
        ("strokes needed", budget.strokes_needed),
        ("renewals needed", budget.renewals),
    ]
    rows += [[label, f"{count}", "", "", ""] for label, count in counts if count is not None]
    if budget.time is not None:
        rows.append(["dipping time", duration_text(budget.time.value), "", "", ""])
    if budget.spreading is not None:
        add("volume to spread", budget.spreading.volume)
        add("area per molecule at the start", budget.spreading.area_per_molecule)
        add("volume for the whole stack", budget.spreading.whole_stack)
    blocks = [f"{heading('Film', width)}\n{table(VALUES, rows, width)}"]
    plan = [
        [
            f"{row.stroke}",
            row.direction,
            "–" if row.starts_s is None else f"{row.starts_s / 60:.1f}",
            shown(row.film_removed),
            f"{row.area_at_start.value:.1f}",
            shown(row.area_at_end),
            "renew first" if row.renew_before else "",
        ]
        for row in budget.plan
    ]
    if plan:
        blocks.append(f"{heading('Plan', width)}\n{table(PLAN, plan, width)}")
    return blocks


def _sensitivity(result: TargetResult, width: int) -> str:
    def shift(value: float | None) -> str:
        return "no window" if value is None else f"{value:+.2f}"

    rows = [
        [
            effect.name,
            plain_number(effect.u, 2),
            pretty_unit(effect.unit),
            shift(effect.shift_up),
            shift(effect.shift_down),
        ]
        for effect in result.sensitivity
    ]
    if not rows:
        return ""
    title = heading("How the answer moves, mN/m", width)
    return f"{title}\n{table(SENSITIVITY, rows, width)}"
