"""From export and sheet to a trace."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from make_exports import EXPORTS, invented_run

from isotherm.constants import AVOGADRO
from isotherm.errors import UpstrokeError
from isotherm.sheet_read import parse_sheet
from isotherm.trace import Trace
from isotherm.trace_read import FEWEST_ROWS, read_trace
from isotherm.water import surface_tension

_RUN = invented_run()
_FILM = '[film]\nmolar_mass = "300 g/mol"\nconcentration = "1.00 ± 0.01 mg/mL"\nvolume = "50 ± 0.5 µL"\n'
# 50 µL of 1 mg/mL is 50 µg; over 300 g/mol 1.6667e-7 mol; times N_A molecules. 1 cm^2 is 1e14 nm^2.
_MOLECULES = 50e-6 / 300.0 * AVOGADRO


def _trace(tmp_path: Path, header: str, columns: list[np.ndarray], sheet: str = "") -> Trace:
    path = tmp_path / "run.csv"
    rows = "\n".join(",".join(repr(float(v)) for v in row) for row in np.column_stack(columns))
    path.write_text(f"{header}\n{rows}\n", encoding="utf-8")
    return read_trace(path, parse_sheet(sheet))


def test_area_per_molecule_by_hand(tmp_path: Path) -> None:
    trace = _trace(
        tmp_path,
        "Time (s),Area (cm^2),Pressure (mN/m)",
        [_RUN.time, _RUN.area, _RUN.pressure],
        _FILM,
    )
    assert trace.area == pytest.approx(_RUN.area * 1e14 / _MOLECULES, rel=1e-12)
    assert trace.trough_area is not None
    assert trace.trough_area.tolist() == _RUN.area.tolist()
    assert trace.area_relative_u == pytest.approx(math.hypot(0.01, 0.01))
    assert trace.pressure.tolist() == _RUN.pressure.tolist()
    assert trace.time is not None
    assert trace.subphase_tension == pytest.approx(surface_tension(293.15))


def test_trough_area_uncertainty_joins_the_budget(tmp_path: Path) -> None:
    sheet = _FILM + '[trough]\narea_uncertainty = "1.5 cm^2"\npressure_uncertainty = "0.1 mN/m"\n'
    trace = _trace(tmp_path, "Area (cm^2),Pressure (mN/m)", [_RUN.area, _RUN.pressure], sheet)
    middle = 1.5 / float(np.median(_RUN.area))
    assert trace.area_relative_u == pytest.approx(math.sqrt(2e-4 + middle**2))
    assert trace.pressure_u == pytest.approx(0.1)


def test_molar_concentration_and_purity(tmp_path: Path) -> None:
    sheet = '[film]\nconcentration = "2 mmol/L"\nvolume = "40 µL"\npurity = 0.9\n'
    trace = _trace(tmp_path, "Area (cm^2),Pressure (mN/m)", [_RUN.area, _RUN.pressure], sheet)
    molecules = 40e-6 * 2e-3 * 0.9 * AVOGADRO
    assert trace.area == pytest.approx(_RUN.area * 1e14 / molecules, rel=1e-12)


def test_the_exports_own_area(tmp_path: Path) -> None:
    trace = _trace(
        tmp_path,
        "Area per molecule (Å²),Pressure (mN/m)",
        [_RUN.molecular_area * 100, _RUN.pressure],
    )
    assert trace.area == pytest.approx(_RUN.molecular_area)
    assert trace.area_relative_u is None
    assert trace.trough_area is None
    assert any("uncertainty of its scale is unknown" in w for w in trace.warnings)


def test_the_sheet_goes_before_the_exports_own_area_and_says_where_they_differ(
    tmp_path: Path,
) -> None:
    right = _RUN.area * 1e14 / _MOLECULES
    header = "Area (cm^2),Area per molecule (nm^2),Pressure (mN/m)"
    trace = _trace(tmp_path, header, [_RUN.area, right * 1.1, _RUN.pressure], _FILM)
    assert trace.area == pytest.approx(right)
    assert any("1.1 times" in w for w in trace.warnings)
    trace = _trace(tmp_path, header, [_RUN.area, right, _RUN.pressure], _FILM)
    assert not any("times the one" in w for w in trace.warnings)


def test_tension_becomes_pressure(tmp_path: Path) -> None:
    tension = 72.0 - _RUN.pressure
    header = "Area per molecule (nm^2),Surface tension (mN/m)"
    columns = [_RUN.molecular_area, tension]
    given = _trace(tmp_path, header, columns, '[subphase]\ntension = "72.0 ± 0.2 mN/m"')
    assert given.pressure == pytest.approx(_RUN.pressure)
    assert given.pressure_u == pytest.approx(0.2)
    warm = _trace(tmp_path, header, columns, '[subphase]\ntemperature = "37 ± 1 degC"')
    assert warm.pressure == pytest.approx(surface_tension(310.15) - tension)
    assert warm.kelvin == pytest.approx(310.15)
    # -dγ/dT of water near 37 °C is about 0.16 mN/m/K
    assert warm.pressure_u == pytest.approx(0.16, abs=0.01)
    assert any("pure water at 37.0 degC" in w for w in warm.warnings)
    recorded = _trace(
        tmp_path,
        header + ",Temperature (K)",
        [*columns, np.full(40, 298.15)],
        '[subphase]\ntemperature = "5 degC"',
    )
    assert recorded.pressure == pytest.approx(surface_tension(298.15) - tension)
    with pytest.raises(UpstrokeError, match="tension of 'glycerol'"):
        _trace(
            tmp_path, header, columns, '[subphase]\nliquid = "glycerol"\ntemperature = "20 degC"'
        )


def test_pressure_above_the_clean_tension_is_warned_of(tmp_path: Path) -> None:
    trace = _trace(
        tmp_path,
        "Area per molecule (nm^2),Pressure (mN/m)",
        [_RUN.molecular_area, _RUN.pressure * 2.0],
    )
    said = [w for w in trace.warnings if "above the tension of the clean subphase (72.7 mN/m" in w]
    assert len(said) == 1


def test_rows_are_sorted_by_time(tmp_path: Path) -> None:
    order = np.random.default_rng(5).permutation(40)
    trace = _trace(
        tmp_path,
        "Time (s),Area (cm^2),Pressure (mN/m)",
        [_RUN.time[order], _RUN.area[order], _RUN.pressure[order]],
        _FILM,
    )
    assert trace.trough_area is not None
    assert trace.trough_area.tolist() == _RUN.area.tolist()
    assert any("sorted by time" in w for w in trace.warnings)


def test_recordings_one_after_the_other_are_not_shuffled(tmp_path: Path) -> None:
    twice = [
        np.concatenate([_RUN.time, _RUN.time]),
        np.tile(_RUN.area, 2),
        np.tile(_RUN.pressure, 2),
    ]
    trace = _trace(tmp_path, "Time (s),Area (cm^2),Pressure (mN/m)", twice, _FILM)
    assert trace.trough_area is not None
    assert trace.trough_area.tolist() == twice[1].tolist()
    assert trace.time is not None
    assert np.all(np.diff(trace.time) > 0)
    assert any("time starts again 1 time" in w for w in trace.warnings)


def test_two_blocks_out_of_order_are_sorted(tmp_path: Path) -> None:
    order = np.r_[20:40, 0:20]
    trace = _trace(
        tmp_path,
        "Time (s),Area (cm^2),Pressure (mN/m)",
        [_RUN.time[order], _RUN.area[order], _RUN.pressure[order]],
        _FILM,
    )
    assert trace.trough_area is not None
    assert trace.trough_area.tolist() == _RUN.area.tolist()


def test_rows_that_lack_something_are_dropped_and_counted(tmp_path: Path) -> None:
    trace = read_trace(EXPORTS / "good" / "missing.csv", parse_sheet(_FILM))
    assert len(trace.area) == 33
    assert any("7 rows of 40" in w for w in trace.warnings)
    assert np.isfinite(trace.pressure).all()


def test_how_many_rows_are_needed(tmp_path: Path) -> None:
    header = "Area per molecule (nm^2),Pressure (mN/m)"
    enough = [_RUN.molecular_area[:FEWEST_ROWS], _RUN.pressure[:FEWEST_ROWS]]
    assert len(_trace(tmp_path, header, enough).area) == FEWEST_ROWS
    with pytest.raises(
        UpstrokeError, match=f"{FEWEST_ROWS - 1} usable rows.*at least {FEWEST_ROWS}"
    ):
        _trace(tmp_path, header, [column[:-1] for column in enough])


_WIDTH = '[trough]\nwidth = "75 mm"\n'


@pytest.mark.parametrize(
    ("header", "positions", "extra"),
    [
        ("Barrier position (mm)", lambda x: [x], ""),
        ("Left barrier (mm),Right barrier (mm)", lambda x: [-x / 2 + 7.0, x / 2 + 7.0], ""),
        ("Left barrier (mm),Right barrier (mm)", lambda x: [x / 2, x / 2], ""),
        ("Barrier position (cm)", lambda x: [(320.0 - x) / 10.0], 'largest_area = "240 cm^2"\n'),
        (
            "Barrier 1 (mm),Barrier 2 (mm)",
            lambda x: [(320.0 - x) / 2, (320.0 - x) / 2],
            'largest_area = "240 cm^2"\n',
        ),
    ],
)
def test_barrier_positions_become_area(
    tmp_path: Path, header: str, positions: object, extra: str
) -> None:
    # area = width × distance: 240 cm^2 at 320 mm of a trough 75 mm wide
    distance = _RUN.area * 100.0 / 75.0
    columns = [*positions(distance), _RUN.pressure]  # type: ignore[operator]
    trace = _trace(tmp_path, f"{header},Pressure (mN/m)", columns, _FILM + _WIDTH + extra)
    assert trace.trough_area == pytest.approx(_RUN.area)
    assert any("trough area is" in w for w in trace.warnings)


def test_barrier_positions_from_the_open_end_need_the_largest_area(tmp_path: Path) -> None:
    with pytest.raises(UpstrokeError, match="largest_area"):
        _trace(
            tmp_path,
            "Barrier position (mm),Pressure (mN/m)",
            [300.0 - _RUN.area, _RUN.pressure],
            _FILM + _WIDTH,
        )


def test_needs_beyond_area_and_pressure(tmp_path: Path) -> None:
    path = EXPORTS / "good" / "molecular.csv"
    with pytest.raises(UpstrokeError, match="known as time"):
        read_trace(path, needs=("time",))


def test_temperature_and_potential_come_along(tmp_path: Path) -> None:
    trace = _trace(
        tmp_path,
        "Area per molecule (nm^2),Pressure (mN/m),Temperature (degC),Surface potential (V)",
        [_RUN.molecular_area, _RUN.pressure, _RUN.temperature, _RUN.pressure / 100.0],
    )
    assert trace.temperature is not None
    assert trace.potential == pytest.approx(_RUN.pressure * 10.0)
    assert trace.kelvin == pytest.approx(float(np.median(_RUN.temperature)) + 273.15)


def test_a_long_run_reads_like_a_short_one(tmp_path: Path) -> None:
    """Adding a constant time, or a unit change, moves nothing."""
    base = _trace(
        tmp_path,
        "Time (s),Area (cm^2),Pressure (mN/m)",
        [_RUN.time, _RUN.area, _RUN.pressure],
        _FILM,
    )
    later = _trace(
        tmp_path,
        "Time (h),Area (m^2),Pressure (N/m)",
        [(_RUN.time + 7200.0) / 3600.0, _RUN.area / 1e4, _RUN.pressure / 1e3],
        _FILM,
    )
    assert later.area == pytest.approx(base.area, rel=1e-12)
    assert later.pressure == pytest.approx(base.pressure, rel=1e-12)


def test_the_exports_own_area_takes_its_uncertainty_from_the_sheet(tmp_path: Path) -> None:
    header = "Area per molecule (nm^2),Pressure (mN/m)"
    columns = [_RUN.molecular_area, _RUN.pressure]
    trace = _trace(tmp_path, header, columns, _FILM)
    assert trace.area.tolist() == _RUN.molecular_area.tolist()
    assert trace.area_relative_u == pytest.approx(math.hypot(0.01, 0.01))
    # amounts that do not suffice for a number of molecules leave it unknown
    assert _trace(tmp_path, header, columns, '[film]\nvolume = "50 µL"').area_relative_u is None


def test_trough_area_is_kept_beside_the_exports_own_area(tmp_path: Path) -> None:
    header = "Area (cm^2),Area per molecule (nm^2),Pressure (mN/m)"
    trace = _trace(tmp_path, header, [_RUN.area, _RUN.molecular_area, _RUN.pressure])
    assert trace.area.tolist() == _RUN.molecular_area.tolist()
    assert trace.trough_area is not None
    assert trace.trough_area.tolist() == _RUN.area.tolist()


def test_amounts_that_leave_no_room_for_a_molecule_are_warned_of(tmp_path: Path) -> None:
    sheet = _FILM.replace("50 ± 0.5 µL", "5 mL")
    trace = _trace(tmp_path, "Area (cm^2),Pressure (mN/m)", [_RUN.area, _RUN.pressure], sheet)
    assert any("no molecule lies on so little" in w for w in trace.warnings)


def test_a_time_column_without_times_is_left_aside(tmp_path: Path) -> None:
    trace = _trace(
        tmp_path,
        "Time (s),Area per molecule (nm^2),Pressure (mN/m)",
        [np.full(40, np.nan), _RUN.molecular_area, _RUN.pressure],
    )
    assert trace.time is None
    assert len(trace.area) == 40
    assert any("holds no time" in w for w in trace.warnings)


def test_barriers_beside_tension(tmp_path: Path) -> None:
    # positions that rise as the tension falls count from the open end
    with pytest.raises(UpstrokeError, match="largest_area"):
        _trace(
            tmp_path,
            "Barrier position (mm),Surface tension (mN/m)",
            [300.0 - _RUN.area, 72.0 - _RUN.pressure],
            _FILM + _WIDTH + '[subphase]\ntension = "72 mN/m"',
        )


def test_many_steps_back_are_rows_out_of_order_not_recordings(tmp_path: Path) -> None:
    # pairs of rows exchanged all along: far more steps back than a recorder starts again
    order = np.arange(320).reshape(-1, 2)[:, ::-1].ravel()
    time, area = np.arange(320) * 1.0, np.linspace(1.0, 0.3, 320)
    trace = _trace(
        tmp_path,
        "Time (s),Area per molecule (nm^2),Pressure (mN/m)",
        [time[order], area[order], (40.0 - 40.0 * area)[order]],
    )
    assert trace.time is not None
    assert trace.time.tolist() == time.tolist()
    assert trace.area.tolist() == area.tolist()
    assert any("160 rows were out of order" in w for w in trace.warnings)


def test_one_row_out_of_order_is_sorted(tmp_path: Path) -> None:
    order = np.r_[0:10, 11, 10, 12:40]
    trace = _trace(
        tmp_path,
        "Time (s),Area per molecule (nm^2),Pressure (mN/m)",
        [_RUN.time[order], _RUN.molecular_area[order], _RUN.pressure[order]],
    )
    assert trace.area.tolist() == _RUN.molecular_area.tolist()
    assert any("1 row was out of order" in w for w in trace.warnings)
