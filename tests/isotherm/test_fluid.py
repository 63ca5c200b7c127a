"""Volmer's equation on invented films, right and wrong."""

import json
from dataclasses import replace

import numpy as np
import pytest
from series_traces import volmer_trace

from isotherm.analysis import analyse
from isotherm.errors import UpstrokeError
from isotherm.fluid import analyse_fluid
from isotherm.fluid_figure import figure_fluid
from isotherm.fluid_fit import fit_volmer, runs_test
from isotherm.fluid_result import FluidResult
from isotherm.trace import Trace


def fluid(trace: Trace) -> FluidResult:
    return analyse_fluid(trace, analyse(trace))


def test_parameters_of_a_volmer_film_are_found() -> None:
    inside, holds = [], []
    for seed in range(10):
        rng = np.random.default_rng(50 + seed)
        result = fluid(volmer_trace(rng, scale=1 + rng.normal(0, 0.01)))
        holds.append(result.whole.holds)
        omega, cohesion = result.whole.co_area, result.whole.cohesion
        assert omega.u is not None
        assert cohesion.u is not None
        assert omega.value == pytest.approx(0.38, abs=5 * omega.u)
        inside.append(abs(omega.value - 0.38) < 2 * omega.u)
        inside.append(abs(cohesion.value - 5.0) < 2 * cohesion.u)
    assert np.mean(holds) > 0.8
    assert np.mean(inside) > 0.85


def test_a_wrong_factor_of_kt_is_not_volmers_film() -> None:
    result = fluid(volmer_trace(np.random.default_rng(1), factor=0.8))
    assert not result.whole.holds
    assert result.whole.thermal_factor.value == pytest.approx(0.8, abs=0.03)
    assert "does not hold" in result.statement


def test_a_bend_ends_the_range_over_which_the_model_holds() -> None:
    result = fluid(volmer_trace(np.random.default_rng(2), bend=0.05))
    assert not result.whole.holds
    assert result.lower is not None
    assert result.lower.holds
    assert result.lower.pressure[1] < 12.0
    assert result.best is result.lower
    assert result.lower.co_area.value == pytest.approx(0.38, abs=0.02)


def test_a_gas_goes_to_kt_and_a_cohesive_film_does_not() -> None:
    rng = np.random.default_rng(3)
    gas = fluid(volmer_trace(rng, cohesion=0.0, start=3.0, top=12.0)).gaseous
    assert gas is not None
    assert gas.reading == "gaseous"
    bound = fluid(volmer_trace(rng)).gaseous
    assert bound is not None
    assert bound.reading == "associated"
    assert bound.ratio.value < 0.3


def test_a_gas_whose_pressure_was_taken_for_the_zero_is_left_open() -> None:
    result = fluid(volmer_trace(np.random.default_rng(0), cohesion=0.0, start=8.0))
    assert result.gaseous is not None
    assert result.gaseous.reading != "associated"


def test_area_scale_error_is_in_the_uncertainty_of_the_co_area() -> None:
    trace = volmer_trace(np.random.default_rng(4))
    exact = replace(trace, area_relative_u=None)
    with_scale, without = fluid(trace).whole.co_area, fluid(exact).whole.co_area
    assert with_scale.u_systematic == pytest.approx(0.01 * 0.5, rel=0.4)
    assert without.u_systematic == 0.0
    assert any("area scale" in w for w in fluid(exact).warnings)


def test_refusals() -> None:
    rng = np.random.default_rng(5)
    trace = volmer_trace(rng)
    result = analyse(trace)
    with pytest.raises(UpstrokeError, match="temperature"):
        analyse_fluid(trace, replace(result, kelvin=None))
    area = np.linspace(0.30, 0.20, 1500)
    stiff = np.maximum(0.0, 300 * np.log(0.24 / area))
    solid = replace(
        trace, area=area, pressure=stiff + rng.normal(0, 0.05, 1500), time=np.arange(1500.0)
    )
    with pytest.raises(UpstrokeError, match="no fluid branch"):
        fluid(solid)
    with pytest.raises(UpstrokeError, match="points"):
        fit_volmer(area[:5], stiff[:5], np.ones(5), 4.1)


def test_runs_test_sees_order() -> None:
    rng = np.random.default_rng(6)
    assert runs_test(np.sort(rng.normal(size=60))) < 1e-6
    p = [runs_test(rng.normal(size=60)) for _ in range(400)]
    assert np.mean(np.array(p) < 0.05) < 0.08
    assert runs_test(np.ones(10)) < 0.01


def test_json_rows_and_figure_agree() -> None:
    result = fluid(volmer_trace(np.random.default_rng(7), bend=0.05))
    data = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert data["schema"] == "upstroke.fluid/1"
    assert data["lower_part"]["co_area"]["value"] == result.rows()[0]["co_area"]
    figure = figure_fluid(result)
    figure.draw_without_rendering()
    points = figure.axes[0].get_lines()[0]
    np.testing.assert_allclose(np.asarray(points.get_xdata()), result.area)
