"""Which column plays which role, from sheet, header and text; and when the reader asks instead."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from make_exports import invented_run

from isotherm.errors import UpstrokeError
from isotherm.sheet_read import parse_sheet
from isotherm.table import Table, read_table

_RUN = invented_run()


def _table(
    tmp_path: Path,
    header: str,
    columns: list[np.ndarray],
    sheet: str = "",
    needs: tuple[str, ...] = (),
) -> Table:
    path = tmp_path / "run.csv"
    rows = "\n".join(",".join(repr(float(v)) for v in row) for row in np.column_stack(columns))
    path.write_text(f"{header}\n{rows}\n" if header else rows + "\n", encoding="utf-8")
    return read_table(path, parse_sheet(sheet), needs=needs)


_TPA = [_RUN.time, _RUN.area, _RUN.pressure]


def test_the_sheet_settles_two_pressures(tmp_path: Path) -> None:
    header = "Time (s),Area (cm^2),Pressure 1 (mN/m),Pressure 2 (mN/m)"
    columns = [*_TPA, _RUN.pressure + 1.0]
    for hint in ('header = "Pressure 2 (mN/m)"', 'header = "pressure 2"', "index = 4"):
        table = _table(tmp_path, header, columns, f'[[columns]]\nrole = "pressure"\n{hint}')
        assert table.values["pressure"] == pytest.approx(_RUN.pressure + 1.0)
        assert table.source.columns["pressure"].index == 4


def test_the_line_the_reader_shows_is_the_line_that_helps(tmp_path: Path) -> None:
    header = "Time (s),Area (cm^2),Pi (mN/m),Pi (mN/m)"
    columns = [*_TPA, _RUN.pressure + 1.0]
    with pytest.raises(UpstrokeError) as caught:
        _table(tmp_path, header, columns)
    # two headers alike: only the place can tell them apart
    assert '[[columns]] with role = "pressure", index = 3' in str(caught.value)
    table = _table(tmp_path, header, columns, '[[columns]]\nrole = "pressure"\nindex = 3')
    assert table.values["pressure"] == pytest.approx(_RUN.pressure)


def test_the_sheet_overrules_header_and_unit(tmp_path: Path) -> None:
    table = _table(
        tmp_path,
        "Time (s),Area (cm^2),Pressure (mN/m)",
        _TPA,
        '[[columns]]\nrole = "tension"\nindex = 3\nunit = "N/m"\n'
        '[[columns]]\nrole = "time"\nindex = 1\nunit = "min"',
    )
    assert "pressure" not in table.values
    assert table.values["tension"] == pytest.approx(_RUN.pressure * 1000.0)
    assert table.values["time"] == pytest.approx(_RUN.time * 60.0)


def test_columns_without_header_by_index(tmp_path: Path) -> None:
    sheet = (
        '[[columns]]\nrole = "area"\nindex = 2\nunit = "cm^2"\n'
        '[[columns]]\nrole = "pressure"\nindex = 3\nunit = "mN/m"\n'
    )
    table = _table(tmp_path, "", _TPA, sheet)
    assert set(table.values) == {"area", "pressure"}
    assert len(table.lines) == 40


@pytest.mark.parametrize(
    ("sheet", "says"),
    [
        ('role = "pressure"\nindex = 9', "as column 9, the rows have 3"),
        ('role = "pressure"\nheader = "Druck"', "no column has the header 'Druck'"),
        ('role = "pressure"\nindex = 2', "is in cm^2, the run sheet calls it the pressure"),
        ('role = "pressure"\nindex = 3\nunit = "kg"', "'kg' is not a unit of pressure"),
        (
            'role = "pressure"\nindex = 3\n[[columns]]\nrole = "tension"\nindex = 3',
            "given two roles",
        ),
    ],
)
def test_a_sheet_that_does_not_fit(tmp_path: Path, sheet: str, says: str) -> None:
    with pytest.raises(UpstrokeError) as caught:
        _table(tmp_path, "Time (s),Area (cm^2),Pressure (mN/m)", _TPA, f"[[columns]]\n{sheet}")
    assert says in str(caught.value)


def test_a_position_alone_is_asked_for(tmp_path: Path) -> None:
    with pytest.raises(UpstrokeError) as caught:
        _table(
            tmp_path, "Position (mm),Pressure (mN/m)", [_RUN.area, _RUN.pressure],
            needs=("molecular_area|area|barrier_position", "pressure"),
        )  # fmt: skip
    assert "column 1 'Position (mm)' could be" in str(caught.value)
    assert '"barrier_position"' in str(caught.value)


def test_a_position_beside_the_area_is_the_dippers_when_that_is_needed(tmp_path: Path) -> None:
    table = _table(
        tmp_path,
        "Area (cm^2),Pressure (mN/m),Position (mm)",
        [_RUN.area, _RUN.pressure, _RUN.time],
        needs=("dipper_position",),
    )
    assert table.values["dipper_position"] == pytest.approx(_RUN.time)
    assert any("is taken for the dipper position" in w for w in table.warnings)


def test_two_barriers(tmp_path: Path) -> None:
    table = _table(
        tmp_path,
        "Left barrier (mm),Right barrier (cm),Pressure (mN/m)",
        [_RUN.area, _RUN.area / 10.0, _RUN.pressure],
    )
    assert table.values["barrier_position"].shape == (40, 2)
    assert table.values["barrier_position"][:, 0] == pytest.approx(
        table.values["barrier_position"][:, 1]
    )
    with pytest.raises(UpstrokeError, match="3 columns could be the barrier position"):
        _table(tmp_path, "Barrier 1 (mm),Barrier 2 (mm),Barrier 3 (mm)", _TPA)


def test_units_are_inferred_only_where_one_choice_is_left(tmp_path: Path) -> None:
    table = _table(
        tmp_path, "Area per molecule,Surface pressure", [_RUN.molecular_area, _RUN.pressure]
    )
    assert table.values["molecular_area"] == pytest.approx(_RUN.molecular_area)
    assert sum("gives no unit" in w for w in table.warnings) == 2
    table = _table(
        tmp_path, "Area per molecule,Surface pressure", [_RUN.molecular_area * 100, _RUN.pressure]
    )
    assert table.values["molecular_area"] == pytest.approx(_RUN.molecular_area)
    with pytest.raises(UpstrokeError, match="the area has no unit"):
        _table(tmp_path, "Area,Surface pressure", [_RUN.area, _RUN.pressure])
    with pytest.raises(UpstrokeError, match="the pressure has no unit"):
        _table(tmp_path, "Area (cm^2),Pressure", [_RUN.area, _RUN.pressure / 1000.0])


def test_a_time_without_unit_only_orders_rows(tmp_path: Path) -> None:
    header = "Time,Area (cm^2),Pressure (mN/m)"
    table = _table(tmp_path, header, _TPA)
    assert any("time is taken to be in s" in w for w in table.warnings)
    with pytest.raises(UpstrokeError, match="the time has no unit"):
        _table(tmp_path, header, _TPA, needs=("time",))


def test_what_is_not_needed_does_not_stop_the_reading(tmp_path: Path) -> None:
    table = _table(
        tmp_path,
        "Area (cm^2),Pressure (mN/m),Temperature (foo)",
        [_RUN.area, _RUN.pressure, _RUN.temperature],
        needs=("area", "pressure"),
    )
    assert "temperature" not in table.values
    assert any("unknown unit and is not used" in w for w in table.warnings)


def test_missing_roles_are_named_with_what_is_there(tmp_path: Path) -> None:
    with pytest.raises(UpstrokeError) as caught:
        _table(tmp_path, "Time (s),Area (cm^2),Foo (mN/m)", _TPA, needs=("pressure|tension",))
    message = str(caught.value)
    assert "pressure or tension" in message
    assert "3 'Foo (mN/m)'" in message
    assert '[[columns]] with role = "pressure"' in message


def test_a_column_without_readings_stands_back(tmp_path: Path) -> None:
    nan = np.full(40, np.nan)
    table = _table(
        tmp_path, "Pressure 1 (mN/m),Area (cm^2),Pressure 2 (mN/m)", [nan, _RUN.area, _RUN.pressure]
    )
    assert table.values["pressure"] == pytest.approx(_RUN.pressure)


def test_free_text_must_match_the_columns(tmp_path: Path) -> None:
    path = tmp_path / "figure.csv"
    pairs = np.column_stack([_RUN.molecular_area * 100, _RUN.pressure]).tolist()
    rows = "\n".join(f"{area!r},{pressure!r}" for area, pressure in pairs)
    path.write_text(
        f"# area per molecule (Å²), surface pressure (mN/m), taken at 20 °C\n{rows}\n",
        encoding="utf-8",
    )
    assert set(read_table(path).values) == {"molecular_area", "pressure"}
    path.write_text(f"# pressures in mN/m\n{rows}\n", encoding="utf-8")
    with pytest.raises(UpstrokeError, match="no header"):
        read_table(path)
    path.write_text(f"# pressure in mN/m and pressure in N/m\n{rows}\n", encoding="utf-8")
    with pytest.raises(UpstrokeError, match="no header"):
        read_table(path)
