"""Read any text export: bytes become named columns in fixed units."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.file_bytes import FileBytes
from isotherm.sheet import RunSheet
from isotherm.source import ColumnSource, Source
from isotherm.table_cell import HeaderCell
from isotherm.table_header import Header, find_header
from isotherm.table_report import gaps_report, lines_report, within_reach
from isotherm.table_roles import (
    Assigned,
    assign_roles,
    columns_from_text,
    describe,
    wanted_roles,
)
from isotherm.table_units import column_conversion
from isotherm.text_bytes import WORKBOOK, is_workbook
from isotherm.text_find import TextRows, find_rows
from isotherm.text_numbers import read_numbers
from isotherm.text_rows import Numbers

__all__ = ["Table", "read_table"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Table:
    """Columns of one export in fixed units, rows in file order.

    values : role -> (n,) array; `barrier_position` is (n,) or (n, 2), mm. time s, area cm^2,
        molecular_area nm^2, pressure and tension mN/m, temperature degC, dipper_position mm, potential mV.
        A missing reading is NaN, an overload infinite.
    lines : (n,) line number in the file of each row, from 1.
    """

    source: Source
    values: dict[str, FloatArray]
    lines: NDArray[np.int64]
    warnings: tuple[str, ...] = field(default=())


def read_table(
    path: str | Path, sheet: RunSheet | None = None, *, needs: tuple[str, ...] = ()
) -> Table:
    """Read one export: any delimiter, decimal mark and encoding, any text above, among and below the rows.

    Parameters
    ----------
    path : str or Path
        A text file, or an .xlsx workbook where the `excel` extra is installed.
    sheet : RunSheet, optional
        Its `columns` say what a column is where the file does not, or overrule it.
    needs : tuple of str
        Roles that must be there; alternatives as `"pressure|tension"`.

    Returns
    -------
    Table
        What was understood is in `source.columns`, what was assumed or skipped in `warnings`.

    Raises
    ------
    UpstrokeError
        When the file cannot be read, holds no rows of numbers, two columns could play one role, a needed
        role is missing, or a unit is unknown or missing.
    """
    where = str(path)
    with FileBytes.open(path) as original:
        return _read(original, where, sheet, needs)


def _read(original: FileBytes, where: str, sheet: RunSheet | None, needs: tuple[str, ...]) -> Table:
    warnings: list[str] = []
    data = original
    if original.part(0, len(WORKBOOK)) == WORKBOOK and is_workbook(original.whole()):
        from isotherm.table_workbook import workbook_text

        data = FileBytes(workbook_text(original.whole(), where))
    if not data.part(0, 4096).strip() and not data.whole().strip():
        raise UpstrokeError("the file is empty", where=where, remedy="export the run again")
    text = find_rows(data, where)
    hints = sheet.columns if sheet is not None else ()
    header = _header(text, warnings)
    if text.block.earlier:
        first, last = text.block.earlier[0][0] + 1, text.block.earlier[0][1] + 1
        lines = f"line {first}" if first == last else f"lines {first} to {last}"
        warnings.append(f"numbers above the header ({lines}) are not read")
    taken, notes = assign_roles(header.cells, text.block.kinds, hints, needs, where)
    warnings += notes
    _check_needs(needs, taken, header, text, where)
    if not taken:
        raise _nothing_known(header, text, where)
    numeric = [one.column for one in taken if text.block.kinds[one.column] != "C"]
    clocks = [one.column for one in taken if text.block.kinds[one.column] == "C"]
    numbers = read_numbers(
        text.data,
        text.start,
        text.block.first + 1,
        text.block,
        numeric,
        clocks,
        text.encoding,
        path=where if text.data is original else "",
    )
    lines_report(numbers, header, text, where, warnings)
    values, columns = _convert(numbers, taken, needs, where, warnings)
    gaps_report(numbers, taken, values, warnings)
    rows = len(numbers.lines)
    source = Source(where, original.digest(), rows, columns)
    return Table(source, values, numbers.lines, tuple(warnings))


def _header(text: TextRows, warnings: list[str]) -> Header:
    """Header of the block, or what the free text above says of headerless columns."""
    block = text.block
    header = find_header(text.lines, block)
    numbers = [c for c, kind in enumerate(block.kinds) if kind == "N"]
    told = header.cells and all(header.cells[c].roles and header.cells[c].unit for c in numbers)
    if told:
        return header
    cells = columns_from_text(text.lines[max(0, block.first - 20) : block.first], len(numbers))
    if cells:
        out = [HeaderCell("", "")] * block.columns
        for column, cell in zip(numbers, cells, strict=True):
            out[column] = cell
        said = ", ".join(
            f"column {c + 1} {cell.name} in {cell.unit}"
            for c, cell in zip(numbers, cells, strict=True)
        )
        warnings.append(f"the columns have no header; taken from the text above: {said}")
        return Header(tuple(out))
    if header.cells:
        return header
    return Header(tuple(HeaderCell("", "") for _ in range(block.columns)))


def _check_needs(
    needs: Sequence[str], taken: Sequence[Assigned], header: Header, text: TextRows, where: str
) -> None:
    have = {one.role for one in taken}
    for need in needs:
        roles = need.split("|")
        if have.isdisjoint(roles):
            raise _missing_role(roles, header, text, where)


def _missing_role(
    roles: Sequence[str], header: Header, text: TextRows, where: str
) -> UpstrokeError:
    cells = header.cells
    shown = ", ".join(describe(c, cell) for c, cell in enumerate(cells[:12]))
    names = " or ".join(role.replace("_", " ") for role in roles)
    if any(cell.text for cell in cells):
        what = f"no column is known as {names}; there are: {shown}"
    else:
        row = text.lines[text.block.first].strip()[:60]
        what = f"the {len(cells)} columns have no header (first row: {row}), so none is known as {names}"
    return UpstrokeError(
        what,
        where=where,
        remedy=f'add to the run sheet: [[columns]] with role = "{roles[0]}", index = N (the first '
        "column is 1) and its unit",
    )


def _nothing_known(header: Header, text: TextRows, where: str) -> UpstrokeError:
    return _missing_role(("area", "molecular_area", "pressure"), header, text, where)


def _convert(
    numbers: Numbers,
    taken: Sequence[Assigned],
    needs: Sequence[str],
    where: str,
    warnings: list[str],
) -> tuple[dict[str, FloatArray], dict[str, ColumnSource]]:
    """Columns in fixed units, and what each was taken for."""
    wanted = wanted_roles(needs)
    values: dict[str, FloatArray] = {}
    columns: dict[str, ColumnSource] = {}
    for one in taken:
        named = f"{where}, column {describe(one.column, one.cell)}"
        header = one.cell.text
        if one.column in numbers.clocks:
            from isotherm.text_clock import clock_seconds

            values[one.role] = clock_seconds(
                numbers.clocks[one.column], where=named, form=one.cell.clock
            )
            columns[one.role] = ColumnSource(header, "clock", one.column + 1)
            continue
        raw = numbers.columns[one.column]
        convert, warning = column_conversion(
            one,
            raw,
            needed=one.role in wanted,
            optional=bool(wanted) and one.role not in wanted and not one.hinted,
            where=where,
        )
        if warning:
            warnings.append(warning)
        if convert is None:
            continue
        converted = within_reach(convert(raw), one, numbers.lines, warnings)
        if one.role in values:  # the second barrier
            both = np.column_stack([values[one.role], converted])
            values[one.role] = both
            before = columns[one.role]
            columns[one.role] = ColumnSource(
                f"{before.header}, {header}", f"{before.unit}, {convert.text}", before.index
            )
            continue
        values[one.role] = converted
        columns[one.role] = ColumnSource(header, convert.text, one.column + 1)
    return values, columns
