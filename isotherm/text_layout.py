"""How the rows of an export are laid out, and where they begin."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Final

from isotherm.text_cells import cell_kind

__all__ = ["Block", "Layout", "find_block", "merge_kinds", "row_kinds"]

_ENOUGH: Final = (
    24  # rows in a row: what follows is taken to be more of the same until parsing says otherwise
)
_LONGEST_LINE: Final = 20_000  # characters; no row of readings is longer
_MOST_CELLS: Final = 1000


@dataclass(frozen=True)
class Layout:
    """Column delimiter (`" "`: any run of blanks) and decimal mark; `quoted` where cells carry quotes."""

    delimiter: str
    decimal: str
    quoted: bool = False

    def split(self, line: str) -> list[str]:
        """Cut a line into stripped cells."""
        if self.delimiter == " ":
            return line.replace('"', " ").split() if self.quoted else line.split()
        if '"' in line:
            import csv

            try:
                cells = next(
                    csv.reader([line], delimiter=self.delimiter, skipinitialspace=True), []
                )
            except csv.Error:
                cells = line.split(self.delimiter)
        else:
            cells = line.split(self.delimiter)
        return [cell.strip() for cell in cells]


@dataclass(frozen=True)
class Block:
    """The numeric rows: layout, line (0-based) of the first, cells in a row, kind of each column.

    rows : how many rows in a row were seen, which is all of them only for a short block.
    earlier : (first, last) lines of stretches above of rows alike, which may belong to it.
    """

    layout: Layout
    first: int
    kinds: tuple[str, ...]
    rows: int
    earlier: tuple[tuple[int, int], ...] = ()

    @property
    def columns(self) -> int:
        """Cells in a row."""
        return len(self.kinds)


@dataclass
class _Run:
    first: int = 0
    rows: int = 0
    kinds: list[str] = field(default_factory=list)
    best: Block | None = None


def _candidates() -> tuple[Layout, ...]:
    marks = [("\t", "."), ("\t", ","), (";", "."), (";", ","), ("|", "."), ("|", ","), (",", ".")]
    plain = [Layout(delimiter, decimal) for delimiter, decimal in marks]
    # comma between cells and within numbers can only be told apart by quotes
    return (*plain, Layout(",", ",", True), Layout(" ", "."), Layout(" ", ","))


_CANDIDATES: Final = _candidates()
_TWO_NUMBERS: Final = re.compile(r"\d\D+\d", re.ASCII)


def row_kinds(line: str, layout: Layout) -> list[str] | None:
    """Kinds of the cells when the line may be a row of readings, else None."""
    if len(line) > _LONGEST_LINE:
        return None
    if layout.delimiter != " " and layout.delimiter not in line:
        return None
    if layout.quoted and '"' not in line:
        return None
    cells = layout.split(line)
    if not 2 <= len(cells) <= _MOST_CELLS:
        return None
    kinds = []
    texts = len(cells) // 2  # more cells of text than of anything else are no row
    for cell in cells:
        kind = cell_kind(cell, layout.decimal)
        if kind == "N" and layout.delimiter == "," and " " in cell:
            kind = "T"  # "0,06 235,5" is two numbers with decimal commas, no thousands
        if kind == "T":
            texts -= 1
            if texts < 0:
                return None
        kinds.append(kind)
    # a row without any reading goes with others, though it begins none
    return kinds if "N" in kinds or "E" in kinds else None


def merge_kinds(have: list[str], more: list[str]) -> list[str] | None:
    """Kinds of a run of rows and one row more, or None when they do not go together."""
    if len(have) != len(more):
        longer, shorter = (have, more) if len(have) > len(more) else (more, have)
        if any(kind != "E" for kind in longer[len(shorter) :]):
            return None
        have, more = longer, shorter + ["E"] * (len(longer) - len(shorter))
    out = []
    for a, b in zip(have, more, strict=True):
        if a == b or b == "E":
            out.append(a)
        elif a == "E":
            out.append(b)
        else:
            return None
    return out


def _starts(kinds: list[str], layout: Layout, fewest: int) -> bool:
    readings = kinds.count("N") + kinds.count("C")
    if fewest < 2 and layout.delimiter == " ":
        return False
    return readings >= fewest and readings >= kinds.count("T")


def find_block(lines: Sequence[str], *, complete: bool) -> Block | None:
    """Find the first long run of rows, or with `complete` the longest run of any length.

    Parameters
    ----------
    lines : sequence of str
        The beginning of the file, or all of it when `complete`.
    """
    block = _longest_run(lines, complete, fewest=2)
    if block is None and complete:
        # rows that never have two readings: one column is missing throughout
        block = _longest_run(lines, complete, fewest=1)
    return None if block is None else _with_rows_above(lines, block)


def _with_rows_above(lines: Sequence[str], block: Block) -> Block:
    """Add rows just above that lack so many readings that they did not count as a beginning."""
    first, kinds = block.first, list(block.kinds)
    while first > 0:
        more = row_kinds(lines[first - 1], block.layout)
        alike = more is not None and "N" in more and len(more) == len(kinds)
        merged = merge_kinds(kinds, more) if more is not None and alike else None
        if merged is None:
            break
        first, kinds = first - 1, merged
    earlier: list[tuple[int, int]] = []
    last = None
    for number in range(first - 1, -1, -1):
        line = lines[number]
        if not line.strip():
            continue
        more = row_kinds(line, block.layout)
        if more is not None and len(more) == len(kinds) and merge_kinds(kinds, more):
            last = number if last is None else last
            start = number
        elif last is not None:
            earlier.append((start, last))
            last = None
    if last is not None:
        earlier.append((start, last))
    rows = block.rows + block.first - first
    return Block(block.layout, first, tuple(kinds), rows, tuple(earlier))


def _longest_run(lines: Sequence[str], complete: bool, fewest: int) -> Block | None:
    runs = {layout: _Run() for layout in _CANDIDATES}
    for number, line in enumerate(lines):
        if not line.strip():
            continue  # a blank line within rows does not end them
        looks = _TWO_NUMBERS.search(line) is not None
        reached = False
        for layout, run in runs.items():
            kinds = row_kinds(line, layout) if looks or run.rows else None
            if kinds is None:
                run.rows = 0
                continue
            merged = merge_kinds(run.kinds, kinds) if run.rows else None
            if merged is None:
                run.rows = 0
                if not _starts(kinds, layout, fewest):
                    continue
                run.first, run.kinds = number, kinds
            else:
                run.kinds = merged
            run.rows += 1
            if run.best is None or run.rows > run.best.rows:
                run.best = Block(layout, run.first, tuple(run.kinds), run.rows)
            reached = reached or run.rows >= _ENOUGH
        if reached:
            break
    else:
        if not complete:
            return None
    blocks = [run.best for run in runs.values() if run.best is not None]
    return max(blocks, key=_merit, default=None)


def _merit(block: Block) -> tuple[int, int, int]:
    # the same rows read by several layouts: prefer more rows, fewer cells of text, an explicit delimiter
    texts = block.kinds.count("T")
    return (block.rows, -texts, -_CANDIDATES.index(block.layout))
