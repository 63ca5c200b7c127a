"""The printed form of a film's stability."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    duration_text,
    hanging,
    heading,
    join_blocks,
    paragraph,
    quantity_cells,
    scaled,
    shown,
    source_block,
    table,
    with_unit,
)
from isotherm.hold_result import Hold, HoldResult
from isotherm.quantity import Quantity

__all__ = ["hold_text"]

PERCENT = 100.0
PERCENT_PER_HOUR = 100.0 * 3600.0  # from 1/s

LOSSES = [
    Column(""),
    Column("value ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("unit"),
]
LAWS = [
    Column("law"),
    Column("weight", "right"),
    Column("ΔAICc", "right"),
    Column("loss, %", "sign"),
]


def hold_text(result: HoldResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [heading(result.title or "Film stability", width), source_block(result.source, width)]
    for hold in result.holds:
        blocks.extend(_hold_blocks(hold, width))
    blocks.append(
        paragraph(
            "Loss and rate are averages over the laws by their weights. * marks the simplest law "
            f"within 2 of the least AICc. {COVERAGE_NOTE}",
            width,
        )
    )
    warnings = list(result.warnings)
    for hold in result.holds:
        warnings += [f"hold {hold.number}: {text}" for text in hold.warnings]
    if warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(warnings, width)}")
    return join_blocks(blocks)


def _hold_blocks(hold: Hold, width: int) -> list[str]:
    kept, drifts = ("pressure", "area") if hold.kind == "isobaric" else ("area", "pressure")
    said = (
        f"Constant {kept}, the {drifts} drifts; {hold.from_s:.0f} s to {hold.to_s:.0f} s, "
        f"the first {hold.settling_s:.0f} s left out as settling."
    )
    title = heading(f"Hold {hold.number} at {with_unit(hold.pressure)}", width)
    return [
        f"{title}\n{paragraph(said, width)}\n{table(LOSSES, _loss_rows(hold), width)}",
        table(LAWS, _law_rows(hold), width),
        _parameters(hold, width),
    ]


def _loss_rows(hold: Hold) -> list[list[str]]:
    rows = []

    def add(label: str, quantity: Quantity | None, factor: float, unit: str) -> None:
        if quantity is not None:
            rows.append([label, *quantity_cells(scaled(quantity, factor, unit))])

    add(f"loss over the hold, {duration_text(hold.duration_s)}", hold.loss_hold, PERCENT, "%")
    if hold.planned_time is not None:
        label = f"loss over {duration_text(hold.planned_time)}, as planned"
        add(label, hold.loss_planned, PERCENT, "%")
    for seconds, rate in hold.rates:
        add(f"rate of loss after {duration_text(seconds)}", rate, PERCENT_PER_HOUR, "%/h")
    return rows


def _law_rows(hold: Hold) -> list[list[str]]:
    return [
        [
            f"{law.name} *" if law.name == hold.chosen else law.name,
            f"{law.weight:.2f}",
            f"{law.delta:.1f}",
            shown(scaled(law.loss, PERCENT, "%")),
        ]
        for law in hold.laws
    ]


def _parameters(hold: Hold, width: int) -> str:
    law = hold.chosen_law
    told = ", ".join(f"{name} = {with_unit(value)}" for name, value in law.parameters.items())
    lines = [f"{law.name}: {law.equation}; {told}"]
    lines += [f"{other.name}: {other.remark}" for other in hold.laws if other.remark]
    return "\n".join(hanging(line, width, indent=2) for line in lines)
