"""Repeated runs of one film."""

import json
import math
from dataclasses import replace

import numpy as np
import pytest
from series_films import Lipid, result_of

from isotherm.errors import UpstrokeError
from isotherm.replicates import analyse_replicates
from isotherm.replicates_figure import figure_replicates
from isotherm.replicates_outliers import outlying_values
from isotherm.result import IsothermResult


def sound_runs(n: int, seed: int, *, spread: float = 0.005) -> list[IsothermResult]:
    rng = np.random.default_rng(seed)
    return [
        result_of(
            Lipid(transition=10 + rng.normal(0, 0.15), collapse=60 + rng.normal(0, 0.4)),
            name=f"run {i}",
            scale=1 + rng.normal(0, spread),
            noise=0.05,
            rng=rng,
        )
        for i in range(n)
    ]


def test_mean_curve_keeps_the_transition_sharp() -> None:
    """Isotherms moved sideways by 5 % still give one plateau where every run has it."""
    runs = [result_of(Lipid(), name=f"{i}", scale=s) for i, s in enumerate((0.95, 1.0, 1.05))]
    curve = analyse_replicates(runs).curve
    np.testing.assert_allclose(curve.mean, Lipid().area(curve.pressure), rtol=1e-3)
    np.testing.assert_allclose(curve.s / curve.mean, 0.05, rtol=1e-2)


def test_shared_uncertainty_is_not_divided_by_root_n() -> None:
    few = analyse_replicates(sound_runs(3, 1)).feature("area_at_30")
    many = analyse_replicates(sound_runs(12, 1)).feature("area_at_30")
    assert few is not None
    assert many is not None
    assert many.mean.u_systematic == pytest.approx(0.01 * many.mean.value, rel=1e-6)
    assert few.mean.u_systematic == pytest.approx(0.01 * few.mean.value, rel=1e-6)
    assert many.s is not None
    assert many.mean.u_random == pytest.approx(many.s / math.sqrt(12))
    assert many.mean.u == pytest.approx(math.hypot(many.mean.u_random, many.mean.u_systematic))


def test_repeatability_limit() -> None:
    f = analyse_replicates(sound_runs(6, 2)).feature("collapse_pressure")
    assert f is not None
    assert f.s is not None
    assert f.repeatability_limit == pytest.approx(2.8 * f.s)
    assert f.repeatability_s_interval is not None
    low, high = f.repeatability_s_interval
    assert low < f.s < high


def test_a_run_far_off_is_named_and_kept() -> None:
    runs = [*sound_runs(6, 3), result_of(Lipid(), name="wrong volume", scale=1.10, noise=0.05)]
    result = analyse_replicates(runs)
    odd = [r for r in result.runs if r.outlying]
    assert [r.name for r in odd] == ["wrong volume"]
    assert odd[0].kept
    assert any("areas +" in reason for reason in odd[0].reasons)
    assert result.curve.n == 7
    dropped = analyse_replicates(runs, drop=["wrong volume"])
    assert dropped.curve.n == 6
    assert not dropped.runs[-1].kept
    assert dropped.runs[-1].reasons == ()


def test_a_film_of_another_kind_is_named() -> None:
    runs = [*sound_runs(4, 4), result_of(Lipid(transition=None), name="other film", noise=0.05)]
    result = analyse_replicates(runs)
    reasons = result.runs[-1].reasons
    assert any("no coexistence" in r for r in reasons)
    assert not any(r.outlying for r in result.runs[:-1])
    assert any("found in 4 of 5 runs" in w for w in result.warnings)


def test_early_collapse_is_named() -> None:
    runs = [*sound_runs(7, 5), result_of(Lipid(collapse=48.0), name="early", noise=0.05)]
    reasons = analyse_replicates(runs).runs[-1].reasons
    assert any("collapse pressure" in r for r in reasons)


def test_three_runs_one_off_by_more_than_the_sheet_allows() -> None:
    runs = [result_of(Lipid(), name=f"{i}", scale=s) for i, s in enumerate((1.0, 1.004, 1.09))]
    result = analyse_replicates(runs)
    assert [r.outlying for r in result.runs] == [False, False, True]
    assert "sheet" in result.runs[2].reasons[0]


def test_sound_series_raise_few_alarms() -> None:
    """Stated: 5 % of sound series. 60 series, so 9 or more would be a 1-in-500 accident."""
    alarms = sum(
        any(r.outlying for r in analyse_replicates(sound_runs(5, 100 + k)).runs) for k in range(60)
    )
    assert alarms <= 8


def test_outlier_test_level_and_masking() -> None:
    rng = np.random.default_rng(0)
    for n in (3, 6, 12):
        named = sum(bool(outlying_values(rng.normal(size=n), 0.05)) for _ in range(2000))
        assert 0.03 < named / 2000 < 0.075
    two = np.concatenate((rng.normal(size=13), [9.0, 9.5]))
    assert {hit.index for hit in outlying_values(two, 0.05)} == {13, 14}
    assert outlying_values(np.array([1.0, 1.0, 1.0, 1.0]), 0.05) == ()
    assert outlying_values(np.array([1.0, 9.0]), 0.05) == ()


def test_order_of_runs_does_not_matter() -> None:
    runs = sound_runs(5, 6)
    one, other = analyse_replicates(runs), analyse_replicates(runs[::-1])
    np.testing.assert_allclose(one.curve.mean, other.curve.mean, rtol=1e-12)
    assert [f.mean.value for f in one.features] == pytest.approx(
        [f.mean.value for f in other.features]
    )


def test_conditions_are_checked() -> None:
    a, b, c = sound_runs(3, 7)
    warm = replace(b, kelvin=305.0)
    twin = replace(c, source=a.source, title="twin")
    said = " ".join(analyse_replicates([a, warm, twin]).warnings)
    assert "temperatures differ by 10.0 K" in said
    assert "same file" in said
    unknown = [replace(r, area_relative_u=None) for r in (a, b)]
    assert any("area scale" in w for w in analyse_replicates(unknown).warnings)


def test_a_short_run_is_named() -> None:
    runs = [*sound_runs(3, 8), result_of(Lipid(collapse=None, last=25.0), name="stopped early")]
    result = analyse_replicates(runs)
    assert result.curve.pressure[-1] == pytest.approx(25.0, abs=0.1)
    assert any("stopped early" in w for w in result.warnings)


def test_refusals() -> None:
    runs = sound_runs(2, 9)
    with pytest.raises(UpstrokeError, match="two runs"):
        analyse_replicates(runs[:1])
    with pytest.raises(UpstrokeError, match="no run is called 'nobody'"):
        analyse_replicates(runs, drop=["nobody"])
    flat = result_of(Lipid(collapse=None, last=2.0), name="low", shift=0.0)
    high = result_of(Lipid(transition=None), name="high", lowest=8.0)
    with pytest.raises(UpstrokeError, match="no surface pressure in common"):
        analyse_replicates([flat, high])


def test_json_rows_and_figure_carry_the_same_numbers() -> None:
    result = analyse_replicates([*sound_runs(4, 10), result_of(Lipid(), name="off", scale=1.2)])
    data = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert data["schema"] == "upstroke.replicates/1"
    assert [r["name"] for r in data["runs"]] == [r["name"] for r in result.rows()]
    assert data["curve"]["area"] == [r["area"] for r in result.curve_rows()]
    assert len({tuple(r) for r in result.rows()}) == 1  # one header fits every row
    figure = figure_replicates(result)
    figure.draw_without_rendering()
    lines = figure.axes[0].get_lines()
    drawn = next(line for line in lines if str(line.get_label()).startswith("mean of"))
    np.testing.assert_allclose(np.asarray(drawn.get_xdata()), result.curve.mean)
    assert any("outlying" in str(line.get_label()) for line in lines)
