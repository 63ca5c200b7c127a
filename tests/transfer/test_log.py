"""Bad and odd input: a clear line or a flag for each."""

from dataclasses import replace

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet, Substrate, Trough
from isotherm.source import Source
from isotherm.table import Table
from tests.transfer.dipping_example import sheet, y_build
from transfer.analysis import analyse_log
from transfer.log import log_from_table, read_log
from transfer.log_cleaning import clean_log


def shuffled(log, order):
    return replace(
        log,
        time=log.time[order],
        position=log.position[order],
        area=log.area[order],
        pressure=log.pressure[order],
    )


def ratios(result):
    return [s.ratio.value for s in result.strokes]


def test_position_that_never_crosses_the_surface():
    with pytest.raises(UpstrokeError, match="never carry the substrate through the surface"):
        analyse_log(y_build(2).log(), sheet(surface_at=60.0))


def test_dipper_that_never_moves():
    log = y_build(2).log()
    with pytest.raises(UpstrokeError, match="does not move"):
        analyse_log(replace(log, position=np.full(log.time.size, 12.0)), sheet())


def test_substrate_wider_than_the_trough():
    run_sheet = replace(sheet(), trough=Trough(width=Quantity(15.0, None, "mm")))
    with pytest.raises(UpstrokeError, match="as wide as the trough"):
        analyse_log(y_build(2).log(), run_sheet)


def test_missing_substrate_and_dimensions():
    with pytest.raises(UpstrokeError, match=r"no \[substrate\]"):
        analyse_log(y_build(2).log(), RunSheet())
    with pytest.raises(UpstrokeError, match=r"substrate\.width is missing"):
        analyse_log(y_build(2).log(), RunSheet(substrate=Substrate()))


def test_missing_pressure_column():
    log = y_build(2).log()
    table = Table(
        Source("run.csv", "", log.time.size),
        {"time": log.time, "dipper_position": log.position, "area": log.area},
        np.arange(log.time.size),
    )
    with pytest.raises(UpstrokeError, match="no column gives the surface pressure"):
        log_from_table(table, sheet())


def test_pressure_column_of_nothing():
    log = y_build(2).log()
    with pytest.raises(UpstrokeError, match="pressure holds no number"):
        analyse_log(replace(log, pressure=np.full(log.time.size, np.nan)), sheet())


def test_clock_that_jumps_back_runs_through_and_is_said():
    log = y_build(4).log()
    time = log.time.copy()
    time[400:] -= 300.0
    result = analyse_log(replace(log, time=time), sheet())
    assert any("clock jumps back" in w for w in result.warnings)
    assert ratios(result) == pytest.approx(ratios(analyse_log(log, sheet())), abs=0.003)


def test_duplicate_rows_are_dropped_and_said():
    log = y_build(4).log()
    order = np.sort(np.concatenate([np.arange(log.time.size), np.arange(100, 140)]))
    result = analyse_log(shuffled(log, order), sheet())
    assert any("40 repeated rows" in w for w in result.warnings)
    assert ratios(result) == pytest.approx(ratios(analyse_log(log, sheet())), abs=1e-9)


def test_rows_out_of_order_are_sorted_and_said():
    log = y_build(4).log()
    order = np.random.default_rng(3).permutation(log.time.size)
    result = analyse_log(shuffled(log, order), sheet())
    assert any("out of order" in w for w in result.warnings)
    assert ratios(result) == pytest.approx(ratios(analyse_log(log, sheet())), abs=1e-9)


def test_parts_in_the_wrong_order_are_put_right():
    log = y_build(4).log()
    half = log.time.size // 2
    order = np.concatenate([np.arange(half, log.time.size), np.arange(half)])
    result = analyse_log(shuffled(log, order), sheet())
    assert any("wrong order" in w for w in result.warnings)
    assert ratios(result) == pytest.approx(ratios(analyse_log(log, sheet())), abs=1e-9)


def test_whole_second_stamps_are_spread():
    log = y_build(2, rate=4.0).log()
    cleaned = clean_log(replace(log, time=np.floor(log.time)))
    assert (np.diff(cleaned.time) > 0).all()
    assert any("share a time stamp" in w for w in cleaned.warnings)


def test_missing_cells_are_counted_and_dropped():
    log = y_build(4).log()
    area = log.area.copy()
    area[10:17] = np.nan
    result = analyse_log(replace(log, area=area), sheet())
    assert any("7 rows with a missing cell" in w for w in result.warnings)
    assert len(result.strokes) == 4


@pytest.mark.parametrize("factor", [100.0, 0.01])
def test_area_in_the_wrong_unit_is_said(factor):
    log = y_build(4).log()
    result = analyse_log(replace(log, area=log.area * factor), sheet())
    assert any("check the units of the area column" in w for w in result.warnings)


def test_too_few_rows():
    log = y_build(2).log()
    with pytest.raises(UpstrokeError, match="at least"):
        analyse_log(shuffled(log, np.arange(5)), sheet())


def test_read_from_a_file(tmp_path):
    log = y_build(2).log()
    path = tmp_path / "run.csv"
    rows = ["Time (s),Dipper position (mm),Trough area (cm^2),Surface pressure (mN/m)"]
    for row in zip(log.time, log.position, log.area, log.pressure, strict=True):
        rows.append(",".join(f"{v:.4f}" for v in row))
    path.write_text("\n".join(rows) + "\n")
    read = read_log(path, sheet())
    assert read.source.rows == log.time.size
    found = analyse_log(read, sheet())
    assert ratios(found) == pytest.approx(ratios(analyse_log(log, sheet())), abs=1e-4)
