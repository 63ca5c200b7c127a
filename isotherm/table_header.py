"""From the text above the rows to a name and a unit for every column."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

from isotherm.table_cell import HeaderCell, is_clock_format, parse_cell
from isotherm.text_cells import MISSING, cell_kind
from isotherm.text_layout import Block, Layout
from isotherm.units import is_unit

__all__ = ["Header", "find_header", "split_header", "whole_block"]

_LINES_ABOVE: Final = 12  # text lines looked at above the rows
_NAME_LINES: Final = 4  # of them, lines that may hold the names
_COMMENT_SIGNS: Final = "#%!*/'>"


@dataclass(frozen=True)
class Header:
    """The cells, one for each column, and the line (0-based) the names are on; None without any header."""

    cells: tuple[HeaderCell, ...]
    line: int | None = None


def split_header(line: str, layout: Layout, columns: int) -> list[str] | None:
    """Cut a text line into exactly `columns` cells, or None when it does not go."""
    blanks = " " if layout.delimiter == "\t" else None  # an empty first cell is a cell
    line = line.strip(blanks)
    signs = _COMMENT_SIGNS + (";" if layout.delimiter != ";" else "")
    bare = line.lstrip(signs).strip(blanks)
    for text in dict.fromkeys((bare, line)):
        for cells in _cuttings(text, layout):
            while len(cells) > columns and not cells[-1]:
                cells = cells[:-1]
            if len(cells) == columns:
                return cells
            if layout.delimiter != " " and len(cells) > columns:
                joined = _join_units(cells)
                if len(joined) == columns:
                    return joined
    return None


def _cuttings(text: str, layout: Layout) -> list[list[str]]:
    """Every sensible way to cut a header line, best first."""
    if layout.delimiter != " ":
        ways = [layout.split(text)]
        if len(ways[0]) > 1:
            return ways
        ways += [Layout(d, ".").split(text) for d in "\t;,|" if d != layout.delimiter and d in text]
        if len(text.split("  ")) > 1:
            ways.append([cell.strip() for cell in re.split(r" {2,}|\t", text)])
        return ways
    ways = []
    if "\t" in text:
        ways.append([cell.strip() for cell in re.split(r"\t+", text)])
    if "  " in text:
        ways.append([cell.strip() for cell in re.split(r"[ \t]{2,}", text)])
    ways += [Layout(d, ".").split(text) for d in ";,|" if d in text]
    if '"' in text:
        ways.append([cell.strip() for cell in re.findall(r'"([^"]*)"', text)])
    ways.append([c.strip() for c in re.findall(r"[^()\[\]]*[(\[][^()\[\]]*[)\]]", text)])
    words = text.split()
    ways.append(words)
    ways.append(_join_units(words))
    return ways


def _join_units(cells: list[str]) -> list[str]:
    """Put units that were cut off their names back beside them."""
    out: list[str] = []
    for cell in cells:
        bare = cell.strip("()[] ")
        if (
            out
            and cell
            and is_unit(bare)
            and not is_unit(out[-1])
            and (len(bare) > 1 or bare != "A")
        ):
            out[-1] = f"{out[-1]} ({bare})"
        else:
            out.append(cell)
    return out


def _is_unit_cell(cell: str) -> bool:
    bare = cell.strip("()[]{}<> ")
    return is_unit(bare) or is_clock_format(bare)


def _is_unit_line(cells: Sequence[str]) -> bool:
    filled = [c for c in cells if c.strip("()[]{}<> ").lower() not in MISSING and c != "1"]
    return bool(filled) and all(_is_unit_cell(c) for c in filled)


def whole_block(lines: Sequence[str], block: Block) -> Block:
    """Take rows alike further up into the block, unless a header of their own parts them from it.

    Odd lines among the rows (a pause noted, an unreadable row, the header again) break a run of rows.
    """
    first = block.first
    taken = 0
    seen: dict[str, int] = {}
    for number, line in enumerate(lines[:first] if block.earlier else ()):
        seen.setdefault(line.strip(), number)
    for start, last in block.earlier:
        gap = [line.strip() for line in lines[last + 1 : first] if line.strip()]
        if any(seen[line] >= start and _heads(line, block.layout, block.columns) for line in gap):
            break
        first, taken = start, taken + 1
    return replace(block, first=first, earlier=block.earlier[taken:])


def _heads(line: str, layout: Layout, columns: int) -> bool:
    """Whether a line of text could be a header: text or units in as many cells as the rows have."""
    cells = split_header(line, layout, columns)
    if cells is None or any(cell_kind(cell, layout.decimal) in "NC" for cell in cells):
        return False
    filled = [cell for cell in cells if cell]
    if any(parse_cell(cell).roles or _is_unit_cell(cell) for cell in filled):
        return True
    # names unknown here are words, each another; readings that went wrong are not
    words = all(cell[:1].isalpha() for cell in filled)
    return words and len(filled) >= 2 and len(set(filled)) == len(filled)


def find_header(lines: Sequence[str], block: Block) -> Header:
    """Find names and units in the text lines above the block (one line, or names and units on two)."""
    columns = block.columns
    while columns > 2 and block.kinds[columns - 1] == "E":
        columns -= 1  # trailing separators make cells that no header names
    counted = columns > 2 and _counts_rows(lines, block)
    above: list[tuple[int, list[str]]] = []
    gap = False
    number = block.first
    seen = 0
    while number > 0 and seen < _LINES_ABOVE:
        number -= 1
        line = lines[number]
        if not line.strip(" \t;,|-=_#"):
            gap = gap or not line.strip()
            continue
        seen += 1
        cells = split_header(line, block.layout, block.columns) or split_header(
            line, block.layout, columns
        )
        if cells is None and counted:
            cells = split_header(line, block.layout, columns - 1)
            cells = None if cells is None else ["", *cells]
        if cells is None or all(cell_kind(c, block.layout.decimal) in "NE" for c in cells):
            if above:
                break
            continue
        if above and gap and not _is_unit_line(above[-1][1]):
            break
        gap = False
        above.append((number, cells + [""] * (block.columns - len(cells))))
    return _choose(above)


def _counts_rows(lines: Sequence[str], block: Block) -> bool:
    """Whether the first column numbers the rows, which statistics programs write without a header."""
    firsts = []
    for line in lines[block.first : block.first + 8]:
        cells = block.layout.split(line)
        if cells and line.strip():
            firsts.append(cells[0].strip('"'))
    return len(firsts) >= 2 and firsts in (
        [str(number) for number in range(start, start + len(firsts))] for start in (0, 1)
    )


def _choose(above: list[tuple[int, list[str]]]) -> Header:
    """Take names and units from candidate lines, nearest to the rows first."""
    places = range(len(above))
    at = next((place for place in places if _is_unit_line(above[place][1])), None)
    units = None if at is None else above[at][1]
    # names stand just above their units, seldom just below
    nearest = [place for place in places if place != at]
    if at is not None:
        nearest.sort(key=lambda place: (place != at + 1, place))
    best: Header | None = None
    for place in nearest[:_NAME_LINES]:
        number, cells = above[place]
        parsed = [parse_cell(cell) for cell in cells]
        if units is not None:
            parsed = [_with_unit(cell, unit) for cell, unit in zip(parsed, units, strict=True)]
        if best is None or _known(parsed) > max(1, _known(best.cells)):
            best = Header(tuple(parsed), number)
    if best is not None:
        return best
    if units is None or at is None:
        return Header(())
    return Header(tuple(_with_unit(HeaderCell(c, ""), c) for c in units), above[at][0])


def _known(cells: Sequence[HeaderCell]) -> int:
    return sum(bool(cell.roles) or cell.unit is not None for cell in cells)


def _with_unit(cell: HeaderCell, unit: str) -> HeaderCell:
    bare = unit.strip("()[]{}<> ")
    if cell.unit is not None or not bare or bare.lower() in MISSING:
        return cell
    if is_clock_format(bare):
        return HeaderCell(cell.text, cell.name, clock=bare)
    name = cell.name
    if cell.unknown is not None:
        name = f"{name} {cell.unknown}"
    return HeaderCell(cell.text, name, bare)
