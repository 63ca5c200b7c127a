"""Workbooks."""

from __future__ import annotations

import datetime
import importlib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from make_exports import invented_run

from isotherm.errors import UpstrokeError
from isotherm.table import read_table

openpyxl = pytest.importorskip("openpyxl")


def _book(path: Path, *, clock: bool = False, sheets: int = 1, gap: bool = False) -> None:
    run = invented_run()
    book = openpyxl.Workbook()
    book.active.title = "notes"
    book.active.append(["invented run", None])
    book.active.append(["film", 3])
    for number in range(sheets):
        sheet = book.create_sheet(f"data {number}")
        sheet.append(["Invented run"])
        sheet.append([])
        sheet.append(["Time", "Trough area", "Surface pressure"])
        sheet.append(["hh:mm:ss" if clock else "s", "cm²", "mN/m"])
        for row, (t, a, p) in enumerate(zip(run.time, run.area, run.pressure, strict=True)):
            moment: Any = float(t)
            if clock:
                moment = (
                    datetime.datetime(2031, 5, 6, 9) + datetime.timedelta(seconds=float(t))
                ).time()
            sheet.append([moment, float(a), "n/a" if gap and row == 5 else float(p)])
    book.save(path)


@pytest.mark.parametrize("clock", [False, True])
def test_a_workbook_reads_like_text(tmp_path: Path, clock: bool) -> None:
    path = tmp_path / "run.xlsx"
    _book(path, clock=clock)
    table = read_table(path)
    run = invented_run()
    assert table.values["area"].tolist() == run.area.tolist()
    assert table.values["pressure"].tolist() == run.pressure.tolist()
    assert table.values["time"] - table.values["time"][0] == pytest.approx(run.time)
    assert table.lines.tolist() == list(range(5, 45))
    assert table.source.columns["area"].unit == "cm²"


def test_a_gap_in_a_workbook(tmp_path: Path) -> None:
    path = tmp_path / "run.xlsx"
    _book(path, gap=True)
    table = read_table(path)
    assert np.flatnonzero(np.isnan(table.values["pressure"])).tolist() == [5]
    assert any("1 cell is missing (first, line 10)" in w for w in table.warnings)


def test_two_worksheets_with_numbers_are_asked_about(tmp_path: Path) -> None:
    path = tmp_path / "run.xlsx"
    _book(path, sheets=2)
    with pytest.raises(UpstrokeError, match="2 worksheets hold numbers: 'data 0', 'data 1'"):
        read_table(path)


def test_no_numbers(tmp_path: Path) -> None:
    path = tmp_path / "run.xlsx"
    _book(path, sheets=0)
    with pytest.raises(UpstrokeError, match="no worksheet holds rows of numbers"):
        read_table(path)


def test_damaged(tmp_path: Path) -> None:
    path = tmp_path / "run.xlsx"
    _book(path)
    data = bytearray(path.read_bytes())
    for cut in (100, len(data) // 2, len(data) - 10):
        path.write_bytes(bytes(data[:cut]))
        with pytest.raises(UpstrokeError, match=r"damaged workbook|archive"):
            read_table(path)


def test_an_archive_made_to_fill_the_memory(tmp_path: Path) -> None:
    import zipfile

    path = tmp_path / "run.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/workbook.xml", b" " * 30_000_000)
    with pytest.raises(UpstrokeError, match="unpacks to 30 MB"):
        read_table(path)


def test_without_openpyxl(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "run.xlsx"
    _book(path)
    real = importlib.import_module

    def missing(name: str, *rest: Any) -> Any:
        if name == "openpyxl":
            raise ImportError(name)
        return real(name, *rest)

    monkeypatch.setattr(importlib, "import_module", missing)
    with pytest.raises(UpstrokeError, match=r"pip install 'upstroke\[excel\]'"):
        read_table(path)
