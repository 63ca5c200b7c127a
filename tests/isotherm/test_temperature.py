"""Series of temperatures against films whose transition has a closed form."""

import json
import math
from dataclasses import replace

import numpy as np
import pytest
from series_films import Lipid, result_of, sheet_of

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from isotherm.temperature import analyse_temperature
from isotherm.temperature_figure import figure_temperature
from isotherm.temperature_line import fit_straight_line
from isotherm.temperature_result import TemperatureResult

VOLUME = Quantity(50.0, 0.3, "µL")
CONCENTRATION = Quantity(1.0, 0.005, "mg/mL")
SLOPE, WIDTH_PER_K, CRITICAL = 1.3, 0.0115, 44.0  # mN/m/K, nm^2/K, degC


def film(celsius: float) -> Lipid:
    below = celsius < CRITICAL
    return Lipid(
        kelvin=celsius + 273.15,
        transition=4 + SLOPE * (celsius - 18) if below else None,
        gap=WIDTH_PER_K * (CRITICAL - celsius) if below else 0.1,
        collapse=60 - 0.2 * (celsius - 18),
    )


def series(
    temperatures: tuple[float, ...], rng: np.random.Generator | None = None
) -> tuple[list[IsothermResult], list[RunSheet]]:
    results, sheets = [], []
    for t in temperatures:
        true = t + (rng.normal(0, 0.1) if rng else 0.0)
        results.append(
            result_of(
                film(true),
                name=f"{t:g} degC",
                scale=1 + (rng.normal(0, 0.006) if rng else 0.0),
                shift=rng.normal(0, 0.1) if rng else 0.0,
                noise=0.05 if rng else 0.0,
                rng=rng,
            )
        )
        sheets.append(sheet_of({"a": 1.0}, celsius=t, volume=VOLUME, concentration=CONCENTRATION))
    return results, sheets


TEMPERATURES = (18.0, 22.0, 26.0, 30.0, 34.0)


def exact() -> TemperatureResult:
    return analyse_temperature(*series((*TEMPERATURES, 46.0)))


def test_closed_form_of_slope_heat_and_critical_point() -> None:
    result = exact()
    assert result.slope is not None
    assert result.slope.value == pytest.approx(SLOPE, rel=1e-6)
    linear = result.critical[0]
    assert linear.law == "linear"
    assert linear.kelvin.value == pytest.approx(CRITICAL + 273.15, abs=0.01)
    assert linear.pressure is not None
    assert linear.pressure.value == pytest.approx(4 + SLOPE * (CRITICAL - 18), abs=0.02)
    assert result.begins_at is not None
    assert result.begins_at.value == pytest.approx(18 - 4 / SLOPE + 273.15, abs=0.01)
    for run in result.runs[:-1]:
        width = WIDTH_PER_K * (CRITICAL + 273.15 - run.kelvin.value)
        assert run.heat is not None
        entropy = 602.214076 * width * SLOPE
        assert run.heat.entropy.value == pytest.approx(entropy, rel=1e-4)
        assert run.heat.enthalpy.value == pytest.approx(entropy * run.kelvin.value, rel=1e-4)
        assert run.heat.enthalpy_full is not None
        ratio = run.heat.enthalpy_full.value / run.heat.enthalpy.value
        assert ratio == pytest.approx((SLOPE + 0.155) / SLOPE, rel=2e-3)


def test_a_film_above_its_critical_point_is_listed_without_a_transition() -> None:
    result = exact()
    assert result.runs[-1].pressure is None
    assert result.runs[-1].heat is None
    assert any("no coexistence in 46 degC" in w for w in result.warnings)


def test_truth_lies_in_the_intervals() -> None:
    slopes, criticals, begins = [], [], []
    for seed in range(40):
        result = analyse_temperature(*series(TEMPERATURES, np.random.default_rng(300 + seed)))
        assert result.slope_interval is not None
        low, high = result.slope_interval
        slopes.append(low < SLOPE < high)
        start, end = result.critical[0].interval
        assert start is not None
        assert end is not None
        criticals.append(start < CRITICAL + 273.15 < end)
        b = result.begins_at
        assert b is not None
        assert b.low is not None
        assert b.high is not None
        begins.append(b.low < 18 - 4 / SLOPE + 273.15 < b.high)
    # 95 % of 40 is 38; 34 or fewer would be a 1-in-20 accident for each
    assert min(sum(slopes), sum(criticals), sum(begins)) >= 34


def test_order_of_runs_does_not_matter() -> None:
    results, sheets = series(TEMPERATURES, np.random.default_rng(1))
    one = analyse_temperature(results, sheets)
    other = analyse_temperature(results[::-1], sheets[::-1])
    assert json.dumps(one.to_json()) == json.dumps(other.to_json())


def test_area_scale_common_to_all_does_not_move_the_critical_point() -> None:
    one = exact().critical[0].kelvin.value
    results, sheets = [], []
    for t in TEMPERATURES:
        results.append(result_of(film(t), name=f"{t}", scale=1.07))
        sheets.append(sheet_of({"a": 1.0}, celsius=t))
    assert analyse_temperature(results, sheets).critical[0].kelvin.value == pytest.approx(
        one, abs=1e-3
    )


def test_collapse_and_modulus_follow_temperature() -> None:
    trends = {t.name: t for t in exact().trends}
    assert trends["collapse_pressure"].slope.value == pytest.approx(-0.2, rel=1e-6)
    assert trends["collapse_pressure"].p < 0.01
    assert "modulus_max" in trends
    assert "highest_pressure" not in trends


def test_expansivity_of_the_expanded_film() -> None:
    """(1/A) dA/dT of a Volmer film is (A - ω)/(A T)."""
    result = analyse_temperature(*series((22.0, 26.0, 30.0)), pressures=[6.0])
    (found,) = result.expansivity
    assert found.side == "expanded"
    area = film(26.0).area(np.array([6.0]))[0]
    assert found.value.value == pytest.approx((area - 0.40) / (area * 299.15), rel=0.01)


def test_expansivity_keeps_the_sides_apart() -> None:
    result = analyse_temperature(*series(TEMPERATURES), pressures=[16.0])
    sides = {e.side: e.n for e in result.expansivity}
    # 18 to 26 degC are condensed at 16 mN/m (26 ends at 15.4), 34 and 30 expanded
    assert sides == {"condensed": 3, "expanded": 2}


def test_measured_tensions_replace_water() -> None:
    results, sheets = series(TEMPERATURES)
    given = []
    for s in sheets:
        celsius = s.subphase.temperature
        assert celsius is not None
        tension = Quantity(72.7 - 0.25 * (celsius.value - 20), 0.05, "mN/m")
        given.append(replace(s, subphase=replace(s.subphase, tension=tension, liquid="buffer")))
    result = analyse_temperature(results, given)
    assert result.tension_from == "measured tensions"
    assert result.tension_slope is not None
    assert result.tension_slope.value == pytest.approx(-0.25)
    foreign = [replace(s, subphase=replace(s.subphase, liquid="glycerol")) for s in sheets]
    assert any("glycerol" in w for w in analyse_temperature(results, foreign).warnings)


def test_a_width_that_does_not_fall_has_no_critical_point() -> None:
    results = [
        result_of(replace(film(t), gap=0.10 + 0.005 * (t - 18)), name=f"{t}") for t in TEMPERATURES
    ]
    sheets = [sheet_of({"a": 1.0}, celsius=t) for t in TEMPERATURES]
    result = analyse_temperature(results, sheets)
    assert result.critical == ()
    assert any("does not fall" in w for w in result.warnings)


def test_an_insignificant_fall_leaves_the_critical_point_unbounded() -> None:
    line = fit_straight_line(
        np.array([290.0, 295.0, 300.0]), np.array([0.21, 0.20, 0.203]), np.full(3, 0.02)
    )
    crossing = line.crossing()
    assert crossing is not None
    assert crossing.high is None


def test_two_temperatures_give_a_slope_and_say_so() -> None:
    result = analyse_temperature(*series((18.0, 30.0)))
    assert result.slope is not None
    assert result.slope.u is not None
    assert any("two temperatures only" in w for w in result.warnings)


def test_bent_transition_pressures_are_noticed() -> None:
    results, sheets = [], []
    for t in TEMPERATURES:
        bent = replace(film(t), transition=4 + 1.3 * (t - 18) + 0.03 * (t - 26) ** 2)
        results.append(result_of(bent, name=f"{t}"))
        sheets.append(sheet_of({"a": 1.0}, celsius=t))
    result = analyse_temperature(results, sheets)
    assert any("leave the straight line" in w for w in result.warnings)
    assert result.pressure_line is not None
    assert result.pressure_line.inflated > 1.5


def test_films_without_any_transition() -> None:
    results = [
        result_of(Lipid(transition=None, kelvin=t + 273.15), name=f"{t}") for t in (20, 30, 40)
    ]
    result = analyse_temperature(results, [sheet_of({"a": 1.0}, celsius=t) for t in (20, 30, 40)])
    assert result.slope is None
    assert result.critical == ()
    assert all(e.side == "no transition" for e in result.expansivity)
    assert result.expansivity
    figure_temperature(result).draw_without_rendering()


def test_refusals() -> None:
    results, sheets = series((20.0, 20.0))
    with pytest.raises(UpstrokeError, match="one temperature"):
        analyse_temperature(results, sheets)
    with pytest.raises(UpstrokeError, match="not known"):
        analyse_temperature([replace(r, kelvin=None) for r in results], [RunSheet(), RunSheet()])
    with pytest.raises(UpstrokeError, match="2 runs but 1"):
        analyse_temperature(results, sheets[:1])
    with pytest.raises(UpstrokeError, match="two different"):
        fit_straight_line(np.ones(3), np.ones(3), np.ones(3))


def test_line_without_known_uncertainty_uses_its_scatter() -> None:
    rng = np.random.default_rng(0)
    x = np.arange(6.0)
    line = fit_straight_line(x, x + rng.normal(0, 0.1, 6), np.zeros(6))
    assert 0.01 < line.u_slope < 0.06
    assert line.lack_of_fit_p is None
    two = fit_straight_line(np.array([0.0, 1.0]), np.array([0.0, 1.0]), np.zeros(2))
    assert math.isinf(two.u_slope)


def test_json_rows_and_figure_agree() -> None:
    results, sheets = series(TEMPERATURES, np.random.default_rng(5))
    result = analyse_temperature(results, sheets)
    data = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert data["schema"] == "upstroke.temperature/1"
    assert [r["transition_pressure"] for r in result.rows()] == [
        r["transition_pressure"]["value"] for r in data["runs"]
    ]
    figure = figure_temperature(result, results)
    figure.draw_without_rendering()
    drawn = figure.axes[1].containers[0].lines[0]  # type: ignore[attr-defined]
    expected = [r.pressure.value for r in result.runs if r.pressure]
    np.testing.assert_allclose(np.asarray(drawn.get_ydata(), dtype=float), expected)
