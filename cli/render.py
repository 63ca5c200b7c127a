"""Plain text a person reads: aligned tables that fit the terminal, and wrapped notes."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass

from cli.terminal import paint_heading, printable
from isotherm.quantity import COVERAGE_FACTOR, Quantity, format_quantity
from isotherm.source import Source

__all__ = [
    "COVERAGE_NOTE",
    "Column",
    "bullets",
    "duration_text",
    "hanging",
    "heading",
    "interval_text",
    "inverse",
    "join_blocks",
    "join_results",
    "paragraph",
    "plain_number",
    "pretty_unit",
    "quantity_cells",
    "range_text",
    "scaled",
    "shown",
    "source_block",
    "table",
    "with_unit",
]

GAP = "  "
MISSING = "–"
# A value and its uncertainty never part at the end of a line (no-break spaces).
TIED_SIGN = "\u00a0±\u00a0"

COVERAGE_NOTE = (
    "± is the expanded uncertainty U = 2u (k = 2, coverage about 95 %). Its two parts, same k: "
    "random differs from point to point and run to run; common is shared by the whole run."
)

PRETTY = {
    "nm^2": "nm²",
    "cm^2": "cm²",
    "mm^2": "mm²",
    "degC": "°C",
    "1": "",
    "uL": "µL",
    "m^2": "m²",
    "ng/cm^2": "ng/cm²",
    "1/nm^2": "1/nm²",
    "mol/cm^2": "mol/cm²",
    "nm^2/K": "nm²/K",
}


@dataclass(frozen=True)
class Column:
    """A column of a table: its title and how its cells line up ("left", "right" or "sign").

    "sign" lines cells up on their ±.
    """

    title: str
    align: str = "left"


def pretty_unit(unit: str) -> str:
    """Write a fixed unit the way print does."""
    return PRETTY.get(unit, unit)


def shown(quantity: Quantity | None) -> str:
    """Write `value ± U` without the unit; a dash where there is none."""
    return MISSING if quantity is None else format_quantity(quantity)


def with_unit(quantity: Quantity | None) -> str:
    """Write `value ± U unit`; a dash where there is none."""
    if quantity is None:
        return MISSING
    return f"{format_quantity(quantity)} {pretty_unit(quantity.unit)}".rstrip()


def scaled(quantity: Quantity, factor: float, unit: str) -> Quantity:
    """Write a quantity in a unit `factor` times smaller."""

    def times(u: float | None) -> float | None:
        return None if u is None else abs(factor) * u

    return Quantity(
        factor * quantity.value,
        times(quantity.u),
        unit,
        times(quantity.u_random),
        times(quantity.u_systematic),
    )


def inverse(quantity: Quantity, unit: str = "mN/m") -> Quantity | None:
    """Write one over a quantity, u to first order; None where it is not positive."""
    if quantity.value <= 0:
        return None
    return scaled(
        Quantity(quantity.value, quantity.u, "", quantity.u_random, quantity.u_systematic),
        1.0 / quantity.value**2,
        unit,
    )


def duration_text(seconds: float) -> str:
    """Write a time the way a clock says it: 90 s, 25 min, 4.5 h."""
    if seconds < 120:
        return f"{seconds:.0f} s"
    if seconds < 7200:
        return f"{seconds / 60:.3g} min"
    return f"{seconds / 3600:.3g} h"


def plain_number(value: float | None, digits: int = 3) -> str:
    """Write a number that carries no uncertainty of its own, with few digits and no exponent."""
    if value is None or not math.isfinite(value):
        return MISSING
    if value == 0 or not 1e-6 <= abs(value) < 1e7:
        return f"{value:.{digits}g}"
    places = max(0, digits - 1 - math.floor(math.log10(abs(value))))
    text = f"{value:.{places}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def _part(u: float | None) -> str:
    """Write one part of U with two significant digits and no exponent."""
    if u is None or not math.isfinite(u):
        return MISSING
    expanded = COVERAGE_FACTOR * u
    if expanded == 0:
        return "0"
    places = min(6, max(0, 1 - math.floor(math.log10(expanded))))
    return f"{expanded:.{places}f}"


def quantity_cells(quantity: Quantity | None) -> list[str]:
    """Return the cells value ± U, random part, common part, unit."""
    if quantity is None:
        return [MISSING, "", "", ""]
    return [
        shown(quantity),
        _part(quantity.u_random),
        _part(quantity.u_systematic),
        pretty_unit(quantity.unit),
    ]


def range_text(ends: tuple[float, float], places: int) -> str:
    """Write a stretch from one end to the other, with so many decimal places."""
    return f"{ends[0]:.{places}f} to {ends[1]:.{places}f}"


def interval_text(ends: tuple[float | None, float | None] | None, shift: float = 0.0) -> str:
    """Write an interval with the decimals its own width deserves; an end without bound is open.

    `shift` is taken off both ends, for another zero of the same scale.
    """
    if ends is None:
        return MISSING
    low, high = (None if end is None else end - shift for end in ends)
    places = 3
    if low is not None and high is not None and high > low:
        # half the width is about two standard uncertainties
        told = format_quantity(Quantity((low + high) / 2, (high - low) / 4, "1"))
        places = len(told.partition(" ± ")[0].partition(".")[2])
    written = ["open" if end is None else f"{end:.{places}f}" for end in (low, high)]
    return f"{written[0]} to {written[1]}"


def heading(text: str, width: int) -> str:
    """Return a heading, wrapped, bold where the terminal takes it."""
    return "\n".join(paint_heading(line) for line in textwrap.wrap(printable(text), width))


def paragraph(text: str, width: int, *, indent: str = "") -> str:
    """Wrap running text."""
    return textwrap.fill(
        printable(text), width, initial_indent=indent, subsequent_indent=indent,
        break_on_hyphens=False,
    )  # fmt: skip


def hanging(text: str, width: int, *, indent: int) -> str:
    """Wrap running text with its first line at the margin's indent and the others two further in."""
    return textwrap.fill(
        printable(text),
        width,
        initial_indent=" " * indent,
        subsequent_indent=" " * (indent + 2),
        break_on_hyphens=False,
    )


def bullets(lines: Sequence[str], width: int) -> str:
    """Wrap each line behind a dash."""
    return "\n".join(
        textwrap.fill(
            printable(line), width, initial_indent="  - ", subsequent_indent="    ",
            break_on_hyphens=False,
        )
        for line in lines
    )  # fmt: skip


def join_blocks(blocks: Sequence[str]) -> str:
    """Join blocks with one empty line between, leaving out empty ones."""
    return "\n\n".join(block for block in blocks if block) + "\n"


def join_results(texts: Sequence[str], width: int) -> str:
    """Join the printed forms of several results with a rule between."""
    return f"\n{'─' * width}\n".join(texts)


def _is_number(cell: str) -> bool:
    return cell[:1].isdigit() or cell[:1] in ("-", MISSING)


def _align(cells: list[str], how: str) -> list[str]:
    if how == "sign":
        heads = [c.partition(" ± ")[0] for c in cells if _is_number(c)]
        left = max((len(head) for head in heads), default=0)
        cells = [
            " " * (left - len(c.partition(" ± ")[0])) + c if _is_number(c) else c for c in cells
        ]
    width = max((len(c) for c in cells), default=0)
    return [f"{c:>{width}}" if how == "right" else f"{c:<{width}}" for c in cells]


def table(columns: Sequence[Column], rows: Sequence[Sequence[str]], width: int) -> str:
    """Lay out a table; where it is wider than `width`, each row's cells run on under its first.

    Parameters
    ----------
    columns : sequence of Column
        Titles may be empty; a table whose titles are all empty has no title line.
    rows : sequence of sequences of str
        One string a column.
    width : int
        Columns of text to stay within.
    """
    if not rows:
        return ""
    cells = [[printable(cell) for cell in row] for row in rows]
    bodies = [_align([row[i] for row in cells], c.align) for i, c in enumerate(columns)]
    widths = [max(len(c.title), len(body[0])) for c, body in zip(columns, bodies, strict=True)]
    if 2 + sum(widths) + len(GAP) * (len(widths) - 1) > width:
        return _stacked(columns, cells, width)
    lines = []
    if any(c.title for c in columns):
        titles = [
            f"{c.title:>{w}}" if c.align == "right" else f"{c.title:<{w}}"
            for c, w in zip(columns, widths, strict=True)
        ]
        lines.append(("  " + GAP.join(titles)).rstrip())
    for i in range(len(cells)):
        line = GAP.join(
            f"{body[i]:>{w}}" if c.align == "right" else f"{body[i]:<{w}}"
            for c, body, w in zip(columns, bodies, widths, strict=True)
        )
        lines.append(("  " + line).rstrip())
    return "\n".join(lines)


def _stacked(columns: Sequence[Column], rows: Sequence[Sequence[str]], width: int) -> str:
    """Lay a table out for a narrow terminal: the first cell, and the others run on below it."""
    lines: list[str] = []
    for row in rows:
        name = f"{columns[0].title} {row[0]}".strip()
        told = "; ".join(
            f"{column.title} {cell}".strip()
            for column, cell in zip(columns[1:], row[1:], strict=True)
            if cell and cell != MISSING
        )
        for text, indent in ((name, "  "), (told or "none", "    ")):
            kept = text.replace(" ± ", TIED_SIGN)
            wrapped = textwrap.wrap(
                kept, width, initial_indent=indent, subsequent_indent=indent + "  "
            )
            lines.extend(line.replace(TIED_SIGN, " ± ") for line in wrapped)
    return "\n".join(lines)


def source_block(source: Source, width: int) -> str:
    """Say what was read: the file, its rows, and what each column was taken for."""
    rows = [
        [f"{column.index}", column.header or "(no header)", role.replace("_", " "), column.unit]
        for role, column in sorted(source.columns.items(), key=lambda item: item[1].index)
    ]
    said = paragraph(f"Read {source.rows:,} rows from {source.path}", width)
    columns = [Column("column", "right"), Column("header"), Column("taken for"), Column("unit")]
    return f"{said}\n{table(columns, rows, width)}" if rows else said
