"""The same run in another dress gives the same numbers, within their uncertainty."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hostile_runs import seed_runs
from numpy.typing import NDArray
from property_runs import agree, numbers_of, write_export

from isotherm.analysis import analyse
from isotherm.check import read_check
from isotherm.cycles import analyse_cycles
from isotherm.fluid import analyse_fluid
from isotherm.hold import analyse_hold
from isotherm.hold_read import read_hold
from isotherm.oscillation import analyse_oscillation
from isotherm.potential import analyse_potential
from isotherm.sheet_read import parse_sheet
from isotherm.trace_read import read_trace
from transfer.analysis import analyse_log
from transfer.log import read_log
from transfer.target import choose_target

FloatArray = NDArray[np.float64]
Columns = dict[str, FloatArray]

FILM = """
[film]
molar_mass = "284.48 g/mol"
concentration = "1.00 mg/mL"
volume = "{volume} µL"
[subphase]
temperature = "20.0 degC"
[trough]
area_uncertainty = "{area_u} cm^2"
pressure_uncertainty = "0.1 mN/m"
"""
BUILD = """
[substrate]
shape = "plate"
width = "20.0 ± 0.1 mm"
thickness = "1.00 ± 0.02 mm"
[dipping]
pressure = "30 mN/m"
tolerance = "0.2 mN/m"
position_reads = "{reads}"
surface_at = "{surface} ± 0.05 mm"
modulus = "200 ± 10 mN/m"
"""
TARGET = """
[target]
collapse_margin = "5 mN/m"
guard_band = "2 mN/m"
"""
# What each kind's result must hold for a comparison to say anything.
FINDINGS = (
    "branches", "holds", "strokes", "items", "cycles", "segments", "whole_branch", "onset", "limits",
)  # fmt: skip
DRESSES: dict[str, dict[str, Any]] = {
    "semicolons and decimal commas": {"separator": ";", "decimal": ","},
    "tabs": {"separator": "\t"},
    "UTF-16": {"encoding": "utf-16"},
    "blanks": {"separator": "  "},
}


def film_run() -> Columns:
    """An acid: gaseous, a condensed phase, a solid one, collapse; 900 rows."""
    random = np.random.default_rng(2)
    area = np.linspace(160.0, 88.0, 900)  # cm^2
    each = area / 529.21  # nm^2
    pressure = 500.0 * np.clip(0.25 - each, 0.0, None) + 3500.0 * np.clip(0.20 - each, 0.0, None)
    pressure = np.minimum(pressure, 52.0) + random.normal(0.0, 0.05, area.size)
    return {"time": np.arange(900) * 2.0, "area": area, "pressure": pressure}


def hold_run() -> Columns:
    random = np.random.default_rng(5)
    time = np.arange(400) * 10.0
    area = 110.0 * (1.0 - 4e-4 * np.sqrt(time)) + random.normal(0.0, 0.02, time.size)
    return {"time": time, "area": area, "pressure": 30.0 + random.normal(0.0, 0.05, time.size)}


def build_run() -> Columns:
    """Four strokes of a plate, ratios 1.00, 0.95, 0.90 and 0.97."""
    random = np.random.default_rng(4)
    turns = [25.0, 2.0, 25.0, 2.0, 25.0]
    time, position = [0.0], [turns[0]]
    for before, after in zip(turns, [*turns[1:], turns[-1]], strict=True):
        time += [time[-1] + 120.0, time[-1] + 120.0 + abs(after - before) / 0.2 + 1e-6]
        position += [before, after]
    grid = np.arange(0.0, time[-1], 1.0)
    depth = np.interp(grid, time, position)
    wet = 4.2 * np.clip(depth - 5.0, 0.0, None) / 10.0 + 0.2 * (depth > 5.0)
    number = np.clip(np.searchsorted(np.array(time[2::2]), grid), 0, 3)
    ratio = np.array([1.0, 0.95, 0.90, 0.97])[number]
    area = 200.0 - np.cumsum(ratio * np.abs(np.diff(wet, prepend=wet[0])))
    area *= np.exp(-2e-6 * grid)
    return {
        "time": grid,
        "dipper position": depth + random.normal(0.0, 0.002, grid.size),
        "area": area + random.normal(0.0, 0.01, grid.size),
        "pressure": 30.0 + random.normal(0.0, 0.03, grid.size),
    }


def seed_run(command: str) -> Columns:
    """One of the small runs of all commands, with a time where it has none."""
    run = next(each for each in seed_runs() if each.command == command)
    columns = {name.partition(" (")[0].lower(): np.array(v) for name, v in run.columns.items()}
    rows = len(next(iter(columns.values())))
    named = {name.replace("surface ", ""): values for name, values in columns.items()}
    return {"time": np.arange(rows) * 2.0, **named}


UNITS = {
    "time": "s",
    "area": "cm^2",
    "pressure": "mN/m",
    "dipper position": "mm",
    "potential": "mV",
}
RUNS: dict[str, Callable[[], Columns]] = {
    "isotherm": film_run,
    "target": film_run,
    "hold": hold_run,
    "transfer": build_run,
    **{
        command: partial(seed_run, command)
        for command in ("check", "cycles", "fluid", "oscillation", "potential")
    },
}


def headed(columns: Columns, units: dict[str, str] = UNITS) -> Columns:
    return {f"{name} ({units[name]})": values for name, values in columns.items()}


def numbers(kind: str, path: Path, **sheet: Any) -> dict[str, Any]:
    """What the analysis says of an export, in its JSON form."""
    if kind == "transfer":
        run_sheet = parse_sheet(BUILD.format(**({"reads": "depth", "surface": 5.0} | sheet)))
        return numbers_of(analyse_log(read_log(path, run_sheet), run_sheet).to_json())
    text = FILM.format(**({"volume": 25.0, "area_u": 0.3} | sheet))
    run_sheet = parse_sheet(text)
    if kind == "hold":
        return numbers_of(analyse_hold(read_hold(path, run_sheet), run_sheet).to_json())
    if kind == "check":
        found = numbers_of(read_check([path], run_sheet).to_json())
        items = [{k: v for k, v in item.items() if k != "record"} for item in found.pop("items")]
        return {**found, "items": items}
    if kind == "cycles":
        return numbers_of(analyse_cycles(read_trace(path, run_sheet)).to_json())
    if kind == "oscillation":
        return numbers_of(analyse_oscillation(read_trace(path, run_sheet)).to_json())
    trace = read_trace(path, run_sheet)
    film = analyse(trace)
    if kind == "fluid":
        return numbers_of(analyse_fluid(trace, film).to_json())
    if kind == "potential":
        return numbers_of(analyse_potential(film).to_json())
    if kind == "target":
        return numbers_of(choose_target(film, parse_sheet(text + TARGET)).to_json())
    return numbers_of(film.to_json())


@pytest.fixture(params=sorted(RUNS))
def kind(request: pytest.FixtureRequest) -> str:
    return str(request.param)


@pytest.fixture
def usual(kind: str, tmp_path: Path) -> dict[str, Any]:
    out = numbers(kind, write_export(tmp_path / "usual.csv", headed(RUNS[kind]())))
    assert any(out.get(name) for name in FINDINGS)
    return out


@pytest.mark.parametrize("dress", sorted(DRESSES))
def test_file_format(kind: str, usual: dict[str, Any], dress: str, tmp_path: Path) -> None:
    path = write_export(tmp_path / "dressed.txt", headed(RUNS[kind]()), **DRESSES[dress])
    assert numbers(kind, path) == usual


def test_units(kind: str, usual: dict[str, Any], tmp_path: Path) -> None:
    factors = {
        "time": ("min", 1 / 60),
        "area": ("mm^2", 100.0),
        "pressure": ("N/m", 1e-3),
        "dipper position": ("cm", 0.1),
        "potential": ("V", 1e-3),
    }
    columns = {
        f"{name} ({factors[name][0]})": values * factors[name][1]
        for name, values in RUNS[kind]().items()
    }
    path = write_export(tmp_path / "units.csv", columns, digits=17)
    assert agree(usual, numbers(kind, path), within=0.2) == []


def test_rows_in_any_order_of_a_time_column(
    kind: str, usual: dict[str, Any], tmp_path: Path
) -> None:
    columns = headed(RUNS[kind]())
    order = np.random.default_rng(3).permutation(len(next(iter(columns.values()))))
    path = write_export(tmp_path / "mixed.csv", {k: v[order] for k, v in columns.items()})
    assert numbers(kind, path) == usual


def test_columns_in_any_order(kind: str, usual: dict[str, Any], tmp_path: Path) -> None:
    columns = headed(RUNS[kind]())
    path = write_export(tmp_path / "turned.csv", dict(reversed(columns.items())))
    assert numbers(kind, path) == usual


def test_a_clock_started_elsewhere(kind: str, usual: dict[str, Any], tmp_path: Path) -> None:
    columns = RUNS[kind]()
    columns["time"] = columns["time"] + 86_400.0
    path = write_export(tmp_path / "later.csv", headed(columns))
    assert agree(usual, numbers(kind, path), within=0.2) == []


def test_one_run_in_two_files(kind: str, usual: dict[str, Any], tmp_path: Path) -> None:
    """Two parts of one run are one run once joined, each with its header, as a person would join them."""
    columns = headed(RUNS[kind]())
    half = len(next(iter(columns.values()))) // 2
    parts = (
        {k: v[:half] for k, v in columns.items()},
        {k: v[half:] for k, v in columns.items()},
    )
    text = [
        write_export(tmp_path / f"part{n}.csv", part).read_text() for n, part in enumerate(parts)
    ]
    joined = tmp_path / "joined.csv"
    joined.write_text(text[0] + text[1])
    assert numbers(kind, joined) == usual


def test_the_part_that_holds_a_feature_gives_it_too(tmp_path: Path) -> None:
    """The second part alone of an isotherm split in its solid-free half has the same collapse and areas."""
    columns = headed(film_run())
    whole = numbers("isotherm", write_export(tmp_path / "whole.csv", columns))["branches"][0]
    part = {k: v[300:] for k, v in columns.items()}
    later = numbers("isotherm", write_export(tmp_path / "later.csv", part))["branches"][0]
    for name in ("collapse", "limiting_area", "lift_off"):
        assert agree(whole[name], later[name], within=2.0, path=name) == []


def test_area_and_molecules_together(tmp_path: Path) -> None:
    """Twice the trough with twice the film is the same isotherm."""
    columns = headed(film_run())
    usual = numbers("isotherm", write_export(tmp_path / "usual.csv", columns))
    columns["area (cm^2)"] = columns["area (cm^2)"] * 2.0
    path = write_export(tmp_path / "twice.csv", columns, digits=17)
    twice = numbers("isotherm", path, volume=50.0, area_u=0.6)
    for one, other in zip(usual["branches"], twice["branches"], strict=True):
        for name in ("lift_off", "limiting_area", "collapse", "area_at", "transitions", "phases"):
            assert agree(one[name], other[name], within=0.2, path=name) == []


@pytest.mark.parametrize("kind", ["cycles", "fluid", "potential"])
def test_area_and_molecules_together_in_what_is_made_of_isotherms(
    kind: str, tmp_path: Path
) -> None:
    columns = headed(RUNS[kind]())
    usual = numbers(kind, write_export(tmp_path / "usual.csv", columns))
    columns["area (cm^2)"] = columns["area (cm^2)"] * 2.0
    path = write_export(tmp_path / "twice.csv", columns, digits=17)
    twice = numbers(kind, path, volume=50.0, area_u=0.6)
    if kind == "cycles":
        usual, twice = (
            {**each, "cycles": [{"hysteresis": c["hysteresis"]["molar"]} for c in each["cycles"]]}
            for each in (usual, twice)
        )
    assert agree(usual, twice, within=0.2) == []


@pytest.mark.parametrize("kind", ["isotherm", "fluid", "potential", "target"])
def test_a_timeless_trace_reversed(kind: str, tmp_path: Path) -> None:
    columns = headed(RUNS[kind]())
    del columns["time (s)"]
    usual = numbers(kind, write_export(tmp_path / "usual.csv", columns))
    path = write_export(tmp_path / "back.csv", {k: v[::-1] for k, v in columns.items()})
    assert numbers(kind, path) == usual


def test_depth_read_as_height(tmp_path: Path) -> None:
    columns = build_run()
    usual = numbers("transfer", write_export(tmp_path / "depth.csv", headed(columns)))
    columns["dipper position"] = 40.0 - columns["dipper position"]
    path = write_export(tmp_path / "height.csv", headed(columns))
    height = numbers("transfer", path, reads="height", surface=35.0)
    assert agree(usual["strokes"], height["strokes"], within=0.2) == []


@pytest.mark.parametrize("zero", [-0.9, 0.5])
def test_the_zero_of_the_probe_is_taken_off(zero: float, tmp_path: Path) -> None:
    columns = film_run()
    usual = numbers("isotherm", write_export(tmp_path / "usual.csv", headed(columns)))
    columns["pressure"] = columns["pressure"] + zero
    moved = numbers("isotherm", write_export(tmp_path / "moved.csv", headed(columns)))
    for one, other in zip(usual["branches"], moved["branches"], strict=True):
        for name in ("lift_off", "limiting_area", "collapse", "area_at"):
            assert agree(one[name], other[name], within=0.2, path=name) == []


def test_a_large_zero_may_be_film_and_is_left_but_named(tmp_path: Path) -> None:
    columns = film_run()
    columns["pressure"] = columns["pressure"] + 1.7
    path = write_export(tmp_path / "moved.csv", headed(columns))
    text = FILM.format(volume=25.0, area_u=0.3)
    (branch,) = analyse(read_trace(path, parse_sheet(text))).branches
    assert any("zero not subtracted" in warning for warning in branch.warnings)
    assert branch.collapse is not None
    assert branch.collapse.pressure.value == pytest.approx(53.7, abs=0.3)
