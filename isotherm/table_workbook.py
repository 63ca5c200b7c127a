"""An .xlsx workbook becomes text, so that one reader serves both."""

from __future__ import annotations

import importlib
import io
import zipfile
from datetime import date, datetime, time, timedelta
from typing import Any, Final

from isotherm.errors import UpstrokeError

__all__ = ["workbook_text"]

# A workbook unpacks to some ten times its size; far more is an archive made to fill the memory.
_LARGEST_RATIO: Final = 200
_LARGEST_UNPACKED: Final = 2_000_000_000  # bytes
_MOST_COLUMNS: Final = 200


def workbook_text(data: bytes, where: str) -> bytes:
    """Write the worksheet that holds numbers as tab-separated UTF-8 text, one line per row.

    Parameters
    ----------
    data : bytes
        The workbook.
    where : str
        Named in errors.

    Raises
    ------
    UpstrokeError
        When openpyxl is not installed, the workbook is damaged, or several worksheets hold numbers.
    """
    try:
        openpyxl: Any = importlib.import_module("openpyxl")
    except ImportError:
        raise UpstrokeError(
            "reading .xlsx needs the package openpyxl, which is not installed",
            where=where,
            remedy="install it with `pip install 'upstroke[excel]'`, or save the worksheet as text",
        ) from None
    _check_size(data, where)
    texts: dict[str, tuple[bytes, int]] = {}
    try:
        book = openpyxl.load_workbook(
            io.BytesIO(data), read_only=True, data_only=True, keep_links=False
        )
        for sheet in book.worksheets:
            texts[str(sheet.title)] = _sheet_text(sheet)
    except UpstrokeError:
        raise
    except Exception as error:  # openpyxl raises whatever its parsers do on a damaged file
        raise UpstrokeError(
            f"a damaged workbook ({type(error).__name__})",
            where=where,
            remedy="save it again as .xlsx or as text",
        ) from None
    full = [name for name, (_, rows) in texts.items() if rows >= 2]
    if len(full) > 1:
        shown = ", ".join(f"'{name[:30]}'" for name in full[:8])
        raise UpstrokeError(
            f"{len(full)} worksheets hold numbers: {shown}",
            where=where,
            remedy="save the one meant as a workbook or text file of its own",
        )
    if not full:
        raise UpstrokeError(
            "no worksheet holds rows of numbers", where=where, remedy="export the readings again"
        )
    return texts[full[0]][0]


def _check_size(data: bytes, where: str) -> None:
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            unpacked = sum(item.file_size for item in archive.infolist())
    except (zipfile.BadZipFile, ValueError, NotImplementedError, OSError):
        raise UpstrokeError(
            "a damaged workbook", where=where, remedy="save it again as .xlsx or as text"
        ) from None
    if unpacked > _LARGEST_UNPACKED or unpacked > _LARGEST_RATIO * max(len(data), 10_000):
        raise UpstrokeError(
            f"a workbook that unpacks to {unpacked / 1e6:.0f} MB",
            where=where,
            remedy="save the worksheet as text",
        )


def _sheet_text(sheet: Any) -> tuple[bytes, int]:
    """The cells as text, and how many rows hold two numbers or more."""
    out = io.StringIO()
    rows = 0
    # a worksheet's stated size may be wrong; only what is there is read
    sheet.reset_dimensions()
    for cells in sheet.iter_rows(values_only=True, max_col=_MOST_COLUMNS):
        numbers = sum(isinstance(c, int | float) and not isinstance(c, bool) for c in cells)
        rows += numbers >= 2
        out.write("\t".join(_cell_text(cell) for cell in cells).rstrip("\t"))
        out.write("\n")
    return out.getvalue().encode("utf-8", "replace"), rows


def _cell_text(cell: Any) -> str:
    if cell is None:
        return ""
    if isinstance(cell, float):
        return repr(cell)
    if isinstance(cell, datetime):
        return cell.isoformat(sep="T", timespec="microseconds")
    if isinstance(cell, time):
        return cell.isoformat(timespec="microseconds")
    if isinstance(cell, timedelta):
        seconds = cell.total_seconds()
        hours, rest = divmod(seconds, 3600.0)
        minutes, rest = divmod(rest, 60.0)
        return f"{hours:02.0f}:{minutes:02.0f}:{rest:09.6f}"
    if isinstance(cell, date):
        return cell.isoformat()
    return " ".join(str(cell).split())
