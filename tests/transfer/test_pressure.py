"""What counts as a held pressure, and what only passes through it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from tests.transfer.dipping_example import sheet, y_build
from transfer.analysis import analyse_log
from transfer.strokes_pressure import find_holds


@pytest.mark.parametrize("rate", [0.2, 1.0, 5.0])
@pytest.mark.parametrize("noise", [0.0, 0.01, 0.1, 0.3])
@pytest.mark.parametrize("power", [1.0, 3.0])
def test_a_pressure_that_only_climbs_is_refused(rate: float, noise: float, power: float) -> None:
    """0 to 40 mN/m over the whole log, evenly or as an isotherm would: no film was held for a stroke."""
    log = y_build(6, rate=rate).log()
    part = np.linspace(0.0, 1.0, log.time.size)
    error = noise * np.random.default_rng(4).standard_normal(part.size)
    ramp = replace(log, pressure=40.0 * part**power + error)
    with pytest.raises(UpstrokeError, match=r"never held|held through no move") as refused:
        analyse_log(ramp, sheet())
    assert "pressure" in str(refused.value)
    assert "run.csv" in str(refused.value)


def test_a_film_held_only_while_the_dipper_rests_is_refused_with_its_hold() -> None:
    log = y_build(2).log()
    pressure = log.pressure.copy()
    pressure[145:] = np.linspace(30.0, 2.0, pressure.size - 145)
    with pytest.raises(UpstrokeError, match=r"through no move.*1[34]\d s, at 30\.0 mN/m"):
        analyse_log(replace(log, pressure=pressure), sheet())


def test_a_ramp_after_the_build_takes_no_stroke_from_it() -> None:
    """The film is let go after two strokes; two more through the falling pressure are named, not counted."""
    log = y_build(4).log()
    pressure = log.pressure.copy()
    start = 150 + 2 * 180 - 60
    pressure[start:] -= 28.0 * np.linspace(0.0, 1.0, pressure.size - start)
    result = analyse_log(replace(log, pressure=pressure), sheet())
    assert [s.direction for s in result.strokes] == ["down", "up"]
    assert sum("not counted as a stroke" in w for w in result.warnings) == 2


@pytest.mark.parametrize("scatter", [0.02, 0.1, 0.3, 0.6])
def test_scatter_of_the_held_pressure_widens_the_band(scatter: float) -> None:
    """Five standard deviations, as said beside the constant, once that is more than 0.5 mN/m.

    The scatter is that of medians of three rows: 0.67 of single rows' for normal noise (the median of
    three normal deviates has a variance of 0.4487, David and Nagaraja, Order Statistics; from memory).
    """
    rng = np.random.default_rng(2)
    n = 4000
    pressure = 30.0 + scatter * rng.standard_normal(n)
    held = find_holds(np.arange(n, dtype=float), np.full(n, 300.0), pressure, target=30.0)
    assert held.band == pytest.approx(max(0.5, 5.0 * np.sqrt(0.4487) * scatter), rel=0.08)
    assert len(held.holds) == 1
    assert held.holds[0].first == 0
    assert held.holds[0].last == n - 1


def test_the_tolerance_widens_the_band() -> None:
    n = 400
    held = find_holds(
        np.arange(n, dtype=float), np.full(n, 300.0), np.full(n, 30.0), target=30.0, tolerance=2.0
    )
    assert held.band == pytest.approx(3.0)


def test_bare_water_is_no_film() -> None:
    """0.8 mN/m throughout is held, but nothing that could be dipped covers the water."""
    n = 400
    held = find_holds(np.arange(n, dtype=float), np.full(n, 300.0), np.full(n, 0.8), target=None)
    assert held.holds == ()
    assert held.interruptions == ()
