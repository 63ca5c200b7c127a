"""The check before spreading: zero, drift and rise told apart, plate and barriers judged, JSON both ways."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from isotherm.check import check_records, load_check, read_check
from isotherm.check_barrier import check_barrier
from isotherm.check_plate import two_point_calibration, wilhelmy_tension
from isotherm.check_record import bare_record
from isotherm.check_result import CheckItem, CheckResult, verdict_of
from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.sheet import Check, RunSheet, Subphase, Trough
from isotherm.source import Source
from isotherm.table import Table

ZERO, HINGE = 0.15, 110.0


def table(path: str = "bare.csv", **columns: np.ndarray) -> Table:
    n = len(next(iter(columns.values())))
    return Table(Source(path, "", n), dict(columns), np.arange(1, n + 1))


def bare(mode: str, rise: float, drift: float, seed: int = 0, role: str = "pressure") -> Table:
    """50 min of a bare surface: "still", "ramp" (closing) or "cycle" (closing and opening)."""
    rng = np.random.default_rng(seed)
    t = np.arange(3000.0)
    area = {
        "still": np.full(t.size, 200.0),
        "ramp": np.linspace(240.0, 60.0, t.size),
        "cycle": 240.0 - 180.0 * (1.0 - np.abs(2.0 * t / t[-1] - 1.0)),
    }[mode]
    packed = np.maximum(HINGE - area, 0.0) / (HINGE - 60.0)
    pressure = ZERO + drift * t / 3600.0 + rise * packed + 0.02 * rng.normal(size=t.size)
    values = pressure if role == "pressure" else 72.74 - pressure
    return table(f"{mode}.csv", time=t, area=area, **{role: values})


def item(result: CheckResult, name: str) -> CheckItem:
    return next(one for one in result.items if one.name == name)


def within(found: Quantity | None, truth: float, sigmas: float = 4.0) -> bool:
    assert found is not None
    assert found.u is not None
    return abs(found.value - truth) < sigmas * found.u


def test_rise_drift_and_zero_are_told_apart_out_and_back() -> None:
    result = check_records([bare("cycle", 0.5, 0.3)])
    rise = item(result, "pressure rise")
    assert within(rise.value, 0.5)
    assert rise.value.u is not None
    assert rise.value.u < 0.03
    assert rise.verdict == "fail"
    assert within(result.drift_rate, 0.3)
    assert within(result.zero_offset, ZERO)
    assert result.curves[0].hinge is not None
    assert within(result.curves[0].hinge, HINGE)
    assert "begins at" in rise.note
    assert result.verdict == "fail"


def test_a_clean_steady_surface_passes() -> None:
    result = check_records([bare("cycle", 0.0, 0.0), bare("still", 0.0, 0.05, seed=1)])
    assert item(result, "pressure rise").verdict == "pass"
    assert item(result, "drift").verdict == "pass"
    assert item(result, "drift").note == "barriers still"
    assert result.verdict == "pass"
    assert result.curves[0].hinge is None
    assert within(result.drift_rate, 0.05)


def test_one_compression_cannot_tell_drift_from_rise_and_says_so() -> None:
    result = check_records([bare("ramp", 0.0, 0.6)])
    rise = item(result, "pressure rise")
    assert within(rise.value, 0.6 * 3000.0 / 3600.0)
    assert "not told apart" in rise.note
    assert result.drift_rate is None
    assert any("drift" in text for text in result.warnings)


def test_limits_come_from_the_sheet_when_given() -> None:
    sheet = RunSheet(check=Check(pressure_rise=Quantity(1.0, None, "mN/m")))
    rise = item(check_records([bare("cycle", 0.5, 0.0)], sheet), "pressure rise")
    assert (rise.verdict, rise.limit, rise.limit_from) == ("pass", 1.0, "run sheet")
    usual = item(check_records([bare("cycle", 0.5, 0.0)]), "pressure rise")
    assert (usual.limit, usual.limit_from) == (0.2, "common practice")


@pytest.mark.parametrize(
    ("value", "u", "verdict"),
    [(0.1, 0.04, "pass"), (-0.1, 0.04, "pass"), (0.1, 0.06, "undecided"), (0.3, 0.06, "undecided"),
     (0.4, 0.06, "fail"), (-0.4, 0.06, "fail"), (0.1, None, "undecided"), (0.4, None, "fail")],
)  # fmt: skip
def test_verdict_keeps_the_uncertainty_out_of_the_limit(
    value: float, u: float | None, verdict: str
) -> None:
    assert verdict_of(Quantity(value, u, "mN/m"), 0.2) == verdict


def test_tension_record_gives_the_clean_tension() -> None:
    sheet = RunSheet(subphase=Subphase(temperature=Quantity(20.0, 0.2, "degC")))
    result = check_records([bare("cycle", 0.0, 0.0, role="tension")], sheet)
    found = item(result, "recorded tension less water's")
    assert found.value.value == pytest.approx(-ZERO, abs=0.02)
    assert found.verdict == "pass"


def test_other_liquids_are_not_compared_with_water() -> None:
    sheet = RunSheet(
        subphase=Subphase(
            temperature=Quantity(20.0, None, "degC"),
            tension=Quantity(72.0, 0.1, "mN/m"),
            additives=("1 mol/L NaCl",),
        )
    )
    found = item(check_records([], sheet), "clean subphase tension")
    assert found.verdict == ""
    assert "not compared" in found.note


def test_plate_and_calibration_items() -> None:
    sheet = RunSheet(
        subphase=Subphase(temperature=Quantity(20.0, 0.2, "degC")),
        check=Check(
            force=Quantity(2.80, 0.001, "mN"),
            perimeter=Quantity(40.2, 0.01, "mm"),
            low_reading=Quantity(0.0, 0.01, "mN/m"),
            low_true=Quantity(0.0, None, "mN/m"),
            high_reading=Quantity(70.0, 0.05, "mN/m"),
            high_true=Quantity(72.7, 0.05, "mN/m"),
        ),
    )
    result = check_records([], sheet)
    assert item(result, "tension by the plate less water's").verdict == "fail"
    gain = item(result, "probe gain less 1")
    assert gain.value.value == pytest.approx(72.7 / 70.0 - 1.0)
    assert gain.verdict == "fail"


def test_plate_refuses_the_impossible() -> None:
    with pytest.raises(UpstrokeError, match="no tension"):
        wilhelmy_tension(Quantity(-1.0, None, "mN"), Quantity(40.0, None, "mm"))
    one = Quantity(1.0, None, "mN/m")
    with pytest.raises(UpstrokeError, match="same"):
        two_point_calibration(one, one, one, one)


def barrier(bend: float, width: float = 75.0) -> Table:
    """Two barriers on one scale that close on each other; the area departs by `bend` of its range."""
    rng = np.random.default_rng(1)
    travel = np.linspace(0.0, 100.0, 400)
    area = width * (240.0 - 2.0 * travel) / 100.0
    area = area + bend * np.ptp(area) * (1.0 - (travel / 50.0 - 1.0) ** 2)
    position = np.stack([travel, 240.0 - travel], axis=1)
    return table(barrier_position=position, area=area + 0.01 * rng.normal(size=travel.size))


def test_barrier_travel_against_area() -> None:
    straight = check_barrier(barrier(0.0))
    assert straight is not None
    assert abs(straight.departure.value) < 1e-3
    assert straight.width.value == pytest.approx(75.0, abs=0.05)
    result = check_records(
        [barrier(0.03)], RunSheet(trough=Trough(width=Quantity(80.0, 0.1, "mm")))
    )
    assert item(result, "area against barrier travel").verdict == "fail"
    assert item(result, "trough width ratio less 1").verdict == "fail"
    assert check_barrier(bare("still", 0.0, 0.0)) is None


def test_records_without_time_still_give_zero_and_rise() -> None:
    given = bare("ramp", 0.4, 0.0)
    made = table(area=given.values["area"], pressure=given.values["pressure"])
    result = check_records([made])
    assert within(item(result, "pressure rise").value, 0.4)
    assert result.drift_rate is None


def test_json_goes_out_and_comes_back(tmp_path: Path) -> None:
    result = check_records([bare("cycle", 0.3, 0.1)])
    path = tmp_path / "check.json"
    path.write_text(json.dumps(result.to_json(), allow_nan=False), encoding="utf-8")
    back = load_check(path)
    assert back.zero_offset == result.zero_offset
    assert back.drift_rate == result.drift_rate
    assert back.items == result.items
    assert back.warnings == result.warnings
    assert back.verdict == result.verdict
    assert back.path == str(path)


@pytest.mark.parametrize(
    "text",
    ["", "{", "[]", '{"schema": "upstroke.hold/1"}',
     '{"schema": "upstroke.check/1", "zero_offset": {"value": "x", "unit": "mN/m"}}',
     '{"schema": "upstroke.check/1", "zero_offset": {"value": 1, "u": -1, "unit": "mN/m"}}',
     '{"schema": "upstroke.check/1", "drift_rate": {"value": 1, "u": 1, "unit": "mN/m"}}',
     '{"schema": "upstroke.check/1", "drift_rate": 3}',
     '{"schema": "upstroke.check/1", "items": 3}',
     '{"schema": "upstroke.check/1", "items": [3]}'],
)  # fmt: skip
def test_loading_refuses_what_is_not_a_check(tmp_path: Path, text: str) -> None:
    path = tmp_path / "other.json"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(UpstrokeError, match="check"):
        load_check(path)


def test_nothing_to_check() -> None:
    with pytest.raises(UpstrokeError, match="nothing to check"):
        check_records([])
    with pytest.raises(UpstrokeError, match="neither pressure"):
        check_records([table(time=np.arange(50.0), area=np.arange(50.0))])
    with pytest.raises(UpstrokeError, match="too few"):
        check_records([table(time=np.arange(5.0), pressure=np.zeros(5))])
    with pytest.raises(UpstrokeError, match="no such file"):
        load_check("no-such-file.json")


def test_reading_files(tmp_path: Path) -> None:
    given = bare("cycle", 0.0, 0.0)
    path = tmp_path / "bare.txt"
    rows = np.column_stack([given.values[r] for r in ("time", "area", "pressure")])
    lines = "\n".join("\t".join(f"{x:.3f}" for x in row) for row in rows)
    path.write_text("Time (s)\tTrough area (cm2)\tSurface pressure (mN/m)\n" + lines + "\n")
    assert read_check([path]).verdict == "pass"


def test_a_record_finds_its_area_where_the_export_has_it() -> None:
    position = np.linspace(0.0, 120.0, 400)  # mm, in from the open end
    pressure = np.random.default_rng(2).normal(0.1, 0.02, 400)
    time = np.arange(400.0)
    barrier = table(time=time, barrier_position=position, pressure=pressure)
    unknown = bare_record(barrier, RunSheet())
    assert unknown.area is None
    assert any("without [trough] width" in text for text in unknown.warnings)
    trough = Trough(width=Quantity(75.0, None, "mm"), largest_area=Quantity(240.0, None, "cm^2"))
    known = bare_record(barrier, RunSheet(trough=trough))
    assert known.area is not None
    assert known.area_unit == "cm^2"
    # pressure does not say which way the barriers count, so position x width is the area: 7.5 cm x 12 cm
    assert np.ptp(known.area) == pytest.approx(90.0, abs=2.0)
    each = bare_record(
        table(time=time, molecular_area=position + 1.0, pressure=pressure), RunSheet()
    )
    assert each.area_unit == "nm^2"


def test_rows_of_a_bare_record_are_put_in_order_and_glitches_left_out() -> None:
    time = np.arange(400.0)
    pressure = np.random.default_rng(3).normal(0.1, 0.02, 400)
    area = np.linspace(240.0, 60.0, 400)
    usual = bare_record(table(time=time, area=area, pressure=pressure), RunSheet())
    turned = np.r_[200:400, 0:200]
    mixed = table(time=time[turned], area=area[turned], pressure=pressure[turned])
    again = bare_record(mixed, RunSheet())
    np.testing.assert_array_equal(again.pressure, usual.pressure)
    np.testing.assert_array_equal(again.area, usual.area)
    assert any("order" in text for text in again.warnings)
    wild = pressure.copy()
    wild[100] = 40.0
    cleaned = bare_record(table(time=time, area=area, pressure=wild), RunSheet())
    assert cleaned.pressure.max() < 1.0
    assert "1 rows far off their neighbours left out" in cleaned.warnings
