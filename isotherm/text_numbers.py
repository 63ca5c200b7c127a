"""Rows of text become columns of numbers: fast where they are regular, tolerant where they are not."""

from __future__ import annotations

import sys
import warnings
from collections.abc import Iterator, Sequence
from typing import Final

import numpy as np

from isotherm.file_bytes import FileBytes
from isotherm.text_cells import to_number
from isotherm.text_layout import Block
from isotherm.text_lines import BLANK_LINE, read_lines, read_regular
from isotherm.text_rows import Numbers, Wanted

__all__ = ["read_numbers"]

# Below this many bytes reading without pandas takes less time than importing it does.
_SMALL: Final = 1_000_000
_SMALL_WITH_PANDAS: Final = 100_000
# Where the fast parser refuses the whole, it is tried on pieces of this size, so that a few odd lines
# among a million rows cost little.
_PIECE: Final = 1 << 18
_FOOTER: Final = 8192  # bytes at the end searched for text below the rows
_BEGINNING: Final = 8192  # bytes of rows looked at for quotes and blanks between cells


def read_numbers(
    content: FileBytes,
    start: int,
    first_line: int,
    block: Block,
    numeric: Sequence[int],
    clocks: Sequence[int],
    encoding: str,
    *,
    path: str = "",
) -> Numbers:
    """Read the wanted columns of all rows from byte `start` on.

    Parameters
    ----------
    content : FileBytes
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
        Of `content`.
    path : str
        The file that holds just these bytes, "" where none does.
    """
    wanted = Wanted.of(block, numeric, clocks, encoding)
    size = len(content)
    small = _SMALL_WITH_PANDAS if "pandas" in sys.modules else _SMALL
    if size - start <= small:
        data = content.whole()[start:]
        regular = read_regular(data, first_line, wanted)
        return regular if regular is not None else read_lines(data, first_line, wanted)
    end = content.part(max(start, size - _FOOTER), size)
    stop = size - _footer(end, wanted)
    with warnings.catch_warnings():
        # its import may warn of its own future, its parser of columns nobody wants
        warnings.simplefilter("ignore")
        from pandas.errors import ParserWarning

        # rows it reads otherwise than written are refused instead
        warnings.simplefilter("error", ParserWarning)
        from isotherm.text_fast import read_fast, read_fast_file

        whole = None
        if path and stop == size:
            beginning = content.part(start, min(start + _BEGINNING, size))
            whole = read_fast_file(path, beginning, end, first_line, wanted)
        if whole is None:
            whole = read_fast(content.whole(), start, stop, first_line, wanted)
        if whole is None:
            return _in_pieces(content.whole(), start, first_line, wanted)
    if stop < size:
        tail = read_lines(content.part(stop, size), first_line + len(whole.lines), wanted)
        whole.skipped, whole.skipped_count = tail.skipped, tail.skipped_count
    return _without_blanks(whole, content, start)


def _line_end(data: bytes, start: int, near: int, stop: int) -> int:
    """The end of the line that holds byte `near`."""
    mark = b"\n" if data.find(b"\n", start, stop) >= 0 else b"\r"
    found = data.find(mark, near, stop)
    return stop if found < 0 else found + 1


def _in_pieces(data: bytes, start: int, first_line: int, wanted: Wanted) -> Numbers:
    """Read rows with odd lines among them: the fast parser on what is regular, line by line elsewhere."""
    from isotherm.text_fast import read_fast

    pieces = []
    line = first_line
    for low, high in _pieces(data, start):
        piece = read_fast(data, low, high, line, wanted)
        if piece is None or len(piece.lines) == 0:
            piece = read_lines(data[low:high], line, wanted)
            line += len(data[low:high].splitlines())
        else:
            line += len(piece.lines)
            piece = _without_blanks(piece, FileBytes(data), low)
        pieces.append(piece)
    return _joined(pieces, wanted)


def _pieces(data: bytes, start: int) -> Iterator[tuple[int, int]]:
    while start < len(data):
        stop = _line_end(data, start, start + _PIECE, len(data))
        yield start, stop
        start = stop


def _footer(end: bytes, wanted: Wanted) -> int:
    """How many bytes below the rows are text: lines at the very end, if they are few.

    end : the last bytes of the file; their first line may be cut.
    """
    block = wanted.block
    below = 0
    for raw in reversed(end.splitlines(keepends=True)[1:]):
        cells = block.layout.split(raw.decode(wanted.encoding, "replace").strip("\r\n\x1a"))
        numbers = [to_number(cell, block.layout.decimal) for cell in cells]
        read = sum(number is not None for number in numbers)
        if len(cells) >= 2 and read >= 1 and (block.kinds[0] != "N" or numbers[0] is not None):
            return below
        below += len(raw)
    return 0


def _joined(pieces: list[Numbers], wanted: Wanted) -> Numbers:
    out = Numbers(
        {c: np.concatenate([p.columns[c] for p in pieces]) for c in wanted.numeric},
        {c: [cell for p in pieces for cell in p.clocks[c]] for c in wanted.clocks},
        np.concatenate([p.lines for p in pieces]),
    )
    for piece in pieces:
        for skipped in piece.skipped.values():
            out.skip(skipped)
        out.skipped_count += piece.skipped_count - sum(s.count for s in piece.skipped.values())
        for column, found in piece.unreadable.items():
            have = out.unreadable.get(column)
            out.unreadable[column] = found if have is None else have.and_more(found)
    return out


def _without_blanks(numbers: Numbers, content: FileBytes, start: int) -> Numbers:
    """Drop the rows the fast parser made of blank lines; those it made of missing cells are rows.

    numbers : just as it was read from the lines at byte `start`, a row for each.
    """
    empty = np.ones(len(numbers.lines), dtype=bool)
    for values in numbers.columns.values():
        empty &= np.isnan(values)
        if not empty.any():
            return numbers
    data = content.whole()
    for cells in numbers.clocks.values():
        empty &= np.array([not cell for cell in cells], dtype=bool)
    rows = np.flatnonzero(empty)
    mark = 10 if data.find(b"\n", start) >= 0 else 13  # line feed, or carriage return alone
    ends = start + np.flatnonzero(np.frombuffer(data, dtype=np.uint8)[start:] == mark)
    begins = np.concatenate([[start], ends + 1])
    ends = np.concatenate([ends, [len(data)]])
    longer = rows[ends[rows] - begins[rows] > 1]  # the rest have no cell
    for row in longer.tolist():
        if data[begins[row] : ends[row]].strip(BLANK_LINE):
            empty[row] = False
    keep = ~empty
    numbers.columns = {c: values[keep] for c, values in numbers.columns.items()}
    numbers.clocks = {
        c: [cell for cell, kept in zip(cells, keep.tolist(), strict=True) if kept]
        for c, cells in numbers.clocks.items()
    }
    numbers.lines = numbers.lines[keep]
    return numbers
