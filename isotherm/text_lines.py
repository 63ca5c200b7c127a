"""Rows read line by line: what is no row is kept aside and counted."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from isotherm.text_cells import MISSING, to_number
from isotherm.text_rows import Numbers, SkippedLine, Unreadable, Wanted

__all__ = ["BLANK_LINE", "read_lines", "read_regular"]

# A line of nothing else is blank: separators, and the end-of-file marks some programs write.
BLANK_LINE: Final = b" \t\r\n;,|\x1a\0"


def read_regular(data: bytes, first_line: int, wanted: Wanted) -> Numbers | None:
    """Read rows of plain numbers, as many cells in each, at once; None when there is anything else."""
    layout, columns = wanted.block.layout, wanted.block.columns
    if wanted.clocks or b'"' in data or b"_" in data:
        return None
    text = data.decode(wanted.encoding, "replace").replace("\r\n", "\n")
    if "\r" in text:
        return None
    if layout.decimal == ",":
        if "." in text:
            return None
        text = text.replace(",", ".")
    lines = text.rstrip("\n").split("\n")
    if layout.delimiter == " ":
        rows = [line.split() for line in lines]
        if any(len(row) != columns for row in rows):
            return None
        cells = [cell for row in rows for cell in row]
    else:
        cuts = columns - 1
        if any(line.count(layout.delimiter) != cuts for line in lines):
            return None
        cells = layout.delimiter.join(lines).split(layout.delimiter)
    try:
        read = {c: np.array(list(map(float, cells[c::columns]))) for c in wanted.read}
    except ValueError:
        return None
    numbers = np.arange(first_line, first_line + len(lines), dtype=np.int64)
    return Numbers({c: read[c] for c in wanted.numeric}, {}, numbers)


def read_lines(data: bytes, first_line: int, wanted: Wanted) -> Numbers:
    """Read whatever lines there are.

    Parameters
    ----------
    data : bytes
        Whole lines.
    first_line : int
        Number of the first, from 1.
    wanted : Wanted
        Columns to read.
    """
    block, layout = wanted.block, wanted.block.layout
    most = block.columns
    columns: list[list[float]] = [[] for _ in wanted.numeric]
    clocks: list[list[str]] = [[] for _ in wanted.clocks]
    lines: list[int] = []
    out = Numbers({}, {}, np.empty(0, np.int64))
    for number, raw in enumerate(data.splitlines(), first_line):
        line = raw.decode(wanted.encoding, "replace")
        if not raw.strip(BLANK_LINE):
            continue
        cells = layout.split(line)
        while len(cells) > most and not cells[-1]:
            cells.pop()
        count = len(cells)
        values = [
            _value(cells[c], layout.decimal) if c < count else math.nan for c in wanted.numeric
        ]
        times = [cells[c] if c < count else "" for c in wanted.clocks]
        if not 2 <= count <= most or not _is_row(cells, values, times, wanted):
            out.skip(SkippedLine(number, line.strip()[:200]))
            continue
        for place, value in enumerate(values):
            if value is None:
                c = wanted.numeric[place]
                found = Unreadable(1, number, cells[c][:40])
                have = out.unreadable.get(c)
                out.unreadable[c] = found if have is None else have.and_more(found)
                value = math.nan
            columns[place].append(value)
        for column, cell in zip(clocks, times, strict=True):
            column.append("" if cell.lower() in MISSING else cell)
        lines.append(number)
    out.columns = {
        c: np.array(column, dtype=np.float64)
        for c, column in zip(wanted.numeric, columns, strict=True)
    }
    out.clocks = dict(zip(wanted.clocks, clocks, strict=True))
    out.lines = np.array(lines, dtype=np.int64)
    return out


def _value(cell: str, decimal: str) -> float | None:
    if decimal == "." and "_" not in cell:
        try:
            return float(cell)
        except ValueError:
            pass
    return to_number(cell, decimal)


def _is_row(cells: list[str], values: list[float | None], times: list[str], wanted: Wanted) -> bool:
    """A row does not begin with text where a number belongs, and has a reading or a gap, not text only."""
    block = wanted.block
    if block.kinds[0] == "N" and _value(cells[0], block.layout.decimal) is None:
        return False
    if None in values and all(value is None or math.isnan(value) for value in values):
        return False
    return not times or not any(times) or any(time[:1].isdigit() for time in times)
