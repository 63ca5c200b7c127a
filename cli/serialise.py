"""Results as bytes: JSON and CSV, the same bytes for the same result."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import math
import sys
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

from cli import __version__
from cli.terminal import printable
from isotherm.errors import UpstrokeError

__all__ = ["csv_bytes", "input_stamp", "json_bytes", "rows_csv", "with_provenance"]

# The libraries whose release can move a number.
NUMERIC_LIBRARIES = ("numpy", "scipy", "pandas", "ruptures")

# A spreadsheet takes a text cell that starts with one of these for a formula.
FORMULA_STARTS = ("=", "+", "-", "@")


def json_bytes(payload: Any) -> bytes:
    """Return `payload` as UTF-8 JSON ending in a newline; NaN and infinities become null.

    Keys keep the order of the payload. Characters of a file name that are no Unicode are escaped.
    """
    text = json.dumps(_plain(payload), indent=2, ensure_ascii=False, allow_nan=False)
    return (text + "\n").encode("utf-8", "backslashreplace")


def _plain(value: Any) -> Any:
    """Reduce a payload to what JSON holds."""
    if value is None or isinstance(value, (str, bool, int)):
        return value
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    if isinstance(value, dict):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(item) for item in value]
    if isinstance(value, Path):
        return str(value)
    if hasattr(value, "tolist"):  # numpy scalars and arrays
        return _plain(value.tolist())
    raise TypeError(f"a result holds a {type(value).__name__}, which JSON has no form for")


def csv_bytes(header: Sequence[str], rows: Iterable[Sequence[Any]]) -> bytes:
    """Return a table as UTF-8 CSV, safe to open in a spreadsheet.

    Numbers are written with seven significant digits, None and NaN as empty cells. A text cell that
    a spreadsheet would run as a formula gets a leading apostrophe; control characters are spelt out.
    """
    buffer = io.StringIO(newline="")
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow([_cell(name) for name in header])
    writer.writerows([_cell(value) for value in row] for row in rows)
    return buffer.getvalue().encode("utf-8", "backslashreplace")


def rows_csv(rows: Sequence[Mapping[str, Any]]) -> bytes:
    """Return rows of named cells as CSV; the header holds every name in the order first met."""
    header = list(dict.fromkeys(name for row in rows for name in row))
    return csv_bytes(header, [[row.get(name) for name in header] for row in rows])


def _cell(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, str):
        text = printable(value)
        return f"'{text}" if text.startswith(FORMULA_STARTS) else text
    if isinstance(value, (bool, int)):
        return str(value)
    number = float(value)
    return format(number, ".7g") if math.isfinite(number) else ""


def _library_version(name: str) -> str | None:
    loaded = sys.modules.get(name)
    version = getattr(loaded, "__version__", None)
    if isinstance(version, str):
        # a worker process may have loaded it in place of this one: write it as its package does
        return version.removeprefix("v")
    from importlib.metadata import PackageNotFoundError
    from importlib.metadata import version as installed

    try:
        return installed(name)
    except PackageNotFoundError:
        return None


def with_provenance(payload: dict[str, Any], settings: dict[str, Any]) -> dict[str, Any]:
    """Return `payload` with the command's settings and the versions that made it, both at the top.

    Settings the analysis recorded itself are kept, after those of the command, which go first.
    """
    versions: dict[str, str | None] = {
        "upstroke": __version__,
        "python": ".".join(str(part) for part in sys.version_info[:3]),
    }
    versions.update({name: _library_version(name) for name in NUMERIC_LIBRARIES})
    own = payload.get("settings")
    merged = {**(own if isinstance(own, dict) else {}), **settings}
    merged = {**{key: merged[key] for key in settings}, **merged}
    out: dict[str, Any] = {}
    for key, value in payload.items():
        if key != "settings":
            out[key] = value
        if key == "schema":
            out["settings"] = merged
            out["versions"] = versions
    out.setdefault("settings", merged)
    out.setdefault("versions", versions)
    return out


def input_stamp(path: Path) -> dict[str, str]:
    """Return path and SHA-256 of an input, as settings record it.

    Raises
    ------
    UpstrokeError
        The file cannot be read.
    """
    try:
        with path.open("rb") as file:
            digest = hashlib.file_digest(file, "sha256").hexdigest()
    except OSError as error:
        raise UpstrokeError(
            f"cannot be read: {error.strerror}", where=str(path), remedy="name a file that can"
        ) from error
    return {"path": str(path), "sha256": digest}
