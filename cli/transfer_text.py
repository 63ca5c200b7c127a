"""The printed form of a transfer result."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    hanging,
    heading,
    inverse,
    join_blocks,
    paragraph,
    plain_number,
    quantity_cells,
    scaled,
    source_block,
    table,
    with_unit,
)
from isotherm.quantity import Quantity
from transfer.result import Stroke, TransferResult

__all__ = ["strokes_block", "summary_block", "transfer_text"]

SUMMARY = [
    Column(""),
    Column("value ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("unit"),
]
STROKES = [
    Column("stroke", "right"),
    Column("way"),
    Column("ratio ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("raw", "right"),
    Column("Π, mN/m", "right"),
    Column("", "right"),
]


# From 1/s, the rate at which a film's area shrinks, to a number one can picture.
PERCENT_PER_HOUR = 100.0 * 3600.0


def transfer_text(result: TransferResult, width: int, expected: str = "") -> str:
    """Return the printed form, laid out for `width` columns; `expected` stands below the summary."""
    blocks = [
        heading(result.title or "Transfer", width),
        source_block(result.source, width),
        paragraph(_said(result), width),
        strokes_block(result, width),
        summary_block(result, width),
        *([expected] if expected else []),
        paragraph(
            "raw: the ratio without the corrections for loss of film and for pressure. Π: mean "
            f"pressure while the stroke ran. {COVERAGE_NOTE}",
            width,
        ),
    ]
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _said(result: TransferResult) -> str:
    contact = result.contact
    parts = [
        f"{len(result.strokes)} strokes at {plain_number(result.pressure_target, 4)} mN/m.",
        f"The dipper's reading is a {contact.reads} ({_whence(contact.reads_from)}).",
    ]
    if contact.at is not None:
        parts.append(
            f"The lower edge touches the surface at {with_unit(contact.at)} "
            f"({_whence(contact.at_from)})."
        )
    for item in result.interruptions:
        parts.append(f"{item.kind.capitalize()}: {item.from_s:.0f} s to {item.to_s:.0f} s.")
    for crossing in result.unjudged:
        parts.append(
            f"Not judged, {crossing.from_s:.0f} s to {crossing.to_s:.0f} s: {crossing.why}."
        )
    return " ".join(parts)


def _whence(source: str) -> str:
    return {
        "sheet": "from the sheet",
        "data": "found in the data",
        "isotherm": "from the isotherm",
        "dwells": "from the dwells",
    }.get(source, source)


def strokes_block(result: TransferResult, width: int) -> str:
    """Return the table of strokes with the notes on single strokes below it."""
    rows = [[*_stroke_cells(stroke), "*" if stroke.flags else ""] for stroke in result.strokes]
    block = table(STROKES, rows, width)
    noted: dict[str, list[int]] = {}
    for stroke in result.strokes:
        for flag in stroke.flags:
            noted.setdefault(flag, []).append(stroke.number)
    if not noted:
        return block
    said = [
        f"* stroke{'s' if len(numbers) > 1 else ''} {', '.join(map(str, numbers))}: {flag}"
        for flag, numbers in sorted(noted.items(), key=lambda item: item[1])
    ]
    return f"{block}\n\n" + "\n".join(hanging(text, width, indent=2) for text in said)


def _stroke_cells(stroke: Stroke) -> list[str]:
    ratio, random, common, _ = quantity_cells(stroke.ratio)
    return [
        f"{stroke.number}",
        stroke.direction,
        ratio,
        random,
        common,
        "–" if stroke.ratio_uncorrected is None else f"{stroke.ratio_uncorrected:.3f}",
        f"{stroke.pressure_mean:.2f}",
    ]


def summary_block(result: TransferResult, width: int) -> str:
    """Return the table of what the strokes say together."""
    deposition, stack = result.deposition, result.stack
    kind = deposition.type or "cannot be told"
    if deposition.type is not None and not deposition.decided:
        kind += ", within its uncertainty another"
    rows: list[list[str]] = [["deposition type", kind, "", "", ""]]

    def add(label: str, quantity: Quantity | None) -> None:
        if quantity is not None:
            rows.append([label, *quantity_cells(quantity)])

    if result.strokes:
        whole = max(result.strokes, key=lambda stroke: stroke.coated_area.value)
        add("coated area, longest stroke", whole.coated_area)
    add("ratio, down-strokes", deposition.down)
    add("ratio, up-strokes", deposition.up)
    add("up over down", deposition.up_down_ratio)
    add("drift of the ratio, per stroke", result.drift.slope)
    if result.drift.changes:
        after = ", ".join(str(number) for number in result.drift.changes)
        rows.append(["ratio changes after stroke", after, "", "", ""])
    add("layers", stack.layers)
    add("thickness", stack.thickness)
    add("mass per area", stack.mass_per_area)
    add("molecules per area", stack.surface_density)
    if result.creep:
        fastest = max(result.creep, key=lambda span: abs(span.rate.value))
        add("fastest loss of film", scaled(fastest.rate, PERCENT_PER_HOUR, "%/h"))
    add(f"film modulus, {_whence(result.compressibility_from)}", inverse(result.compressibility))
    return table(SUMMARY, rows, width)
