"""Effective dipole moment and the onset of potential."""

import json
from dataclasses import replace

import numpy as np
import pytest
from series_traces import volmer_trace, with_potential

from isotherm.analysis import analyse
from isotherm.errors import UpstrokeError
from isotherm.potential import analyse_potential
from isotherm.potential_figure import figure_potential
from isotherm.quantity import Quantity


def test_moment_follows_its_definition() -> None:
    rng = np.random.default_rng(1)
    result = analyse_potential(analyse(with_potential(volmer_trace(rng), rng, noise=0.0)))
    inside = np.maximum(1.35 - result.area, 0.0)
    expected = 2.6544187 * result.area * (500 * inside - 120 * inside**2)
    # the mean of rows on both sides of the onset lies off it by a little
    np.testing.assert_allclose(result.moment, expected, atol=1.0)


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_onset_is_found_with_its_uncertainty(sign: float) -> None:
    inside = []
    for seed in range(8):
        rng = np.random.default_rng(seed)
        onset = rng.uniform(1.0, 1.5)
        trace = with_potential(
            volmer_trace(rng), rng, onset=onset, noise=rng.uniform(1, 10), sign=sign
        )
        found = analyse_potential(analyse(trace)).onset
        assert found is not None
        assert found.area.u_random is not None
        assert found.area.value == pytest.approx(onset, abs=5 * found.area.u_random)
        inside.append(abs(found.area.value - onset) < 2 * found.area.u_random)
    assert sum(inside) >= 6


def test_onset_against_lift_off() -> None:
    rng = np.random.default_rng(3)
    trace = volmer_trace(rng)
    lift = analyse(trace).headline.lift_off
    assert lift is not None
    for onset, reading in (
        (1.4, "before lift-off"),
        (lift.value, "with lift-off"),
        (0.9, "after lift-off"),
    ):
        found = analyse_potential(analyse(with_potential(trace, rng, onset=onset, noise=8.0))).onset
        assert found is not None
        assert found.reading == reading
        assert found.difference is not None
        # the scale error moves both: it does not widen the comparison
        assert found.difference.u_systematic == pytest.approx(0.01 * abs(found.difference.value))


def test_no_onset_is_invented_on_a_smooth_curve_or_flat_noise() -> None:
    for seed in range(6):
        rng = np.random.default_rng(100 + seed)
        trace = volmer_trace(rng)
        n = len(trace.area)
        smooth = replace(
            trace, potential=100 + 300 * np.exp(-trace.area / 0.6) + rng.normal(0, 5, n)
        )
        assert analyse_potential(analyse(smooth)).onset is None
        flat = replace(trace, potential=rng.normal(0, 5, n))
        assert analyse_potential(analyse(flat)).onset is None


def test_baseline_is_subtracted_and_its_uncertainty_carried() -> None:
    rng = np.random.default_rng(4)
    result = analyse(with_potential(volmer_trace(rng), rng, level=40.0))
    raw = analyse_potential(result)
    zeroed = analyse_potential(result, baseline=Quantity(40.0, 5.0, "mV"), potential_u=2.0)
    np.testing.assert_allclose(raw.potential - zeroed.potential, 40.0)
    assert any("before its onset" in w for w in raw.warnings)
    place = next(p for p in zeroed.at if p.name == "10 mN/m")
    assert place.potential.u_systematic == pytest.approx(29**0.5)
    assert not any("scale given" in w for w in zeroed.warnings)


def test_refusals() -> None:
    rng = np.random.default_rng(5)
    result = analyse(volmer_trace(rng))
    with pytest.raises(UpstrokeError, match="no surface potential"):
        analyse_potential(result)
    branch = result.headline
    gaps = np.full(len(branch.curve.area), np.nan)
    gaps[:5] = 1.0
    holed = replace(branch, curve=replace(branch.curve, potential=gaps))
    with pytest.raises(UpstrokeError, match="5 points"):
        analyse_potential(replace(result, branches=(holed,)))


def test_json_rows_and_figure_agree() -> None:
    rng = np.random.default_rng(6)
    result = analyse_potential(analyse(with_potential(volmer_trace(rng), rng)))
    data = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert data["schema"] == "upstroke.potential/1"
    assert [r["moment"] for r in result.summary_rows()] == [
        p["moment"]["value"] for p in data["at"]
    ]
    assert len(result.rows()) == len(result.area)
    figure = figure_potential(result)
    figure.draw_without_rendering()
    drawn = figure.axes[2].get_lines()[0]
    np.testing.assert_allclose(np.asarray(drawn.get_ydata()), result.moment)


@pytest.mark.parametrize("cell", [np.nan, np.inf])
def test_a_cell_without_potential_costs_its_own_row_only(cell: float) -> None:
    rng = np.random.default_rng(4)
    trace = with_potential(volmer_trace(rng), rng, onset=1.2, noise=3.0)
    assert trace.potential is not None
    usual = analyse_potential(analyse(trace))
    values = trace.potential.copy()
    values[[100, 101, 400]] = cell
    holed = analyse_potential(analyse(replace(trace, potential=values)))
    assert usual.onset is not None
    assert holed.onset is not None
    assert usual.onset.area.u is not None
    assert abs(holed.onset.area.value - usual.onset.area.value) < 0.2 * usual.onset.area.u
    assert np.isfinite(holed.moment).all()
    assert len(holed.moment) == pytest.approx(len(usual.moment), abs=3)
