"""Whatever the arrays, an analysis gives a result that can be written, or one line of refusal, soon."""

from __future__ import annotations

import json
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import series_films as film
from hypothesis import given, settings
from property_runs import any_table

from cli.serialise import json_bytes
from isotherm.analysis import analyse
from isotherm.check import check_records
from isotherm.cycles import analyse_cycles
from isotherm.errors import UpstrokeError
from isotherm.fluid import analyse_fluid
from isotherm.hold import analyse_hold
from isotherm.hold_read import hold_record
from isotherm.mixture import analyse_mixture
from isotherm.oscillation import analyse_oscillation
from isotherm.potential import analyse_potential
from isotherm.replicates import analyse_replicates
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet
from isotherm.table import Table
from isotherm.temperature import analyse_temperature
from isotherm.trace_read import trace_from_table
from transfer.analysis import analyse_log
from transfer.log import log_from_table
from transfer.target import choose_target

SECONDS = 20.0  # of processor time, for at most 400 rows: bounded, whatever else the machine does
SHEET = parse_sheet(
    """
[film]
molar_mass = "284.48 g/mol"
concentration = "1.00 ± 0.01 mg/mL"
volume = "25.0 ± 0.2 µL"
[subphase]
temperature = "20.0 ± 0.2 degC"
[trough]
smallest_area = "60 cm^2"
largest_area = "240 cm^2"
[substrate]
shape = "plate"
width = "20.0 ± 0.1 mm"
thickness = "1.00 ± 0.02 mm"
[dipping]
stroke_length = "20 mm"
speed = "12 mm/min"
[stack]
layers = 4
layer_thickness = "2.5 ± 0.05 nm"
[target]
collapse_margin = "5 mN/m"
"""
)


def series_sheet(parts: dict[str, float], celsius: float) -> RunSheet:
    """A sheet of a mixture at a temperature."""
    told = "".join(
        f'[[film.component]]\nname = "{name}"\nmolar_mass = "700 g/mol"\nmole_fraction = {part}\n'
        for name, part in parts.items()
    )
    return parse_sheet(f'{told}[subphase]\ntemperature = "{celsius} ± 0.1 degC"\n')


SERIES = [
    series_sheet({"a": 0.5, "b": 0.5}, 15.0),
    series_sheet({"a": 1.0}, 20.0),
    series_sheet({"b": 1.0}, 25.0),
]


def outcome(analysis: Callable[[Table], Any], table: Table) -> str:
    """Run it; "done" or "refused" (warnings are errors in these tests, and the table stays as it was)."""
    before = {role: values.copy() for role, values in table.values.items()}
    begin = time.process_time()
    try:
        result = analysis(table)
    except UpstrokeError as error:
        text = str(error)
        assert text.strip()
        assert "\n" not in text
        done = "refused"
    else:
        json.loads(json_bytes(result.to_json()), parse_constant=pytest.fail)
        done = "done"
    assert time.process_time() - begin < SECONDS
    for role, values in before.items():
        np.testing.assert_array_equal(values, table.values[role])
    return done


@settings(max_examples=25)
@given(any_table("area", "pressure", like="isotherm"))
def test_isotherm(table: Table) -> None:
    outcome(lambda t: analyse(trace_from_table(t, SHEET)), table)


@settings(max_examples=30)
@given(any_table("area", "pressure", like="target"))
def test_target(table: Table) -> None:
    outcome(lambda t: choose_target(analyse(trace_from_table(t, SHEET)), SHEET), table)


@settings(max_examples=40)
@given(any_table("time", "area", "pressure", like="cycles"))
def test_cycles(table: Table) -> None:
    outcome(lambda t: analyse_cycles(trace_from_table(t, SHEET)), table)


@settings(max_examples=40)
@given(any_table("time", "area", "pressure", like="hold"))
def test_hold(table: Table) -> None:
    outcome(lambda t: analyse_hold(hold_record(t, SHEET), SHEET), table)


@settings(max_examples=40)
@given(any_table("time", "area", "pressure", like="check"))
def test_check(table: Table) -> None:
    outcome(lambda t: check_records([t], SHEET), table)


@settings(max_examples=40)
@given(any_table("time", "dipper_position", "area", "pressure", like="transfer"))
def test_transfer(table: Table) -> None:
    outcome(lambda t: analyse_log(log_from_table(t, SHEET), SHEET), table)


@settings(max_examples=25)
@given(any_table("area", "pressure", like="fluid"))
def test_fluid(table: Table) -> None:
    def fluid(t: Table) -> Any:
        trace = trace_from_table(t, SHEET)
        return analyse_fluid(trace, analyse(trace))

    outcome(fluid, table)


@settings(max_examples=25)
@given(any_table("area", "pressure", "potential", like="potential"))
def test_potential(table: Table) -> None:
    outcome(lambda t: analyse_potential(analyse(trace_from_table(t, SHEET))), table)


@settings(max_examples=40)
@given(any_table("time", "area", "pressure", like="oscillation"))
def test_oscillation(table: Table) -> None:
    outcome(lambda t: analyse_oscillation(trace_from_table(t, SHEET)), table)


def in_series(analysis: Callable[[list[IsothermResult], list[RunSheet]], Any], table: Table) -> str:
    """A run of any arrays among sound ones, mixed or at another temperature."""
    films = {"one": film.Lipid(), "two": film.Lipid(omega=0.42)}
    sound = [film.result_of(each, name=name) for name, each in films.items()]
    return outcome(lambda t: analysis([analyse(trace_from_table(t, SHEET)), *sound], SERIES), table)


@settings(max_examples=15)
@given(any_table("area", "pressure", like="isotherm"))
def test_replicates(table: Table) -> None:
    in_series(lambda runs, _: analyse_replicates(runs), table)


@settings(max_examples=15)
@given(any_table("area", "pressure", like="isotherm"))
def test_mixture(table: Table) -> None:
    in_series(analyse_mixture, table)


@settings(max_examples=15)
@given(any_table("area", "pressure", like="isotherm"))
def test_temperature(table: Table) -> None:
    in_series(analyse_temperature, table)


def test_these_properties_can_see_a_result() -> None:
    """A sound record passes through `outcome` as "done", so the tests above do not refuse everything."""
    area = np.linspace(240.0, 62.0, 300)
    pressure = np.clip(3.0 * (132.0 - area), 0.0, None)
    pressure += np.random.default_rng(1).normal(0.0, 0.05, area.size)
    values = {"area": area, "pressure": pressure}
    from isotherm.source import Source

    table = Table(Source("sound.csv", "", 300), values, np.arange(300))
    assert outcome(lambda t: analyse(trace_from_table(t, SHEET)), table) == "done"
