"""Folders of good and bad exports, collected as they are found."""

from __future__ import annotations

import os
import tomllib
from pathlib import Path

import numpy as np
import pytest
from make_exports import EXPORTS, invented_run

from isotherm.errors import UpstrokeError
from isotherm.table import read_table
from isotherm.trace_read import read_trace

_GOOD = sorted(p for p in (EXPORTS / "good").iterdir() if p.name != "partial.txt")
_PARTIAL = (EXPORTS / "good" / "partial.txt").read_text(encoding="utf-8").split()
_BAD = tomllib.loads((EXPORTS / "bad" / "expected.toml").read_text(encoding="utf-8"))
_REVERSED = {"molecular_reversed.csv"}
_SHUFFLED = {"shuffled.csv"}


@pytest.mark.parametrize("path", _GOOD, ids=lambda p: p.name)
def test_a_good_export_holds_the_run(path: Path) -> None:
    run = invented_run()
    table = read_table(path)
    assert len(table.lines) == 40
    assert "pressure" in table.values
    assert {"area", "molecular_area"} & set(table.values)
    rows = np.arange(40)
    if path.name in _REVERSED:
        rows = rows[::-1]
    if path.name in _SHUFFLED:
        rows = np.round(table.values["time"] / 15.0).astype(int)
    for role, values in table.values.items():
        expected = getattr(run, role)[rows]
        if role == "time":
            values = values - values.min()
        lacking = np.flatnonzero(~np.isfinite(values))
        if path.name in _PARTIAL and role == "pressure":
            assert lacking.tolist() == [3, 7, 11, 15, 19, 23, 27]
            values, expected = np.delete(values, lacking), np.delete(expected, lacking)
        # mm² and N/m were rounded when written
        assert values == pytest.approx(expected, rel=2e-4, abs=1e-6), role
    for role, column in table.source.columns.items():
        assert role in table.values
        assert column.index >= 1


@pytest.mark.parametrize("path", [p for p in _GOOD if p.name in _PARTIAL], ids=lambda p: p.name)
def test_missing_and_infinite_cells_are_counted(path: Path) -> None:
    said = " ".join(read_table(path).warnings)
    assert "5 cells are missing (first, line 5)" in said
    assert "2 cells are infinite (first, line 25)" in said


def test_line_numbers_are_those_of_the_file() -> None:
    for name in (
        "preamble.txt",
        "repeated_header.csv",
        "blank_lines.csv",
        "footer.csv",
        "utf16.csv",
    ):
        path = EXPORTS / "good" / name
        data = path.read_bytes()
        text = data.decode("utf-16" if data.startswith(b"\xff\xfe") else "utf-8")
        lines = text.splitlines()
        for row, number in enumerate(read_table(path).lines.tolist()):
            assert (
                lines[number - 1].replace(",", ".").replace(";", "\t").startswith(f"{15.0 * row}")
            ), name


@pytest.mark.parametrize("name", sorted(_BAD))
def test_a_bad_export_is_refused_in_one_line(name: str) -> None:
    with pytest.raises(UpstrokeError) as caught:
        read_trace(EXPORTS / "bad" / name)
    message = str(caught.value)
    assert message.startswith(str(EXPORTS / "bad" / name))
    assert "\n" not in message
    assert len(message) - len(str(EXPORTS)) < 420
    for word in _BAD[name]:
        assert word in message


def test_every_bad_export_has_its_expectation() -> None:
    found = {p.name for p in (EXPORTS / "bad").iterdir()} - {"expected.toml"}
    assert found == set(_BAD)


def test_no_file_directory_pipe_and_no_permission(tmp_path: Path) -> None:
    with pytest.raises(UpstrokeError, match="no such file"):
        read_trace(tmp_path / "none.csv")
    with pytest.raises(UpstrokeError, match="a directory"):
        read_trace(tmp_path)
    with pytest.raises(UpstrokeError, match="cannot be opened"):
        read_trace("a\0b")
    with pytest.raises(UpstrokeError, match="cannot be opened"):
        read_trace("a" * 5000)
    if hasattr(os, "mkfifo"):
        os.mkfifo(tmp_path / "pipe")
        with pytest.raises(UpstrokeError, match="not a regular file"):
            read_trace(tmp_path / "pipe")
    if Path("/dev/zero").exists():
        with pytest.raises(UpstrokeError, match="not a regular file"):
            read_trace("/dev/zero")
    locked = tmp_path / "locked.csv"
    locked.write_text("1,2\n")
    locked.chmod(0)
    if not os.access(locked, os.R_OK):  # root may read everything
        with pytest.raises(UpstrokeError, match="may not be read"):
            read_trace(locked)


def test_the_input_is_not_touched() -> None:
    path = EXPORTS / "good" / "comma.csv"
    before = (path.read_bytes(), path.stat().st_mtime_ns)
    read_table(path)
    assert (path.read_bytes(), path.stat().st_mtime_ns) == before
