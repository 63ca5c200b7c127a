"""Regular rows through pandas' C parser."""

from __future__ import annotations

import io
from typing import Any, Final

import numpy as np

from isotherm.text_cells import MISSING
from isotherm.text_rows import Numbers, Wanted

__all__ = ["read_fast"]

_SAMPLE: Final = 8192  # bytes looked at for quotes and blanks between cells
_MISSING_CELLS: Final = sorted(
    {form for cell in MISSING for form in (cell, cell.upper(), cell.title())}
    | {"NaN", "-NaN", "+NaN", "NaN()"}
)


def read_fast(
    data: bytes, start: int, stop: int, first_line: int, wanted: Wanted
) -> Numbers | None:
    """Read the rows between bytes `start` and `stop`; None when any line is not regular.

    Every line makes a row, a blank one too, so that line numbers are right. To be called with warnings as
    errors: pandas warns where it reads a row otherwise than written.
    """
    import pandas as pd

    layout, columns = wanted.block.layout, wanted.block.columns
    blank_separated = layout.delimiter == " "
    sample = data[start : start + _SAMPLE]
    options: dict[str, Any] = {
        "sep": r"\s+" if blank_separated else layout.delimiter,
        "header": None,
        "names": range(columns),
        "index_col": False,
        "dtype": {c: (object if c in wanted.clocks else np.float64) for c in wanted.read},
        "na_values": _MISSING_CELLS,
        "keep_default_na": False,
        "decimal": layout.decimal,
        "skip_blank_lines": False,
        "engine": "c",
        "quoting": 0 if b'"' in sample else 3,
        # costs a third of the time, so only where the rows need it
        "skipinitialspace": not blank_separated and layout.delimiter.encode() + b" " in sample,
        "encoding_errors": "replace",
    }
    if len(wanted.read) < columns:
        options["usecols"] = wanted.read
        # pandas drops surplus cells in silence when it reads some columns only
        if not blank_separated and not _rectangular(data, start, stop, layout.delimiter, columns):
            return None
    if stop == len(data):  # shares the bytes instead of copying them
        buffer = io.BytesIO(data)
        buffer.seek(start)
    else:
        buffer = io.BytesIO(data[start:stop])
    try:
        frame = pd.read_csv(buffer, **options)
    except (ValueError, OverflowError, Warning, RecursionError):
        return None  # whatever it is, the tolerant reader names it
    count = len(frame)
    return Numbers(
        {c: frame[c].to_numpy(dtype=np.float64) for c in wanted.numeric},
        {c: frame[c].fillna("").astype(str).tolist() for c in wanted.clocks},
        np.arange(first_line, first_line + count, dtype=np.int64),
    )


def _rectangular(data: bytes, start: int, stop: int, delimiter: str, columns: int) -> bool:
    """Whether there are just as many cells as rows of `columns` have."""
    mark = b"\n" if data.find(b"\n", start, stop) >= 0 else b"\r"
    rows = data.count(mark, start, stop) + (0 if data.endswith(mark, start, stop) else 1)
    return data.count(delimiter.encode(), start, stop) == (columns - 1) * rows
