"""Film stability: finding holds, leaving settling out, loss and rate, what a user meets when it fails."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from isotherm.check_result import CheckResult
from isotherm.errors import UpstrokeError
from isotherm.hold import analyse_hold, planned_dipping_time, read_hold
from isotherm.hold_read import HoldRecord, hold_record
from isotherm.quantity import Quantity
from isotherm.sheet import Dipping, RunSheet, Stack, Subphase, Trough
from isotherm.source import Source
from isotherm.table import Table

HOUR = 3600.0


def table(**columns: np.ndarray) -> Table:
    n = len(next(iter(columns.values())))
    return Table(Source("hold.csv", "", n), dict(columns), np.arange(1, n + 1))


def held(
    *, law: str = "desorption", loss: float = 0.1, hours: float = 2.0, dt: float = 5.0, seed: int = 1,
    overshoot: float = 0.0,
) -> Table:  # fmt: skip
    """An isobaric hold at 30 mN/m after a compression, 100 cm^2 at the arrival."""
    rng = np.random.default_rng(seed)
    ramp = np.arange(0.0, 300.0, dt)
    t = np.arange(0.0, hours * HOUR, dt)
    share = {
        "constant": np.zeros_like(t),
        "desorption": np.sqrt(t / t[-1]),
        "dissolution": t / t[-1],
        "relaxation": -np.expm1(-t / (0.2 * t[-1])),
        "nucleation": -np.expm1(-math.log(2) * (t / (0.4 * t[-1])) ** 2.5),
    }[law]
    ringing = overshoot * np.exp(-t / 60.0) * np.cos(t / 30.0)
    area = np.concatenate(
        [160.0 - 0.2 * ramp, 100.0 * (1.0 - loss * share) * (1 - ringing / 150.0)]
    )
    pressure = np.concatenate([30.0 * (ramp / 300.0) ** 3, 30.0 + ringing])
    time = np.concatenate([ramp, 300.0 + t])
    return table(
        time=time,
        area=area + 0.01 * rng.normal(size=area.size),
        pressure=pressure + 0.03 * rng.normal(size=area.size),
    )


@pytest.mark.parametrize(
    "law", ["constant", "desorption", "dissolution", "relaxation", "nucleation"]
)
def test_each_law_is_recognised_and_its_loss_found(law: str) -> None:
    result = analyse_hold(hold_record(held(law=law), RunSheet()))
    (hold,) = result.holds
    assert hold.kind == "isobaric"
    assert hold.chosen == law
    assert hold.pressure.value == pytest.approx(30.0, abs=0.05)
    assert hold.from_s == pytest.approx(300.0, abs=15.0)
    truth = 0.0 if law == "constant" else 0.1 * (0.9933 if law == "relaxation" else 1.0)
    truth = 0.1 * -math.expm1(-math.log(2) * 2.5**2.5) if law == "nucleation" else truth
    assert hold.loss_hold.u is not None
    assert abs(hold.loss_hold.value - truth) < 4 * hold.loss_hold.u
    assert hold.loss_hold.u < 0.002
    assert sum(one.weight for one in hold.laws) == pytest.approx(1.0)
    assert [one.delta for one in hold.laws] == sorted(one.delta for one in hold.laws)


def test_settling_is_found_left_out_and_reported() -> None:
    calm = analyse_hold(hold_record(held(), RunSheet())).holds[0]
    ringing = analyse_hold(hold_record(held(overshoot=2.0), RunSheet())).holds[0]
    assert calm.settling_s == 0.0
    # 2 mN/m exp(-t/60 s) sinks to the 0.03 mN/m scatter after 250 s
    assert 150.0 < ringing.settling_s < 600.0
    assert ringing.blocks.time[0] > ringing.settling_s
    assert ringing.loss_hold.value == pytest.approx(0.1, abs=4 * (ringing.loss_hold.u or 0))


def test_several_pressures_in_one_file() -> None:
    first, second = held(law="dissolution"), held(law="relaxation", seed=2)
    gap = 2 * HOUR + 300.0
    area = np.concatenate([first.values["area"], second.values["area"] - 70.0])
    pressure = np.concatenate([first.values["pressure"], 30.0 + second.values["pressure"] / 3.0])
    time = np.concatenate([first.values["time"], second.values["time"] + gap])
    # the second compression starts where the first hold ended
    start = first.values["area"].size
    area[start : start + 60] = np.linspace(area[start - 1], area[start + 60], 60)
    record = hold_record(table(time=time, area=area, pressure=pressure), RunSheet())
    result = analyse_hold(record)
    assert [hold.number for hold in result.holds] == [1, 2]
    assert [round(hold.pressure.value) for hold in result.holds] == [30, 40]
    assert [hold.chosen for hold in result.holds] == ["dissolution", "relaxation"]


def isochoric(offset: float = 0.0, drift_per_hour: float = 0.0) -> Table:
    rng = np.random.default_rng(5)
    t = np.arange(0.0, 2 * HOUR, 4.0)
    pressure = 25.0 * (1.0 - 0.08 * t / t[-1]) + offset + drift_per_hour * t / HOUR
    return table(
        time=t,
        area=np.round(80.0 + 0.003 * rng.normal(size=t.size), 2),
        pressure=pressure + 0.02 * rng.normal(size=t.size),
    )


def test_a_stopped_barrier_is_an_isochoric_hold() -> None:
    (hold,) = analyse_hold(hold_record(isochoric(), RunSheet())).holds
    assert hold.kind == "isochoric"
    assert hold.chosen == "dissolution"
    assert hold.loss_hold.value == pytest.approx(0.08, abs=0.001)
    assert hold.start_level.unit == "mN/m"


def test_a_check_takes_zero_and_drift_out_and_leaves_their_uncertainty() -> None:
    checked = CheckResult(
        items=(),
        zero_offset=Quantity(1.5, 0.2, "mN/m"),
        drift_rate=Quantity(0.4, 0.05, "mN/m/h"),
    )
    record = hold_record(isochoric(1.5, 0.4), RunSheet())
    without = analyse_hold(record).holds[0].loss_hold
    hold = analyse_hold(record, check=checked).holds[0]
    assert abs(without.value - 0.08) > 0.02
    assert hold.loss_hold.value == pytest.approx(0.08, abs=0.001)
    # u(zero)/Pi0 of the loss, and u(drift) x time / Pi0
    expected = math.hypot(0.08 * 0.2 / 25.0, 0.05 * 2.0 / 25.0)
    assert hold.loss_hold.u_systematic == pytest.approx(expected, rel=0.02)


def test_probe_drift_widens_an_isobaric_loss_through_the_modulus() -> None:
    checked = CheckResult(items=(), drift_rate=Quantity(0.4, 0.3, "mN/m/h"))
    record = hold_record(held(), RunSheet())
    sheet = RunSheet(dipping=Dipping(modulus=Quantity(200.0, None, "mN/m")))
    hold = analyse_hold(record, sheet, check=checked).holds[0]
    assert hold.loss_hold.u_systematic == pytest.approx(0.5 * 2.0 / 200.0, rel=0.01)
    assert any("modulus" in text for text in analyse_hold(record, check=checked).warnings)


def test_rate_is_the_slope_of_the_logarithm() -> None:
    hold = analyse_hold(hold_record(held(law="dissolution"), RunSheet())).holds[0]
    t, step = 3000.0, 10.0
    low, high = (math.log(1.0 - hold.loss_over(t + s).value) for s in (-step, step))
    assert hold.rate_at(t).value == pytest.approx(-(high - low) / (2 * step), rel=1e-3)
    assert hold.rate_at(t).unit == "1/s"


def test_planned_time_beyond_the_record_is_said_to_be_extrapolated() -> None:
    result = analyse_hold(hold_record(held(hours=1.0), RunSheet()), planned_time=4 * HOUR)
    hold = result.holds[0]
    assert hold.loss_planned is not None
    assert any("extrapolates" in text for text in hold.warnings)
    assert (hold.loss_planned.u or 0) > (hold.loss_hold.u or 0)


def test_planned_time_from_the_sheet() -> None:
    sheet = RunSheet(
        dipping=Dipping(
            stroke_length=Quantity(30.0, None, "mm"),
            speed=Quantity(0.1, None, "mm/s"),
            dwell_top=Quantity(60.0, None, "s"),
            dwell_bottom=Quantity(20.0, None, "s"),
        ),
        stack=Stack(layers=10),
    )
    assert planned_dipping_time(sheet) == pytest.approx(10 * (300.0 + 40.0))
    assert planned_dipping_time(RunSheet()) is None
    assert planned_dipping_time(replace(sheet, stack=Stack())) is None


def test_scales_and_clock_do_not_matter() -> None:
    original = held(law="relaxation")
    plain = analyse_hold(hold_record(original, RunSheet())).holds[0]
    moved = table(
        time=original.values["time"] + 5e5,
        area=original.values["area"] * 37.0,
        pressure=original.values["pressure"],
    )
    other = analyse_hold(hold_record(moved, RunSheet())).holds[0]
    assert other.chosen == plain.chosen
    assert other.loss_hold.value == pytest.approx(plain.loss_hold.value, rel=1e-6)
    assert other.loss_hold.u == pytest.approx(plain.loss_hold.u, rel=1e-4)


def test_input_is_left_alone_and_answers_repeat() -> None:
    given = held()
    before = {role: values.copy() for role, values in given.values.items()}
    one = analyse_hold(hold_record(given, RunSheet())).to_json()
    two = analyse_hold(hold_record(given, RunSheet())).to_json()
    assert one == two
    assert all(np.array_equal(before[role], given.values[role]) for role in before)


def test_json_has_no_nan() -> None:
    out = analyse_hold(hold_record(held(), RunSheet()), planned_time=HOUR).to_json()
    text = json.dumps(out, allow_nan=False)
    back = json.loads(text)
    assert back["schema"] == "upstroke.hold/1"
    (hold,) = back["holds"]
    assert hold["model"] == "desorption"
    assert {model["name"] for model in hold["models"]} == {
        "constant", "desorption", "dissolution", "relaxation", "nucleation",
    }  # fmt: skip
    assert hold["loss_planned"]["u"] > 0


def test_missing_cells_spikes_and_repeated_times() -> None:
    given = held(law="dissolution")
    values = {role: column.copy() for role, column in given.values.items()}
    values["area"][100] = np.nan
    values["area"][500:505] += 40.0
    values["time"][700] = values["time"][699]
    hold = analyse_hold(hold_record(table(**values), RunSheet()))
    assert hold.holds[0].chosen == "dissolution"
    assert hold.holds[0].loss_hold.value == pytest.approx(0.1, abs=0.002)
    text = " ".join(hold.warnings)
    assert "missing cell" in text
    assert "repeats" in text


def test_tension_becomes_pressure() -> None:
    given = held()
    tension = 72.75 - given.values["pressure"]
    made = table(time=given.values["time"], area=given.values["area"], tension=tension)
    sheet = RunSheet(subphase=Subphase(temperature=Quantity(20.0, None, "degC")))
    hold = analyse_hold(hold_record(made, sheet)).holds[0]
    assert hold.pressure.value == pytest.approx(30.0, abs=0.1)
    with pytest.raises(UpstrokeError, match="clean subphase"):
        hold_record(made, RunSheet())


def test_area_offset_enters_u() -> None:
    sheet = RunSheet(trough=Trough(area_uncertainty=Quantity(2.0, None, "cm^2")))
    hold = analyse_hold(hold_record(held(), sheet), sheet).holds[0]
    assert hold.loss_hold.u_systematic == pytest.approx(0.1 * 2.0 / 100.0, rel=0.02)


def test_a_plain_compression_holds_nothing() -> None:
    n = 2000
    area = np.linspace(200.0, 50.0, n)
    pressure = np.interp(area, [50.0, 60.0, 90.0, 200.0], [50.0, 10.0, 9.5, 0.0])
    rng = np.random.default_rng(2)
    made = table(time=np.arange(n) * 1.0, area=area, pressure=pressure + 0.02 * rng.normal(size=n))
    with pytest.raises(UpstrokeError, match="no hold found"):
        hold_record(made, RunSheet())


@pytest.mark.parametrize("missing", ["time", "area", "pressure"])
def test_a_missing_column_is_named(missing: str) -> None:
    given = held()
    values = {role: column for role, column in given.values.items() if role != missing}
    with pytest.raises(UpstrokeError, match=missing):
        hold_record(table(**values), RunSheet())


def test_too_few_rows() -> None:
    given = held()
    values = {role: column[:20] for role, column in given.values.items()}
    with pytest.raises(UpstrokeError, match="too few"):
        hold_record(table(**values), RunSheet())


def test_reading_a_file(tmp_path: Path) -> None:
    given = held(law="dissolution", dt=20.0)
    path = tmp_path / "held.csv"
    rows = np.column_stack([given.values[r] for r in ("time", "area", "pressure")])
    lines = "\n".join(";".join(f"{x:.3f}" for x in row) for row in rows)
    path.write_text("Time (s);Trough area (cm2);Surface pressure (mN/m)\n" + lines + "\n")
    record = read_hold(path)
    assert isinstance(record, HoldRecord)
    assert record.area_unit == "cm^2"
    assert analyse_hold(record).holds[0].chosen == "dissolution"


@pytest.mark.parametrize(("swing", "period"), [(1.0, 100.0), (2.0, 60.0), (0.6, 900.0)])
def test_a_hunting_controller_does_not_break_the_hold_up(swing: float, period: float) -> None:
    given = held(law="dissolution")
    values = {role: column.copy() for role, column in given.values.items()}
    after = values["time"] >= 300.0
    clock = values["time"][after] - 300.0
    values["pressure"][after] += swing * np.sin(2.0 * np.pi * clock / period)
    (hold,) = analyse_hold(hold_record(table(**values), RunSheet())).holds
    assert hold.kind == "isobaric"
    assert hold.from_s == pytest.approx(300.0, abs=20.0)
    assert hold.duration_s == pytest.approx(2 * HOUR, abs=30.0)
    assert hold.loss_hold.value == pytest.approx(0.1, abs=0.001)


def test_no_more_than_all_of_the_film_is_lost() -> None:
    record = hold_record(held(law="dissolution", loss=0.5), RunSheet())
    hold = analyse_hold(record, planned_time=20 * HOUR).holds[0]
    assert hold.loss_planned is not None
    assert hold.loss_planned.value == pytest.approx(1.0)
    assert hold.rate_at(20 * HOUR).value == pytest.approx(0.0, abs=1e-12)
    assert math.isfinite(hold.rate_at(0.0).value)


def test_readings_without_scatter_still_have_an_uncertainty() -> None:
    t = np.arange(0.0, HOUR, 5.0)
    made = table(time=t, area=100.0 * (1.0 - 0.02 * t / HOUR), pressure=np.full(t.size, 30.0))
    hold = analyse_hold(hold_record(made, RunSheet())).holds[0]
    assert hold.chosen == "dissolution"
    assert hold.loss_hold.u is not None
    assert 1e-8 < hold.loss_hold.u < 1e-4


def test_fast_collapse_is_not_taken_for_a_compression() -> None:
    t = np.arange(0.0, 900.0, 1.0)
    ramp = np.arange(0.0, 500.0, 1.0)
    rng = np.random.default_rng(9)
    area = np.concatenate([150.0 - 0.1 * ramp, 100.0 * (1.0 - 0.4 * t / 900.0)])
    pressure = np.concatenate([45.0 * (ramp / 500.0) ** 2, np.full(t.size, 45.0)])
    made = table(
        time=np.arange(area.size, dtype=float),
        area=area + 0.02 * rng.normal(size=area.size),
        pressure=pressure + 0.03 * rng.normal(size=area.size),
    )
    (hold,) = analyse_hold(hold_record(made, RunSheet())).holds
    assert hold.loss_hold.value == pytest.approx(0.4, abs=0.005)


def test_other_liquids_need_their_own_tension() -> None:
    given = held()
    made = table(
        time=given.values["time"],
        area=given.values["area"],
        tension=63.0 - given.values["pressure"],
    )
    glycerol = Subphase(liquid="glycerol", temperature=Quantity(20.0, None, "degC"))
    with pytest.raises(UpstrokeError, match="glycerol"):
        hold_record(made, RunSheet(subphase=glycerol))
    told = replace(glycerol, tension=Quantity(63.0, 0.1, "mN/m"))
    hold = analyse_hold(hold_record(made, RunSheet(subphase=told))).holds[0]
    assert hold.pressure.value == pytest.approx(30.0, abs=0.1)


def test_unknown_drift_of_the_probe_is_said() -> None:
    record = hold_record(isochoric(), RunSheet())
    assert any("drift is not known" in text for text in analyse_hold(record).warnings)
    checked = CheckResult(items=(), drift_rate=Quantity(0.0, 0.05, "mN/m/h"))
    told = analyse_hold(record, check=checked).warnings
    assert not any("drift is not known" in text for text in told)
