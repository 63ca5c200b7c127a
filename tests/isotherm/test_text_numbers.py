"""The fast and the tolerant way through the rows give the same numbers."""

from __future__ import annotations

import warnings
from pathlib import Path

import numpy as np
import pytest

from isotherm import text_numbers
from isotherm.table import Table, read_table
from isotherm.text_fast import read_fast, read_fast_file
from isotherm.text_layout import find_block
from isotherm.text_lines import read_lines, read_regular
from isotherm.text_rows import Wanted

_HEADER = "Time (s),Area (cm^2),Pressure (mN/m)"


def _rows(count: int, seed: int = 3) -> list[str]:
    rng = np.random.default_rng(seed)
    time = np.arange(count) * 0.5
    area = 240.0 - time / max(time[-1], 1.0) * 180.0
    pressure = 30.0 + rng.normal(0.0, 3.0, count)
    return [f"{t:.1f},{a:.4f},{p:.3f}" for t, a, p in zip(time, area, pressure, strict=True)]


def _both(
    monkeypatch: pytest.MonkeyPatch, path: Path, *, piece: int = 1 << 12
) -> tuple[Table, Table]:
    """The table by the fast way (pieces made small) and line by line."""
    monkeypatch.setattr(text_numbers, "_SMALL", 0)
    monkeypatch.setattr(text_numbers, "_SMALL_WITH_PANDAS", 0)
    monkeypatch.setattr(text_numbers, "_PIECE", piece)
    fast = read_table(path)
    monkeypatch.setattr(text_numbers, "_SMALL", 1 << 40)
    monkeypatch.setattr(text_numbers, "_SMALL_WITH_PANDAS", 1 << 40)
    monkeypatch.setattr(text_numbers, "read_regular", lambda *_: None)
    return fast, read_table(path)


def _odd_lines() -> dict[str, list[str]]:
    plain = _rows(3000)
    out = {"plain": plain}
    out["missing"] = [
        r.rsplit(",", 1)[0] + "," + ("", "-", "NaN", "n/a")[i % 4] if i % 97 == 5 else r
        for i, r in enumerate(plain)
    ]
    out["rows of nothing"] = [
        ("-,NaN,n/a" if i % 500 == 9 else ",," if i % 500 == 19 else "" if i % 500 == 29 else r)
        for i, r in enumerate(plain)
    ]
    out["infinite"] = [
        r.rsplit(",", 1)[0] + ",inf" if i % 500 == 7 else r for i, r in enumerate(plain)
    ]
    out["overload"] = [
        r.rsplit(",", 1)[0] + ",overload" if i == 1700 else r for i, r in enumerate(plain)
    ]
    out["repeated header"] = [
        line for i, r in enumerate(plain) for line in ([_HEADER, r] if i % 700 == 699 else [r])
    ]
    out["blank lines"] = [
        line for i, r in enumerate(plain) for line in (["", r] if i % 300 == 9 else [r])
    ]
    out["comments"] = [
        line for i, r in enumerate(plain) for line in (["pause pressed", r] if i == 1200 else [r])
    ]
    out["surplus cells"] = [r + ",9" if i == 2000 else r for i, r in enumerate(plain)]
    out["short rows"] = [r.rsplit(",", 1)[0] if i % 400 == 3 else r for i, r in enumerate(plain)]
    out["footer"] = [*plain, "", "end of run", "mean,3,4"]
    out["last line cut"] = [*plain, "1500.0,59"]
    return out


@pytest.mark.parametrize("name", sorted(_odd_lines()))
def test_fast_and_tolerant_agree(
    name: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "run.csv"
    path.write_text("\n".join([_HEADER, *_odd_lines()[name], ""]), encoding="utf-8")
    fast, slow = _both(monkeypatch, path)
    assert fast.lines.tolist() == slow.lines.tolist()
    for role, values in slow.values.items():
        # the C parser rounds the last bit otherwise
        np.testing.assert_allclose(fast.values[role], values, rtol=1e-14, atol=0, err_msg=role)
    assert fast.warnings == slow.warnings


@pytest.mark.parametrize(
    ("delimiter", "decimal"),
    [(";", ","), ("\t", "."), ("\t", ","), (" ", "."), ("   ", ","), (", ", "."), ("|", ".")],
)
@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_fast_and_tolerant_agree_in_every_layout(
    delimiter: str, decimal: str, end: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    rows = [r.replace(",", ";").replace(".", decimal).replace(";", delimiter) for r in _rows(900)]
    path = tmp_path / "run.csv"
    path.write_bytes(end.join([_HEADER.replace(",", ";"), *rows, ""]).encode())
    fast, slow = _both(monkeypatch, path)
    assert fast.lines.tolist() == slow.lines.tolist() == list(range(2, 902))
    for role, values in slow.values.items():
        np.testing.assert_allclose(fast.values[role], values, rtol=1e-14, atol=0, err_msg=role)


def test_a_column_of_text_and_unwanted_columns(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    rows = [f"{i},closing now,{r},9.5" for i, r in enumerate(_rows(900))]
    path = tmp_path / "run.csv"
    path.write_text("\n".join([f"Index,State,{_HEADER},Target (mN/m)", *rows]), encoding="utf-8")
    fast, slow = _both(monkeypatch, path)
    assert set(fast.values) == {"time", "area", "pressure"}
    for role, values in slow.values.items():
        np.testing.assert_allclose(fast.values[role], values, rtol=1e-14, atol=0, err_msg=role)


def test_a_decimal_comma_in_a_comma_file_is_never_two_cells(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    # one row with a comma for a point: it has a cell too many and must not be read as another number
    rows = [f"x,{r}" for r in _rows(900)]
    rows[500] = rows[500].replace(".", ",", 1)
    path = tmp_path / "run.csv"
    path.write_text("\n".join([f"State,{_HEADER}", *rows]), encoding="utf-8")
    fast, slow = _both(monkeypatch, path)
    assert len(fast.lines) == len(slow.lines) == 899
    assert any("1 line among" in w and "line 502" in w for w in fast.warnings)


def test_regular_rows_are_read_alike() -> None:
    data = ("\n".join(_rows(200)) + "\n").encode()
    block = find_block(data.decode().splitlines(), complete=True)
    assert block is not None
    wanted = Wanted.of(block, (0, 1, 2), (), "utf-8")
    regular, lines = read_regular(data, 1, wanted), read_lines(data, 1, wanted)
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        fast = read_fast(data, 0, len(data), 1, wanted)
    assert regular is not None
    assert fast is not None
    for column in range(3):
        assert regular.columns[column].tolist() == lines.columns[column].tolist()
        np.testing.assert_allclose(fast.columns[column], lines.columns[column], rtol=1e-15)
    assert regular.lines.tolist() == lines.lines.tolist() == fast.lines.tolist()


def test_underscores_are_no_digits(tmp_path: Path) -> None:
    path = tmp_path / "run.csv"
    rows = _rows(50)
    rows[20] = "1_0.0,2_3,4_5"
    path.write_text("\n".join([_HEADER, *rows]), encoding="utf-8")
    assert len(read_table(path).lines) == 49


@pytest.mark.parametrize("mark", [".", ","])
def test_the_decimal_mark_may_come_late(mark: str, tmp_path: Path) -> None:
    path = tmp_path / "run.csv"
    rows = ["240;0"] * 60 + [f"{240 - i / 2:.1f};{i / 4:.2f}".replace(".", mark) for i in range(60)]
    path.write_text("Area (cm^2);Pressure (mN/m)\n" + "\n".join(rows) + "\n", encoding="utf-8")
    table = read_table(path)
    assert len(table.lines) == 120
    assert table.values["area"][-1] == 210.5


def test_a_file_that_changes_while_it_is_read_is_not_mixed(tmp_path: Path) -> None:
    data = ("\n".join([_HEADER, *_rows(200)]) + "\n").encode()
    lines = data.decode().splitlines()
    block = find_block(lines, complete=True)
    assert block is not None
    wanted = Wanted.of(block, (0, 1, 2), (), "utf-8")
    path = tmp_path / "run.csv"
    rows = data[len(lines[0]) + 1 :]
    path.write_bytes(data)
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        assert read_fast_file(str(path), rows, rows, 2, wanted) is not None
        path.write_bytes(data + b"999.5,1.0,2.0\n")
        assert read_fast_file(str(path), rows, rows, 2, wanted) is None
        path.unlink()
        assert read_fast_file(str(path), rows, rows, 2, wanted) is None


def test_a_quote_in_the_text_above_does_not_hide_rows(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "run.csv"
    path.write_text("\n".join(['film 5" off', "", _HEADER, *_rows(900)]), encoding="utf-8")
    fast, slow = _both(monkeypatch, path)
    assert fast.lines.tolist() == slow.lines.tolist() == list(range(4, 904))
