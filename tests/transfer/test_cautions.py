"""What the result says of a log beside its numbers: assumptions, doubts, things that went wrong."""

from __future__ import annotations

from dataclasses import replace
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from isotherm.quantity import Quantity
from isotherm.sheet import Dipping, RunSheet, Stack, Subphase, Substrate, Trough
from tests.transfer.dipping_example import Programme, sheet, y_build
from transfer.analysis import analyse_log
from transfer.log import log_from_table
from transfer.ratio_modulus import known_compressibility
from transfer.result import TransferResult


def said(result: TransferResult, text: str) -> bool:
    return any(text in warning for warning in result.warnings)


def flagged(result: TransferResult, stroke: int, text: str) -> bool:
    return any(text in flag for flag in result.strokes[stroke - 1].flags)


def dipping(**more: Any) -> Dipping:
    known = {
        "position_reads": "depth",
        "surface_at": Quantity(12.0, 0.02, "mm"),
        "modulus": Quantity(180.0, 5.0, "mN/m"),
    }
    return Dipping(**(known | more))


def test_a_plain_build_needs_no_caution() -> None:
    result = analyse_log(y_build(4).log(), sheet())
    assert result.warnings == ()
    assert all(stroke.flags == () for stroke in result.strokes)


def test_a_pressure_not_given_or_not_held_is_said() -> None:
    log = y_build(4).log()
    result = analyse_log(log, sheet(dipping=dipping()))
    assert said(result, "dipping.pressure not given")
    assert result.pressure_target == pytest.approx(30.0, abs=0.02)
    other = analyse_log(log, sheet(dipping=dipping(pressure=Quantity(25.0, None, "mN/m"))))
    assert said(other, "held at 30.00 mN/m, not at the sheet's 25 mN/m")


def test_a_modulus_the_dwells_contradict_is_said() -> None:
    """180 mN/m in truth, 40 in the sheet: the wander of the controller shows it in quiet dwells."""
    log = y_build(8, noise=0.002).log()
    given = dipping(pressure=Quantity(30.0, None, "mN/m"), modulus=Quantity(40.0, 1.0, "mN/m"))
    assert said(analyse_log(log, sheet(dipping=given)), "check the modulus")


def test_deeper_than_the_substrate_is_high_is_said() -> None:
    short = Substrate(
        width=Quantity(20.0, 0.02, "mm"),
        thickness=Quantity(1.0, 0.01, "mm"),
        height=Quantity(20.0, 0.1, "mm"),
    )
    assert said(
        analyse_log(y_build(2).log(), sheet(substrate=short)), "27.0 mm deep but is 20.0 mm"
    )
    high = replace(short, height=Quantity(28.0, 0.1, "mm"))
    assert not said(analyse_log(y_build(2).log(), sheet(substrate=high)), "mm deep")


@pytest.mark.parametrize(("factor", "wrong"), [(100.0, True), (0.01, True), (1.0, False)])
def test_areas_in_another_unit_are_seen(factor: float, wrong: bool) -> None:
    log = y_build(4).log()
    result = analyse_log(replace(log, area=factor * log.area), sheet())
    assert said(result, "implausible transfer ratios") is wrong
    assert flagged(result, 1, "implausible ratio") is (factor > 1.0)


def test_film_given_back_is_flagged() -> None:
    result = analyse_log(y_build(6, [1.0, 1.0, -0.5, 1.0, 1.0, 1.0]).log(), sheet())
    assert flagged(result, 3, "peel-off")
    assert not any(flagged(result, k, "peel-off") for k in (1, 2, 4, 5, 6))
    assert result.deposition.type == "Y"


def test_the_empty_first_dip_is_flagged_and_left_out() -> None:
    result = analyse_log(y_build(6, [0.0, 1.0, 1.0, 1.0, 1.0, 1.0]).log(), sheet())
    assert flagged(result, 1, "as a wetting substrate does")
    assert not result.strokes[0].counted
    assert result.deposition.type == "Y"
    assert result.stack.layers.value == pytest.approx(5.0, abs=0.02)


def test_a_dip_of_the_pressure_within_a_stroke_is_flagged() -> None:
    log = y_build(4).log()
    pressure = log.pressure.copy()
    pressure[160:190] -= 4.0
    result = analyse_log(replace(log, pressure=pressure), sheet())
    assert flagged(result, 1, "pressure up to 4.")
    assert not flagged(result, 2, "pressure up to")


def test_rows_far_off_their_dwell_are_counted() -> None:
    log = y_build(4).log()
    area = log.area.copy()
    area[[60, 250, 420]] += 20.0
    result = analyse_log(replace(log, area=area), sheet())
    assert said(result, "3 rows far off their dwell were left out")
    assert result.strokes[0].ratio is not None
    assert result.strokes[0].ratio.value == pytest.approx(1.0, abs=0.005)


def test_transfer_that_fails_in_the_middle_or_is_uneven_is_placed() -> None:
    run = y_build(2)
    run.move(8.0).move(17.0, 0.0).move(27.0).rest(120).move(-3.0).rest(120)
    middle = analyse_log(run.log(), sheet()).strokes[2]
    assert any("fails part of the way" in flag for flag in middle.flags)
    run = y_build(2)
    run.move(9.0).move(18.0, 0.75).move(27.0, 1.3).rest(120).move(-3.0).rest(120)
    uneven = analyse_log(run.log(), sheet()).strokes[2]
    assert any("uneven transfer" in flag for flag in uneven.flags)


def test_a_film_that_creeps_slower_with_age_leaves_ratios_alone() -> None:
    """Creep of 2e-4/s that decays within 10 min of each renewal, written into the area."""
    run = Programme(film=400.0, creep=0.0)
    run.rest(300)
    for k in range(8):
        run.move(27.0 if k % 2 == 0 else -3.0).rest(240)
    log = run.log()
    lost = 2e-4 * 600.0 * (1.0 - np.exp(-log.time / 600.0))
    result = analyse_log(replace(log, area=log.area * (1.0 - lost)), sheet())
    assert len(result.strokes) == 8
    for stroke in result.strokes:
        assert stroke.ratio is not None
        # the film the stroke takes is the shrunken one's: 12 % less at the end
        true = 1.0 - float(np.interp(stroke.start_s + 30.0, log.time, lost))
        assert abs(stroke.ratio.value - true) < 4.0 * (stroke.ratio.u or 0.0) + 0.005
    rates = [span.rate.value for span in result.creep]
    assert max(rates) > 1e-4


def table(**columns: np.ndarray) -> Any:
    return SimpleNamespace(values=columns, warnings=(), source=SimpleNamespace(path="run.csv"))


def test_area_from_barriers_and_pressure_from_tension() -> None:
    """Two barriers 100 and 150 mm from the middle of a trough 80 mm wide: 200 cm^2. 72.0 - 42.0 = 30 mN/m."""
    n = 12
    given = table(
        time=np.arange(n, dtype=float),
        dipper_position=np.linspace(0.0, 5.0, n),
        barrier_position=np.tile([100.0, 150.0], (n, 1)),
        tension=np.full(n, 42.0),
    )
    known = RunSheet(
        trough=Trough(width=Quantity(80.0, None, "mm")),
        subphase=Subphase(tension=Quantity(72.0, None, "mN/m")),
    )
    log = log_from_table(given, known)
    assert log.area == pytest.approx(np.full(n, 200.0))
    assert log.pressure == pytest.approx(np.full(n, 30.0))
    assert any("barrier positions" in w for w in log.warnings)
    assert any("from tension" in w for w in log.warnings)
    single = table(**{**given.values, "barrier_position": np.full(n, 250.0)})
    assert log_from_table(single, known).area == pytest.approx(np.full(n, 200.0))


def isotherm(modulus: list[float], u: float) -> Any:
    curve = SimpleNamespace(
        pressure=np.asarray([10.0, 20.0, 40.0]),
        modulus=np.asarray(modulus),
        u_modulus=np.full(3, u),
    )
    return SimpleNamespace(headline=SimpleNamespace(curve=curve))


def test_compressibility_from_the_isotherm_by_hand() -> None:
    """Modulus 100 at 20, 200 at 40 mN/m: 150 at 30; u 9 and 5 % (7.5) together."""
    known = known_compressibility(RunSheet(), isotherm([50.0, 100.0, 200.0], 9.0), 30.0)
    assert known.origin == "isotherm"
    assert known.value == pytest.approx(1.0 / 150.0)
    assert known.u == pytest.approx(np.hypot(9.0, 7.5) / 150.0**2)
    without = known_compressibility(RunSheet(), isotherm([50.0, 100.0, 200.0], np.nan), 30.0)
    assert without.u == pytest.approx(7.5 / 150.0**2)


@pytest.mark.parametrize(
    ("modulus", "pressure"), [([50.0, 100.0, 200.0], 41.0), ([50.0, np.nan, -1.0], 20.0)]
)
def test_an_isotherm_that_does_not_reach_leaves_it_to_the_dwells(
    modulus: list[float], pressure: float
) -> None:
    known = known_compressibility(RunSheet(), isotherm(modulus, 5.0), pressure)
    assert known.origin == "dwells"
    assert any("gives no modulus" in w for w in known.warnings)


def test_a_modulus_without_uncertainty_gets_one() -> None:
    given = RunSheet(dipping=Dipping(modulus=Quantity(200.0, None, "mN/m")))
    known = known_compressibility(given, None, 30.0)
    assert known.value == pytest.approx(0.005)
    assert known.u == pytest.approx(0.05 * 0.005)
    assert any("5 % was taken" in w for w in known.warnings)
    assert known_compressibility(RunSheet(), None, 30.0).warnings == ()


def test_down_and_up_films_are_named_in_the_strokes() -> None:
    from isotherm.sheet import StackFilm

    design = Stack(films=(StackFilm("acid", "down"), StackFilm("amine", "up")))
    result = analyse_log(y_build(2).log(), sheet(stack=design))
    assert [layer.film for layer in result.stack.ledger] == ["acid", "amine"]
