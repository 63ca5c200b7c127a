"""Rows of text become columns of numbers: fast where they are regular, tolerant where they are not."""

from __future__ import annotations

import io
import math
import sys
import warnings
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from isotherm.text_cells import MISSING, to_number
from isotherm.text_layout import Block, Layout

__all__ = ["Numbers", "SkippedLine", "read_numbers"]

FloatArray = NDArray[np.float64]

# Below this many bytes reading cell by cell takes less time than importing pandas does.
_SMALL: Final = 1_000_000
_SMALL_WITH_PANDAS: Final = 60_000
# Where the fast parser refuses the whole, it is tried on pieces of this size, so that a few odd lines
# among a million rows cost little.
_PIECE: Final = 1 << 18
_MISSING_CELLS: Final = sorted(
    {form for cell in MISSING if cell for form in (cell, cell.upper(), cell.title())}
    | {"NaN", "-NaN", "+NaN", "N/A", "n/a", "NaN()"}
)
_MOST_SKIPPED_KEPT: Final = 50


@dataclass(frozen=True)
class SkippedLine:
    """A line among the rows that is no row: its number (from 1) and text."""

    line: int
    text: str


@dataclass
class Numbers:
    """What was read.

    columns : column (0-based) -> (n,) array, NaN where a cell is missing.
    clocks : column -> n cells of text, "" where missing.
    lines : (n,) line number in the file, from 1.
    skipped : lines that are no rows (the first of them), `skipped_count` of them in all.
    unreadable : column -> [count, line of the first, its text] of cells that are text.
    """

    columns: dict[int, FloatArray]
    clocks: dict[int, list[str]]
    lines: NDArray[np.int64]
    skipped: list[SkippedLine] = field(default_factory=list)
    skipped_count: int = 0
    unreadable: dict[int, list[Any]] = field(default_factory=dict)


def read_numbers(
    data: bytes,
    start: int,
    first_line: int,
    block: Block,
    numeric: Sequence[int],
    clocks: Sequence[int],
    encoding: str,
) -> Numbers:
    """Read the wanted columns of all rows from byte `start` on.

    Parameters
    ----------
    data : bytes
        The file, in an encoding that keeps ASCII.
    start : int
        Where the first row begins.
    first_line : int
        Its line number, from 1.
    block : Block
        Layout and kinds of the columns.
    numeric, clocks : sequences of int
        Columns wanted (0-based): numbers, and clock times left as text.
    encoding : str
        Of `data`.
    """
    size = len(data) - start
    small = _SMALL_WITH_PANDAS if "pandas" in sys.modules else _SMALL
    reader = _Reader(block, tuple(numeric), tuple(clocks), encoding)
    if size > small:
        stop = _without_footer(data, start, block, encoding)
        whole = reader.fast(data, start, stop, first_line)
        if whole is not None:
            if stop < len(data):
                tail = reader.tolerant(data[stop:], first_line + len(whole.lines))
                whole.skipped, whole.skipped_count = tail.skipped, tail.skipped_count
            return _without_blanks(whole)
        pieces = []
        line = first_line
        for low, high in _pieces(data, start):
            piece = reader.fast(data, low, high, line)
            if piece is None or len(piece.lines) == 0:
                piece = reader.tolerant(data[low:high], line)
                line += len(data[low:high].splitlines())
            else:
                line += len(piece.lines)
            pieces.append(piece)
        return _without_blanks(_joined(pieces, reader))
    regular = reader.regular(data[start:], first_line)
    return regular if regular is not None else reader.tolerant(data[start:], first_line)


def _pieces(data: bytes, start: int) -> Iterator[tuple[int, int]]:
    mark = b"\n" if data.find(b"\n", start) >= 0 else b"\r"
    while start < len(data):
        stop = data.find(mark, start + _PIECE)
        stop = len(data) if stop < 0 else stop + 1
        yield start, stop
        start = stop


def _without_footer(data: bytes, start: int, block: Block, encoding: str) -> int:
    """Where the rows end: text lines at the very end are cut off, if they are few."""
    tail = data[max(start, len(data) - 8192) :]
    lines = tail.splitlines(keepends=True)
    stop = len(data)
    for raw in reversed(lines[1:]):
        cells = block.layout.split(raw.decode(encoding, "replace").strip("\r\n\x1a"))
        good = [to_number(c, block.layout.decimal) for c in cells]
        if (
            len(good) >= 2
            and sum(g is not None and math.isfinite(g) for g in good) >= 1
            and (block.kinds[0] != "N" or good[0] is not None)
        ):
            return stop
        stop -= len(raw)
    return len(data)


def _joined(pieces: list[Numbers], reader: _Reader) -> Numbers:
    out = Numbers(
        {c: np.concatenate([p.columns[c] for p in pieces]) for c in reader.numeric},
        {c: [cell for p in pieces for cell in p.clocks[c]] for c in reader.clocks},
        np.concatenate([p.lines for p in pieces]),
    )
    for piece in pieces:
        out.skipped += piece.skipped[: _MOST_SKIPPED_KEPT - len(out.skipped)]
        out.skipped_count += piece.skipped_count
        for column, (count, line, text) in piece.unreadable.items():
            have = out.unreadable.setdefault(column, [0, line, text])
            have[0] += count
    return out


def _without_blanks(numbers: Numbers) -> Numbers:
    """Drop the rows the fast parser made of blank lines: no column has anything."""
    if not numbers.columns:
        return numbers
    empty = None
    for values in numbers.columns.values():
        nan = np.isnan(values)
        empty = nan if empty is None else empty & nan
        if not empty.any():
            return numbers
    if empty is None:
        return numbers
    for cells in numbers.clocks.values():
        empty &= np.array([not cell for cell in cells], dtype=bool)
    keep = ~empty
    numbers.columns = {c: values[keep] for c, values in numbers.columns.items()}
    numbers.clocks = {
        c: [cell for cell, kept in zip(cells, keep.tolist(), strict=True) if kept]
        for c, cells in numbers.clocks.items()
    }
    numbers.lines = numbers.lines[keep]
    return numbers


class _Reader:
    """Both parsers for one layout and choice of columns."""

    def __init__(
        self, block: Block, numeric: tuple[int, ...], clocks: tuple[int, ...], encoding: str
    ) -> None:
        self.block = block
        self.layout: Layout = block.layout
        self.numeric = numeric
        self.clocks = clocks
        self.encoding = encoding
        # the first column is read even when unwanted: a line of text then does not pass for a row
        guard = (0,) if block.kinds[0] == "N" and 0 not in (*numeric, *clocks) else ()
        self.wanted = sorted({*numeric, *clocks, *guard})

    def fast(self, data: bytes, start: int, stop: int, first_line: int) -> Numbers | None:
        """Read regular rows with pandas' C parser; None when any line is not regular."""
        import pandas as pd

        layout, columns = self.layout, self.block.columns
        options: dict[str, Any] = {
            "header": None,
            "names": range(columns),
            "index_col": False,
            "dtype": {c: (object if c in self.clocks else np.float64) for c in self.wanted},
            "na_values": _MISSING_CELLS,
            "keep_default_na": False,
            "decimal": layout.decimal,
            "skip_blank_lines": False,
            "engine": "c",
            "quoting": 0 if layout.quoted or b'"' in data[start : start + 8192] else 3,
            "skipinitialspace": layout.delimiter != " ",
            "encoding_errors": "replace",
        }
        if layout.delimiter == " ":
            options["sep"] = r"\s+"
        else:
            options["sep"] = layout.delimiter
        if len(self.wanted) < columns:
            options["usecols"] = self.wanted
            # pandas drops surplus cells in silence when it reads some columns only
            if layout.delimiter != " " and not self._rectangular(data, start, stop):
                return None
        buffer = io.BytesIO(data if stop == len(data) else data[:stop])
        buffer.seek(start)
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("error")
                frame = pd.read_csv(buffer, **options)
        except (ValueError, OverflowError, UserWarning, pd.errors.ParserError, RecursionError):
            return None
        count = len(frame)
        return Numbers(
            {c: frame[c].to_numpy(dtype=np.float64) for c in self.numeric},
            {c: frame[c].fillna("").astype(str).tolist() for c in self.clocks},
            np.arange(first_line, first_line + count, dtype=np.int64),
        )

    def regular(self, data: bytes, first_line: int) -> Numbers | None:
        """Read rows of plain numbers, cells alike in number, without pandas; None when there is anything else."""
        layout, columns = self.layout, self.block.columns
        if self.clocks or b'"' in data or b"_" in data:
            return None
        text = data.decode(self.encoding, "replace").replace("\r\n", "\n")
        if layout.decimal == ",":
            if "." in text:
                return None
            text = text.replace(",", ".")
        lines = text.rstrip("\n").split("\n")
        if "\r" in text:
            return None
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
            read = {c: np.array(list(map(float, cells[c::columns]))) for c in self.wanted}
        except ValueError:
            return None
        numbers = np.arange(first_line, first_line + len(lines), dtype=np.int64)
        return Numbers({c: read[c] for c in self.numeric}, {}, numbers)

    def _rectangular(self, data: bytes, start: int, stop: int) -> bool:
        rows = data.count(b"\n", start, stop)
        cut = data.count(self.layout.delimiter.encode(), start, stop)
        return cut <= (self.block.columns - 1) * (rows + 1)

    def tolerant(self, data: bytes, first_line: int) -> Numbers:
        """Read line by line; what is no row is kept aside and counted."""
        decimal, split = self.layout.decimal, self.layout.split
        columns: dict[int, list[float]] = {c: [] for c in self.numeric}
        clocks: dict[int, list[str]] = {c: [] for c in self.clocks}
        lines: list[int] = []
        out = Numbers({}, {}, np.empty(0, np.int64))
        most = self.block.columns
        plain = decimal == "."
        order = [(c, columns[c]) for c in self.numeric]
        first_is_number = self.block.kinds[0] == "N"
        for number, raw in enumerate(data.splitlines(), first_line):
            line = raw.decode(self.encoding, "replace")
            cells = split(line)
            count = len(cells)
            if count > most:
                while len(cells) > most and not cells[-1]:
                    cells.pop()
                count = len(cells)
            if count <= 1 and not line.strip(" \t\x1a\0"):
                continue
            values: list[float | None] = []
            for c, _ in order:
                cell = cells[c] if c < count else ""
                try:
                    if not plain or "_" in cell:
                        raise ValueError
                    values.append(float(cell))
                except ValueError:
                    values.append(to_number(cell, decimal))
            times = [cells[c] if c < count else "" for c in self.clocks]
            if count > most or not self._is_row(cells, values, times, first_is_number):
                if line.strip(" \t;,|\x1a"):
                    out.skipped_count += 1
                    if len(out.skipped) < _MOST_SKIPPED_KEPT:
                        out.skipped.append(SkippedLine(number, line.strip()[:200]))
                continue
            for (c, column), value in zip(order, values, strict=True):
                if value is None:
                    have = out.unreadable.setdefault(c, [0, number, cells[c][:40]])
                    have[0] += 1
                    value = math.nan
                column.append(value)
            for c, cell in zip(self.clocks, times, strict=True):
                clocks[c].append("" if cell.lower() in MISSING else cell)
            lines.append(number)
        out.columns = {c: np.array(column, dtype=np.float64) for c, column in columns.items()}
        out.clocks = clocks
        out.lines = np.array(lines, dtype=np.int64)
        return out

    def _is_row(
        self,
        cells: list[str],
        values: list[float | None],
        times: list[str],
        first_is_number: bool,
    ) -> bool:
        """A row has a reading or a missing cell in each place, and no text at its beginning."""
        if first_is_number and to_number(cells[0], self.layout.decimal) is None:
            return False
        texts = values.count(None)
        if texts and not any(v is not None and not math.isnan(v) for v in values):
            return False
        if len(cells) < 2:
            return False
        return not times or any(time[:1].isdigit() for time in times) or not any(times)
