"""Raw electrochemical records: voltammograms and impedance spectra from a text export."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.file_bytes import read_bytes
from isotherm.text_bytes import decode
from isotherm.units import Conversion, conversion
from transfer.evidence_series import Impedance, Voltammogram

__all__ = ["RawFile", "read_raw"]

FloatArray = NDArray[np.float64]

_FEWEST_ROWS = 2
_SAMPLE_ROWS = 12
_NUMBER = re.compile(r"[-+]?(?:\d+[.,]?\d*|[.,]\d+)(?:[eE][-+]?\d+)?")
# A header with its unit: "Potential (V)", "I/µA", "Current [nA]", "E, V", "potential V".
_HEADED = re.compile(
    r"^\s*(?P<name>.*?)\s*(?:\((?P<round>[^()]*(?:\([^()]*\))?[^()]*)\)|\[(?P<square>[^\]]*)\]"
    r"|[/,]\s*(?P<slash>[^/,]+)|\s(?P<blank>\S+))\s*$"
)
# Fixed unit of each role; the unit in the header says what a column is.
_ROLES = {"V": "potential", "A": "current", "s": "time", "Hz": "frequency", "ohm": "impedance"}
_NAMES = {
    "potential": re.compile(r"potential|voltage|^e\b|^e_?we|^u\b", re.IGNORECASE),
    "current": re.compile(r"current|^i\b|^<?i>?$", re.IGNORECASE),
    "time": re.compile(r"time|^t\b", re.IGNORECASE),
    "frequency": re.compile(r"freq|^f\b", re.IGNORECASE),
}
_IMAGINARY = re.compile(r"im|''|″|\"", re.IGNORECASE)
_REAL = re.compile(r"re|z'|′|real", re.IGNORECASE)
_MINUS = re.compile(r"^\s*[-−–]|^\s*(minus|neg)", re.IGNORECASE)


@dataclass(frozen=True)
class RawFile:
    """A raw record, and the scan rate (V/s) its time column gives; None without one."""

    curve: Voltammogram | Impedance
    scan_rate: float | None = None


def read_raw(path: Path, where: str) -> RawFile:
    """Read a voltammogram (columns potential and current) or an impedance record.

    Columns are known by the unit in their header. Further columns are left alone.

    Parameters
    ----------
    path : Path
    where : str
        Where the evidence file names it, for errors.

    Raises
    ------
    UpstrokeError
        The file cannot be read, holds no numbers, or its columns cannot be told.
    """
    try:
        text = decode(read_bytes(path), where=str(path)).text
    except UpstrokeError as error:
        raise UpstrokeError(
            error.what, where=f"{where}, file {path}", remedy=error.remedy
        ) from None
    lines = text.splitlines()
    mark, comma, first = _layout(lines, str(path))
    heads = _headers(lines, mark, first)
    roles = _roles(heads, f"{path}, line {max(first, 1)}")
    columns = _numbers(lines[first:], mark, comma, max(i for i, _, _ in roles.values()) + 1, path)
    values: dict[str, FloatArray] = {}
    for role, (index, convert, sign) in roles.items():
        values[role] = sign * convert(columns[:, index])
    keep = np.all([np.isfinite(v) for k, v in values.items() if k != "time"], axis=0)
    values = {role: v[keep] for role, v in values.items()}
    if not np.any(keep):
        raise UpstrokeError("no row of numbers", where=str(path), remedy="check the file")
    if "frequency" in values:
        return RawFile(
            Impedance(values["frequency"], values["real"], values["imaginary"], str(path))
        )
    rate = None
    if "time" in values:
        step = np.diff(values["time"])
        moving = step > 0
        if np.count_nonzero(moving) > _FEWEST_ROWS:
            rate = float(np.median(np.abs(np.diff(values["potential"])[moving]) / step[moving]))
    return RawFile(Voltammogram(values["potential"], values["current"], str(path)), rate or None)


def _split(line: str, mark: str) -> list[str]:
    return [c.strip().strip('"') for c in (line.split() if mark == " " else line.split(mark))]


def _is_row(cells: Sequence[str]) -> bool:
    filled = [c for c in cells if c]
    return len(filled) >= 2 and sum(bool(_NUMBER.fullmatch(c)) for c in filled) >= max(
        2, (len(filled) + 1) // 2
    )


def _layout(lines: list[str], path: str) -> tuple[str, bool, int]:
    """Separator, whether commas are decimal, and the first row of numbers."""
    best: tuple[int, str] = (0, "")
    for mark in ("\t", ";", ",", " "):
        count = sum(_is_row(_split(line, mark)) for line in lines[-200:] if line.strip())
        if count > best[0]:
            best = (count, mark)
    mark = best[1]
    if best[0] < _FEWEST_ROWS:
        raise UpstrokeError("no columns of numbers", where=path, remedy="give a text export")
    first = next(n for n, line in enumerate(lines) if _is_row(_split(line, mark)))
    comma = mark != "," and any("," in line for line in lines[first : first + _SAMPLE_ROWS])
    return mark, comma, first


def _headers(lines: list[str], mark: str, first: int) -> list[str]:
    """Header of each column; a line of units below the names is joined to it."""
    above = [line for line in lines[max(first - 4, 0) : first] if line.strip()]
    if not above:
        return []
    width = len(_split(lines[first], mark))
    if mark == " ":
        above = [re.sub(r"\s+([(\[])", r"\1", line.strip().lstrip("#%")) for line in above]
    heads = _split(above[-1].lstrip("#%"), mark)
    if len(above) > 1:
        upper = _split(above[-2].lstrip("#%"), mark)
        bare = all(_role(f"x ({h.strip('()[] ')})") or not h for h in heads)
        if bare and len(upper) == len(heads) == width:
            heads = [f"{a} ({b.strip('()[] ')})" for a, b in zip(upper, heads, strict=True)]
    return heads


def _role(head: str) -> tuple[str, Conversion] | None:
    found = _HEADED.match(head)
    if found is None:
        return None
    unit = found.group("round") or found.group("square") or found.group("slash")
    unit = unit or found.group("blank") or ""
    for fixed, role in _ROLES.items():
        try:
            return role, conversion(unit, fixed)
        except UpstrokeError:
            continue
    return None


def _roles(heads: list[str], where: str) -> dict[str, tuple[int, Conversion, float]]:
    found: dict[str, list[tuple[int, Conversion, float]]] = {}
    for index, head in enumerate(heads):
        known = _role(head)
        if known is None:
            continue
        role, convert = known
        sign = 1.0
        if role == "impedance":
            name = head.partition("(")[0].partition("[")[0]
            if _IMAGINARY.search(name):
                role, sign = "imaginary", -1.0 if _MINUS.search(name) else 1.0
            elif _REAL.search(name):
                role = "real"
            else:
                continue
        found.setdefault(role, []).append((index, convert, sign))
    spectrum = "frequency" in found or "imaginary" in found
    needs = ("frequency", "real", "imaginary") if spectrum else ("potential", "current")
    out = {}
    for role in (*needs, "time"):
        columns = found.get(role, [])
        if len(columns) > 1 and role in _NAMES:
            named = [c for c in columns if _NAMES[role].search(heads[c[0]])]
            columns = named or columns
        if len(columns) == 1 or (role == "time" and columns):
            out[role] = columns[0]
        elif role != "time":
            shown = ", ".join(f"'{h}'" for h in heads if h)[:80] or "no header"
            many = f"{len(columns)} columns may be" if columns else "no column is"
            raise UpstrokeError(
                f"{many} the {role} (found {shown})",
                where=where,
                remedy="head columns with name and unit, as in potential (V),current (µA)"
                if not spectrum
                else "head columns frequency (Hz),Re Z (ohm),-Im Z (ohm)",
            )
    return out


def _numbers(lines: list[str], mark: str, comma: bool, width: int, path: Path) -> FloatArray:
    import io

    import pandas as pd

    frame = pd.read_csv(
        io.StringIO("\n".join(lines)),
        sep=r"\s+" if mark == " " else mark,
        decimal="," if comma else ".",
        header=None,
        usecols=list(range(width)),
        names=list(range(max(width, len(_split(lines[0], mark))))),
        index_col=False,
        on_bad_lines="skip",
        engine="c",
    )
    return np.column_stack(
        [pd.to_numeric(frame[c], errors="coerce").to_numpy(dtype=float) for c in frame.columns]
    )
