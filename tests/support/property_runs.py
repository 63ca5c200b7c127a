"""Columns that may hold anything, and one run written in many dresses, for property tests."""

from __future__ import annotations

import math
import random
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
from hostile_runs import damaged, seed_runs
from hypothesis import strategies as st
from numpy.typing import NDArray

from isotherm.source import Source
from isotherm.table import Table
from isotherm.table_report import LARGEST, LARGEST_TIME

__all__ = ["agree", "any_table", "numbers_of", "write_export"]

FloatArray = NDArray[np.float64]

# The reader lets nothing larger through (isotherm.table_report.LARGEST); missing and infinite cells it does.
_READING = st.one_of(
    st.floats(-100.0, 300.0),
    st.floats(-1e9, 1e9),
    st.sampled_from([0.0, 1.0, 30.0, 30.0, 1e-300, 1e9, math.nan, math.inf, -math.inf]),
)


@st.composite
def _column(draw: st.DrawFn, rows: int) -> FloatArray:
    """A column of one of the shapes records have, or of anything, damaged in a few places."""
    kind = draw(st.sampled_from(["anything", "steps", "ramp", "level", "back and forth"]))
    if kind == "anything":
        return np.array(draw(st.lists(_READING, min_size=rows, max_size=rows)))
    first, last = draw(st.floats(-10.0, 300.0)), draw(st.floats(-10.0, 300.0))
    part = np.linspace(0.0, 1.0, rows)
    if kind == "steps":
        part = np.floor(part * draw(st.integers(1, 6))) / 6.0
    elif kind == "level":
        part = np.zeros(rows)
    elif kind == "back and forth":
        part = np.abs((part * draw(st.integers(1, 6))) % 2.0 - 1.0)
    noise = np.random.default_rng(draw(st.integers(0, 99))).normal(size=rows)
    out = first + (last - first) * part + draw(st.sampled_from([0.0, 1e-9, 0.01, 1.0])) * noise
    if rows:
        for _ in range(draw(st.integers(0, 3))):
            out[draw(st.integers(0, rows - 1))] = draw(_READING)
    return np.asarray(out)


@st.composite
def any_table(draw: st.DrawFn, *roles: str, like: str) -> Table:
    """A table of 0 to 800 rows with the given roles: a command's sound run, damaged, or any columns."""
    if draw(st.integers(0, 3)):
        return _damaged_table(like, roles, random.Random(draw(st.integers(0, 2**32))))
    rows = draw(st.sampled_from([0, 1, 2, 7, 8, 9, 12, 25, 40, 60, 150, 400]))
    if rows > 60:  # long columns of single draws would exhaust the source of randomness
        values = {role: draw(_column(60)) for role in roles}
        values = {
            r: np.interp(np.linspace(0, 59, rows), np.arange(60), v) for r, v in values.items()
        }
    else:
        values = {role: draw(_column(rows)) for role in roles}
    if draw(st.booleans()):
        values["time"] = np.arange(rows) * draw(st.sampled_from([0.1, 1.0, 10.0]))
    return Table(Source("any.csv", "", rows), values, np.arange(1, rows + 1))


def _damaged_table(command: str, roles: tuple[str, ...], rng: random.Random) -> Table:
    """The small run of a command with what goes wrong in records, but for a time that no role asks for."""
    run = next(each for each in seed_runs() if each.command == command)
    columns = damaged(run, rng).columns
    named = {
        _role(header): np.where(
            np.abs(column) <= (LARGEST_TIME if _role(header) == "time" else LARGEST), column, np.nan
        )
        for header, column in columns.items()
    }
    values = {role: named[role] for role in (*roles, *({"time"} & named.keys()))}
    rows = len(next(iter(values.values())))
    return Table(Source("any.csv", "", rows), values, np.arange(1, rows + 1))


def _role(header: str) -> str:
    words = header.lower()
    for role in ("dipper position", "area", "pressure", "potential"):
        if role in words:
            return role.replace(" ", "_")
    return "area" if words.startswith("a ") else "time"


def write_export(
    path: Path,
    columns: Mapping[str, FloatArray],
    *,
    separator: str = ",",
    decimal: str = ".",
    encoding: str = "utf-8",
    digits: int = 12,
) -> Path:
    """Write columns under their headers."""
    lines = [separator.join(columns)]
    for row in zip(*(v.tolist() for v in columns.values()), strict=True):
        lines.append(separator.join(f"{v:.{digits}g}".replace(".", decimal) for v in row))
    path.write_text("\n".join(lines) + "\n", encoding=encoding)
    return path


def numbers_of(payload: dict[str, Any]) -> dict[str, Any]:
    """A result's JSON without where it came from and what was said of it."""
    where = ("source", "sources", "warnings", "title", "settings", "name", "path")
    return {k: v for k, v in payload.items() if k not in where}


def agree(one: Any, other: Any, *, within: float = 1.0, path: str = "") -> list[str]:
    """Differences between two JSON results: quantities by more than `within` of the larger u, other things at
    all (plain numbers are left to the quantities beside them)."""
    if isinstance(one, dict) and isinstance(other, dict):
        if "value" in one and "u" in one:
            if (one["value"] is None) or (other["value"] is None):
                return [] if one["value"] == other["value"] else [f"{path}: {one} {other}"]
            u = max(one["u"] or 0.0, other["u"] or 0.0)
            slack = within * u + 1e-9 * abs(one["value"])
            return [] if abs(one["value"] - other["value"]) <= slack else [f"{path}: {one} {other}"]
        if one.keys() != other.keys():
            return [f"{path}: keys {sorted(one.keys() ^ other.keys())}"]
        return [d for k in one for d in agree(one[k], other[k], within=within, path=f"{path}.{k}")]
    if isinstance(one, list) and isinstance(other, list):
        if len(one) != len(other):
            return [f"{path}: {len(one)} against {len(other)}"]
        pairs = enumerate(zip(one, other, strict=True))
        return [d for i, (a, b) in pairs for d in agree(a, b, within=within, path=f"{path}[{i}]")]
    if isinstance(one, float | int) and isinstance(other, float | int):
        return []
    return [] if one == other else [f"{path}: {one} {other}"]
