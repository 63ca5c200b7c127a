"""Regular rows through pandas' C parser."""

from __future__ import annotations

import io
from typing import Any, Final

import numpy as np

from isotherm.text_cells import MISSING, to_number
from isotherm.text_rows import Numbers, Wanted

__all__ = ["read_fast", "read_fast_file"]

_SAMPLE: Final = 8192  # bytes looked at for quotes and blanks between cells
_MISSING_CELLS: Final = sorted(
    {form for cell in MISSING for form in (cell, cell.upper(), cell.title())}
    | {"NaN", "-NaN", "+NaN", "NaN()"}
)


def read_fast(
    data: bytes, start: int, stop: int, first_line: int, wanted: Wanted
) -> Numbers | None:
    """Read the rows between bytes `start` and `stop`; None when any line is not regular.

    Every line makes a row, a blank one too, so that line numbers are right. To be called with
    pandas' ParserWarning as an error: it warns where it reads a row otherwise than written.
    """
    layout, columns = wanted.block.layout, wanted.block.columns
    options = _options(data[start : start + _SAMPLE], wanted)
    if len(wanted.read) < columns:
        options["usecols"] = wanted.read
        # pandas drops surplus cells in silence when it reads some columns only
        if layout.delimiter != " " and not _rectangular(
            data, start, stop, layout.delimiter, columns
        ):
            return None
    if stop == len(data):  # shares the bytes instead of copying them
        buffer = io.BytesIO(data)
        buffer.seek(start)
    else:
        buffer = io.BytesIO(data[start:stop])
    return _read(buffer, options, first_line, wanted)


def read_fast_file(
    path: str, beginning: bytes, end: bytes, first_line: int, wanted: Wanted
) -> Numbers | None:
    """Read all lines of the file `path` from line `first_line` on; None when any is not regular.

    A file pandas opens itself it may read on several cores. `beginning` and `end` are the first and last
    bytes of the rows: first and last row are compared with them, lest lines were counted otherwise.
    """
    options = _options(beginning, wanted)
    if options["quoting"] == 0:
        return None  # a lone quote further up would make pandas skip other lines than meant
    # all columns: told to leave some out, pandas reads on one core, and drops surplus cells in silence;
    # numbers may begin with blanks anyway; only a missing cell after blanks needs the slower setting
    options |= {"skiprows": first_line - 1, "skipinitialspace": False}
    numbers = _read(path, options, first_line, wanted)
    if numbers is None or not len(numbers.lines):
        return None
    ends = (
        (0, beginning.splitlines()[0]),
        (-1, end.splitlines()[-1]),
    )
    for row, raw in ends:
        cells = wanted.block.layout.split(raw.decode(wanted.encoding, "replace"))
        for column, values in numbers.columns.items():
            cell = (
                to_number(cells[column], wanted.block.layout.decimal)
                if column < len(cells)
                else None
            )
            # the last bit may be rounded otherwise
            if cell is not None and not np.isclose(
                values[row], cell, rtol=1e-12, atol=0, equal_nan=True
            ):
                return None
    return numbers


def _options(sample: bytes, wanted: Wanted) -> dict[str, Any]:
    """How pandas is to read the rows, of which `sample` is the beginning."""
    delimiter = wanted.block.layout.delimiter
    return {
        "sep": r"\s+" if delimiter == " " else delimiter,
        "header": None,
        "names": range(wanted.block.columns),
        "index_col": False,
        # numbers are left to pandas to find: given any types, its older releases take half as long again
        "dtype": dict.fromkeys(wanted.clocks, object) or None,
        "na_values": _MISSING_CELLS,
        "keep_default_na": False,
        "decimal": wanted.block.layout.decimal,
        "skip_blank_lines": False,
        "engine": "c",
        "quoting": 0 if b'"' in sample else 3,
        # costs a third of the time, so only where the rows need it
        "skipinitialspace": delimiter != " " and delimiter.encode() + b" " in sample,
        "encoding_errors": "replace",
    }


def _read(
    source: io.BytesIO | str, options: dict[str, Any], first_line: int, wanted: Wanted
) -> Numbers | None:
    import pandas as pd

    try:
        frame = pd.read_csv(source, **options)
    except (ValueError, OverflowError, Warning, RecursionError, OSError):
        return None  # whatever it is, the tolerant reader names it
    if any(frame[c].dtype.kind not in "fiu" for c in wanted.read if c not in wanted.clocks):
        return None  # some cell is text
    count = len(frame)
    return Numbers(
        # a copy where other columns were read along, lest they all stay in memory
        {
            c: frame[c].to_numpy(dtype=np.float64, copy=len(wanted.numeric) < frame.shape[1])
            for c in wanted.numeric
        },
        {c: frame[c].fillna("").astype(str).tolist() for c in wanted.clocks},
        np.arange(first_line, first_line + count, dtype=np.int64),
    )


def _rectangular(data: bytes, start: int, stop: int, delimiter: str, columns: int) -> bool:
    """Whether there are just as many cells as rows of `columns` have."""
    mark = b"\n" if data.find(b"\n", start, stop) >= 0 else b"\r"
    rows = data.count(mark, start, stop) + (0 if data.endswith(mark, start, stop) else 1)
    return data.count(delimiter.encode(), start, stop) == (columns - 1) * rows
