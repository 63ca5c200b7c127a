"""What tests/fuzz_commands.py found, kept; and a small slice of it at every run."""

from __future__ import annotations

import random
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from hostile_runs import Run, damaged, seed_runs

sys.path.append(str(Path(__file__).resolve().parents[1]))
from fuzz_commands import Bench

SOUND = {run.command: run for run in seed_runs()}


def outcome(run: Run, folder: Path, more: tuple[str, ...] = ()) -> str:
    found = Bench(folder).attempt(run, more=more)
    assert found in ("done", "refused", "usage"), found
    return found


def with_column(command: str, column: int, values: np.ndarray) -> Run:
    run = SOUND[command]
    name = list(run.columns)[column]
    return replace(run, columns={**run.columns, name: values.tolist()})


@pytest.fixture(autouse=True)
def _faults_show(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("UPSTROKE_DEBUG", "1")


@pytest.mark.parametrize("command", sorted(SOUND))
def test_the_sound_run_is_done(command: str, tmp_path: Path) -> None:
    assert outcome(SOUND[command], tmp_path) == "done"


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("command", sorted(SOUND))
def test_damaged_runs(
    command: str, seed: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    rng = random.Random(f"{command} {seed}")
    monkeypatch.chdir(tmp_path)
    for more in ((), (), ("--force",), ("--csv", "out.csv", "--report", "out.html", "--force")):
        run = damaged(SOUND[command], rng)
        outcome(run, tmp_path, () if command == "evidence" else more)


@pytest.mark.parametrize("command", sorted(set(SOUND) - {"evidence"}))
def test_the_printed_table_fits_80_columns(command: str, tmp_path: Path) -> None:
    """Bench refuses longer lines, but for those that hold a path; with damage of every kind."""
    rng = random.Random(f"table of {command}")
    for _ in range(6):
        outcome(damaged(SOUND[command], rng), tmp_path, ("--force",))


@pytest.mark.parametrize("command", sorted(SOUND))
@pytest.mark.parametrize("factor", [1e9, 1e200, -1.0])
def test_columns_of_absurd_size(command: str, factor: float, tmp_path: Path) -> None:
    for column, values in enumerate(SOUND[command].columns.values()):
        outcome(with_column(command, column, np.array(values) * factor), tmp_path)


def test_an_input_that_takes_too_long_is_a_finding(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("fuzz_commands.SLOW", 0.01)
    found = Bench(tmp_path).attempt(SOUND["isotherm"])
    assert "took longer than 0.01 s" in found
    assert "in _command" in found  # with the place it was stopped in


def test_one_row_an_age_before_the_others(tmp_path: Path) -> None:
    """A film followed through the creep of a dwell to that moment is larger than any number."""
    time = np.array(SOUND["transfer"].columns["Time (s)"])
    time[164] = -1e12
    outcome(with_column("transfer", 0, time), tmp_path)


@pytest.mark.parametrize("row", [0, 60, 149])
def test_a_hold_with_one_row_of_another_age(row: int, tmp_path: Path) -> None:
    from isotherm.hold_read import read_hold

    time = np.array(SOUND["hold"].columns["t (s)"])
    time[row] = -1e12 if row else 1e15
    assert outcome(with_column("hold", 0, time), tmp_path) == "done"
    record = read_hold(tmp_path / "run.csv")
    assert record.time.size == 149
    assert any("1 row whose time stands apart" in warning for warning in record.warnings)


def test_a_hold_at_pressures_no_film_has(tmp_path: Path) -> None:
    pressure = np.random.default_rng(1).normal(0.0, 3000.0, 150)
    assert outcome(with_column("hold", 2, pressure), tmp_path) == "refused"


def test_a_hold_of_negative_area(tmp_path: Path) -> None:
    area = np.array(SOUND["hold"].columns["A (cm^2)"]) - 110.0
    assert outcome(with_column("hold", 1, area), tmp_path) == "refused"


@pytest.mark.parametrize("still", [slice(0, 200), slice(100, 300), slice(0, 400)])
def test_waves_while_the_clock_stands_still(still: slice, tmp_path: Path) -> None:
    time = np.array(SOUND["oscillation"].columns["Time (s)"])
    time[still] = time[still][0]
    outcome(with_column("oscillation", 0, time), tmp_path)


@pytest.mark.parametrize("command", ["isotherm", "replicates"])
def test_areas_next_to_nothing_are_none(command: str, tmp_path: Path) -> None:
    column = list(SOUND[command].columns).index(
        next(name for name in SOUND[command].columns if name.startswith("Area"))
    )
    area = np.array(list(SOUND[command].columns.values())[column])
    area[100:103] = 1e-300
    assert outcome(with_column(command, column, area), tmp_path) == "refused"


def test_a_mixture_that_jumps_over_a_pressure(tmp_path: Path) -> None:
    """A run that reaches 5 mN/m in a gap of its readings has no area there; the other pressures stand."""
    rng = random.Random("table of mixture")
    for _ in range(5):
        run = damaged(SOUND["mixture"], rng)
    assert outcome(run, tmp_path) == "done"


def test_a_film_that_is_gone_at_once(tmp_path: Path) -> None:
    """Areas of 1e-300 cm^2, whose squares are no numbers."""
    time = np.array(SOUND["transfer"].columns["Time (s)"])
    outcome(with_column("transfer", 2, 200.0 * np.exp(-1.5 * (time % 1000.0))), tmp_path)


@pytest.mark.parametrize("command", ["check", "hold", "transfer"])
def test_a_clock_that_stands_still(command: str, tmp_path: Path) -> None:
    rows = len(next(iter(SOUND[command].columns.values())))
    assert outcome(with_column(command, 0, np.full(rows, 7.0)), tmp_path) in ("done", "refused")


def test_a_bare_record_of_negative_area_that_stands_still(tmp_path: Path) -> None:
    outcome(with_column("check", 1, np.full(90, -5.0)), tmp_path)


def test_a_bare_record_in_a_few_steps(tmp_path: Path) -> None:
    outcome(with_column("check", 1, np.repeat([240.0, 150.0, 60.0], 30)), tmp_path)


def test_fill_values_are_missing_and_named(tmp_path: Path) -> None:
    from isotherm.table import read_table

    run = SOUND["isotherm"]
    pressure = np.array(run.columns["Pressure (mN/m)"])
    pressure[[10, 20]] = 9.96921e36
    path = tmp_path / "fill.csv"
    path.write_text(with_column("isotherm", 2, pressure).text())
    table = read_table(path)
    assert np.flatnonzero(np.isnan(table.values["pressure"])).tolist() == [10, 20]
    (warning,) = [w for w in table.warnings if "beyond anything" in w]
    assert "2 cells" in warning
    assert "line 12" in warning


def test_a_time_in_nanoseconds_is_not_beyond_reach(tmp_path: Path) -> None:
    from isotherm.table import read_table

    run = SOUND["hold"]
    time = 1.9e18 + np.array(run.columns["t (s)"]) * 1e15
    path = tmp_path / "late.csv"
    path.write_text(with_column("hold", 0, time).text())
    assert np.isfinite(read_table(path).values["time"]).all()
