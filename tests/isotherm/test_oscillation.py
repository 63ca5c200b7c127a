"""Barrier oscillations of invented films."""

import json
from dataclasses import replace

import numpy as np
import pytest
from series_traces import oscillating_trace, volmer_trace

from isotherm.analysis import analyse
from isotherm.errors import UpstrokeError
from isotherm.oscillation import analyse_oscillation
from isotherm.oscillation_figure import figure_oscillation
from isotherm.oscillation_segments import find_stretches
from isotherm.quantity import Quantity

STEPS = [(0.02, 0.01, 6), (0.05, 0.01, 10), (0.1, 0.01, 15), (0.1, 0.03, 15)]


def test_every_stretch_is_found_with_its_modulus() -> None:
    result = analyse_oscillation(oscillating_trace(np.random.default_rng(0), STEPS))
    assert len(result.segments) == 4
    for segment, (frequency, amplitude, _) in zip(result.segments, STEPS, strict=True):
        assert segment.frequency.value == pytest.approx(frequency, rel=1e-3)
        assert segment.amplitude.value == pytest.approx(amplitude, rel=5e-3)
        assert segment.storage.value == pytest.approx(60.0, abs=4 * (segment.storage.u or 0))
        loss = 2 * np.pi * frequency * 30.0
        assert segment.loss.value == pytest.approx(loss, abs=4 * (segment.loss.u or 0))
        assert segment.viscosity.value == pytest.approx(30.0, abs=4 * (segment.viscosity.u or 0))
        assert segment.linear
        assert not segment.flags


def test_uncertainty_covers_the_truth_for_white_and_wandering_noise() -> None:
    inside = []
    for seed in range(16):
        rng = np.random.default_rng(40 + seed)
        trace = oscillating_trace(
            rng, [(0.03, 0.01, 8), (0.1, 0.01, 15)], wander=0.004 * (seed % 2), rate=5.0
        )
        for s in analyse_oscillation(trace).segments:
            assert s.storage.u is not None
            assert s.loss.u is not None
            inside.append(abs(s.storage.value - 60.0) < 2 * s.storage.u)
            loss = 2 * np.pi * s.frequency.value * 30.0
            inside.append(abs(s.loss.value - loss) < 2 * s.loss.u)
    assert np.mean(inside) > 0.88


def test_frequencies_without_a_rest_between_them_are_told_apart() -> None:
    steps = [(0.05, 0.01, 10), (0.058, 0.01, 10), (0.058, 0.012, 10)]
    trace = oscillating_trace(np.random.default_rng(1), steps, rest=0.0)
    found = [(s.frequency.value, s.amplitude.value) for s in analyse_oscillation(trace).segments]
    expected = [(f, a) for f, a, _ in steps]
    np.testing.assert_allclose(found, expected, rtol=0.02)


def test_a_steady_oscillation_is_one_stretch() -> None:
    for seed in range(6):
        rng = np.random.default_rng(seed)
        trace = oscillating_trace(rng, [(0.1, 0.005, 60)], area_noise=1e-4)
        assert trace.time is not None
        assert len(find_stretches(trace.time, trace.area)) == 1


def test_quantised_area_and_uneven_time() -> None:
    rng = np.random.default_rng(2)
    trace = oscillating_trace(rng, [(0.05, 0.01, 12)])
    assert trace.time is not None
    keep = np.sort(rng.choice(len(trace.area), len(trace.area) // 2, replace=False))
    thinned = replace(
        trace,
        area=np.round(trace.area[keep], 4),
        pressure=trace.pressure[keep],
        time=trace.time[keep],
    )
    (segment,) = analyse_oscillation(thinned).segments
    assert segment.storage.value == pytest.approx(60.0, abs=1.5)
    assert segment.frequency.value == pytest.approx(0.05, rel=2e-3)


def test_softening_with_amplitude_is_noticed() -> None:
    """-c ε³ makes the film stiffer by 3/4 c ε² and gives a third harmonic of c ε²/4 of the first."""
    steps = [(0.1, 0.01, 15), (0.1, 0.03, 15), (0.1, 0.06, 15)]
    trace = oscillating_trace(np.random.default_rng(3), steps, viscous=0.0, cubic=9e3)
    result = analyse_oscillation(trace)
    (check,) = result.amplitude_checks
    assert check.reading == "depends on amplitude"
    assert check.change.value > 0.2
    last = result.segments[-1]
    first = 60 + 0.75 * 9e3 * 0.06**2
    assert last.modulus.value == pytest.approx(first, rel=0.01)
    assert last.nonlinearity.value == pytest.approx(0.25 * 9e3 * 0.06**2 / first, rel=0.05)
    assert not last.linear
    assert result.segments[0].linear
    linear = analyse_oscillation(oscillating_trace(np.random.default_rng(4), STEPS))
    assert linear.amplitude_checks[0].reading == "linear"


def test_delay_of_the_pressure_reading_is_corrected_and_carried() -> None:
    trace = oscillating_trace(np.random.default_rng(5), [(0.1, 0.02, 20)], delay=0.5)
    raw = analyse_oscillation(trace)
    mended = analyse_oscillation(trace, delay=Quantity(0.5, 0.05, "s"))
    true = 2 * np.pi * 0.1 * 30.0
    assert raw.segments[0].loss.value < 0.3 * true
    assert mended.segments[0].loss.value == pytest.approx(true, abs=0.3)
    assert mended.segments[0].loss.u_systematic == pytest.approx(
        60 * 2 * np.pi * 0.1 * 0.05, rel=0.02
    )
    assert any("delay" in w for w in raw.warnings)
    assert not any("delay" in w for w in mended.warnings)


def test_comparison_with_the_isotherm() -> None:
    film = volmer_trace(np.random.default_rng(6), top=35.0)
    isotherm = analyse(film)
    area = 0.38 + 0.01380649 * 295 / 25.0
    modulus = area * 25.0**2 / (0.01380649 * 295)
    trace = oscillating_trace(
        np.random.default_rng(7), [(0.05, 0.01, 12)], elastic=modulus, viscous=0.0
    )
    (segment,) = analyse_oscillation(trace, isotherm=isotherm).segments
    compared = segment.quasi_static
    assert compared is not None
    assert compared.ratio.u is not None
    assert abs(compared.ratio.value - 1.0) < 3 * compared.ratio.u
    elsewhere = replace(trace, pressure=trace.pressure + 60.0)
    assert analyse_oscillation(elsewhere, isotherm=isotherm).segments[0].quasi_static is None


def test_flags() -> None:
    rng = np.random.default_rng(8)
    sparse = oscillating_trace(rng, [(0.1, 0.15, 15)], rate=0.5, area_noise=0.0)
    said = " ".join(analyse_oscillation(sparse).segments[0].flags)
    assert "readings a period" in said
    assert "15 %" in said
    deaf = oscillating_trace(rng, [(0.1, 0.005, 15)], elastic=0.0, viscous=0.0)
    assert any("does not follow" in f for f in analyse_oscillation(deaf).segments[0].flags)
    drifting = oscillating_trace(rng, [(0.02, 0.005, 6)])
    assert drifting.time is not None
    lost = replace(drifting, pressure=drifting.pressure - 0.004 * drifting.time)
    assert any("drifts" in f for f in analyse_oscillation(lost).segments[0].flags)


def test_refusals() -> None:
    rng = np.random.default_rng(9)
    trace = oscillating_trace(rng, [(0.1, 0.01, 10)])
    with pytest.raises(UpstrokeError, match="no time"):
        analyse_oscillation(replace(trace, time=None))
    still = replace(trace, area=0.6 * np.exp(rng.normal(0, 1e-4, len(trace.area))))
    with pytest.raises(UpstrokeError, match="no oscillation"):
        analyse_oscillation(still)
    holes = trace.pressure.copy()
    holes[::50] = np.nan
    assert any(
        "left out" in w for w in analyse_oscillation(replace(trace, pressure=holes)).warnings
    )


def test_json_rows_and_figure_agree() -> None:
    result = analyse_oscillation(oscillating_trace(np.random.default_rng(10), STEPS))
    data = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert data["schema"] == "upstroke.oscillation/1"
    assert [r["storage"] for r in result.rows()] == [
        s["storage"]["value"] for s in data["segments"]
    ]
    figure = figure_oscillation(result)
    figure.draw_without_rendering()
    drawn = figure.axes[3].containers[0].lines[0]  # type: ignore[attr-defined]
    np.testing.assert_allclose(
        np.asarray(drawn.get_ydata(), dtype=float), [s.storage.value for s in result.segments]
    )
