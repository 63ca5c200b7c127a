"""Lossy linear elements against their closed forms, and the sine fit against lmfit."""

import lmfit
import numpy as np
import pytest
from series_traces import oscillating_trace

from isotherm.oscillation import analyse_oscillation
from isotherm.oscillation_fit import fit_sinusoid, refine_frequency

FREQUENCIES = (0.01, 0.03, 0.1)


def test_maxwell_element() -> None:
    """E* = E iωτ/(1 + iωτ) (linear viscoelasticity, textbook closed form), E = 80 mN/m, τ = 5 s."""
    steps = [(f, 0.01, 10) for f in FREQUENCIES]
    trace = oscillating_trace(
        np.random.default_rng(0), steps, elastic=80.0, relaxation=5.0, noise=0.01, rate=20.0
    )
    result = analyse_oscillation(trace)
    assert len(result.segments) == len(FREQUENCIES)
    for segment, frequency in zip(result.segments, FREQUENCIES, strict=True):
        x = 2j * np.pi * frequency * 5.0
        closed = 80.0 * x / (1 + x)
        assert segment.storage.value == pytest.approx(closed.real, abs=0.5)
        assert segment.loss.value == pytest.approx(closed.imag, abs=0.5)
        assert segment.phase.value == pytest.approx(np.degrees(np.angle(closed)), abs=0.6)


def test_kelvin_voigt_element() -> None:
    """E* = E + iωη (textbook closed form); a pure elastic film has no loss."""
    for viscous in (0.0, 50.0):
        trace = oscillating_trace(
            np.random.default_rng(1),
            [(f, 0.01, 10) for f in FREQUENCIES],
            viscous=viscous,
            rate=20.0,
        )
        for segment, frequency in zip(
            analyse_oscillation(trace).segments, FREQUENCIES, strict=True
        ):
            assert segment.storage.value == pytest.approx(60.0, abs=4 * (segment.storage.u or 0))
            assert segment.loss.value == pytest.approx(
                2 * np.pi * frequency * viscous, abs=4 * (segment.loss.u or 0) + 0.02
            )


def test_sine_fit_and_its_uncertainty_against_lmfit() -> None:
    rng = np.random.default_rng(2)
    time = np.arange(0, 120, 0.25)
    y = 3 + 0.8 * np.cos(0.5 * time) - 0.3 * np.sin(0.5 * time) + rng.normal(0, 0.05, len(time))
    omega = refine_frequency(time, y, 12.4)

    def wave(t, level, a, b, w):  # type: ignore[no-untyped-def]
        return level + a * np.cos(w * t) + b * np.sin(w * t)

    fit = lmfit.Model(wave).fit(y, t=time, level=3, a=1, b=0, w=0.5)
    own = fit_sinusoid(time, y, fit.params["w"].value)
    assert omega == pytest.approx(fit.params["w"].value, abs=3 * fit.params["w"].stderr)
    assert own.phasors[0].real == pytest.approx(fit.params["a"].value, abs=0.01)
    assert own.phasors[0].imag == pytest.approx(-fit.params["b"].value, abs=0.01)
    # with the frequency known: 2 σ²/n, as lmfit finds for the same points
    fixed = lmfit.Model(wave)
    parameters = fixed.make_params(level=3, a=1, b=0, w=fit.params["w"].value)
    parameters["w"].vary = False
    known = fixed.fit(y, parameters, t=time)
    assert own.u == pytest.approx(known.params["a"].stderr, rel=0.3)
