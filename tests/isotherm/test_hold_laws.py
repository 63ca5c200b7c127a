"""The laws of film loss, their fit and their averages, each against its own definition."""

from __future__ import annotations

import numpy as np
import pytest

from isotherm.hold_average import law_loss, law_rate, law_weights, mean_loss
from isotherm.hold_blocks import block_means, spikes
from isotherm.hold_fit import aicc, fit_laws
from isotherm.hold_laws import choose_law, law_results
from isotherm.hold_models import LAWS, growth, growth_rate, nucleation_type
from isotherm.hold_noise import noise_grid
from isotherm.hold_settling import settled_after

TAU, X = np.array([900.0]), np.array([2.5])


@pytest.mark.parametrize("name", list(LAWS))
def test_growth_rate_is_the_derivative(name: str) -> None:
    t = np.array([200.0, 1500.0, 4000.0])
    step = 1e-2
    slope = (growth(name, t + step, TAU, X) - growth(name, t - step, TAU, X)) / (2 * step)
    assert growth_rate(name, t, TAU, X) == pytest.approx(slope, rel=1e-5, abs=1e-12)
    assert growth(name, np.zeros(1), TAU, X)[0, 0] == 0.0


def test_half_of_the_change_at_the_half_time() -> None:
    assert growth("nucleation", TAU, TAU, X)[0, 0] == pytest.approx(0.5)
    assert "progressive" in nucleation_type(2.6)
    assert "instantaneous" in nucleation_type(1.4)


def synthetic(
    name: str, noise: float = 1e-3, seed: int = 0, n: int = 4000
) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    t = np.linspace(0.0, 7200.0, n)
    g = growth(name, t, np.array([2000.0]), X)[:, 0]
    size = max(float(g[-1]), 1e-300)
    return t, 50.0 * (1.0 - 0.12 * g / size) + 50.0 * noise * rng.normal(size=n)


@pytest.mark.parametrize("name", list(LAWS))
def test_truth_of_every_law_lies_within_its_uncertainty(name: str) -> None:
    t, y = synthetic(name)
    fits = {fit.name: fit for fit in fit_laws(block_means(t, y, 96))}
    loss = law_loss(fits[name], 7200.0)
    truth = 0.0 if name == "constant" else 0.12
    assert abs(loss.value - truth) <= 4.0 * loss.u + 1e-12
    rate = law_rate(fits[name], 3600.0)
    g = growth(name, np.array([3600.0]), np.array([2000.0]), X)[0, 0]
    slope = growth_rate(name, np.array([3600.0]), np.array([2000.0]), X)[0, 0]
    end = growth(name, np.array([7200.0]), np.array([2000.0]), X)[0, 0] or 1.0
    expected = truth / end * slope / (1.0 - truth / end * g)
    assert abs(rate.value - expected) <= 4.0 * rate.u + 1e-12


def test_average_over_the_laws_is_weighted_and_holds_their_disagreement() -> None:
    t, y = synthetic("dissolution", noise=1e-2, n=300)
    fits = fit_laws(block_means(t, y, 96))
    weights = law_weights(fits)
    losses = [law_loss(fit, 20000.0) for fit in fits]
    mean = sum(w * loss.value for w, loss in zip(weights, losses, strict=True))
    variance = sum(
        w * (loss.u**2 + (loss.value - mean) ** 2) for w, loss in zip(weights, losses, strict=True)
    )
    found = mean_loss(fits, 20000.0)
    assert found.value == pytest.approx(mean)
    assert found.u == pytest.approx(variance**0.5)


def test_correlated_noise_widens_u() -> None:
    t, y = synthetic("dissolution")
    rng = np.random.default_rng(7)
    steps = rng.normal(size=t.size)
    wander = np.convolve(steps, np.exp(-np.arange(1500) / 300.0), mode="full")[: t.size]
    wander *= 0.05 / wander.std()
    white = {f.name: f for f in fit_laws(block_means(t, y, 96))}["dissolution"]
    slow = {f.name: f for f in fit_laws(block_means(t, y + wander, 96))}["dissolution"]
    assert law_loss(slow, 7200.0).u > 2.0 * law_loss(white, 7200.0).u
    assert slow.effective < white.effective


def test_effective_number_is_that_of_independent_blocks_without_correlation() -> None:
    grid = noise_grid(np.arange(50.0))
    independent = (grid.share == 0) & (grid.short == 0)
    assert grid.effective[independent] == pytest.approx(50.0)
    assert grid.effective.min() > 0
    assert grid.effective.max() <= 50.0 + 1e-6


def test_a_film_cannot_lose_more_than_all_of_itself() -> None:
    rng = np.random.default_rng(3)
    t = np.linspace(0.0, 3600.0, 2000)
    y = 100.0 * np.exp(-t / 3000.0) + 0.05 * rng.normal(size=t.size)
    fits = {fit.name: fit for fit in fit_laws(block_means(t, y, 96))}
    for name in ("relaxation", "nucleation"):
        part = fits[name].drop / fits[name].level
        assert np.all(part <= 1.0 + 1e-9)
        assert np.all(part >= (0.0 if name == "nucleation" else -np.inf))
    assert law_loss(fits["relaxation"], 1e6).value <= 1.0 + 1e-9


def test_choice_prefers_the_simpler_of_equals_and_no_loss_within_u() -> None:
    t, y = synthetic("constant")
    fits = fit_laws(block_means(t, y, 96))
    assert choose_law(fits, 7200.0).name == "constant"
    t, y = synthetic("dissolution")
    chosen = choose_law(fit_laws(block_means(t, y, 96)), 7200.0)
    assert chosen.name == "dissolution"


def test_parameters_in_their_units() -> None:
    t, y = synthetic("desorption")
    laws = {law.name: law for law in law_results(fit_laws(block_means(t, y, 96)), 7200.0, "cm^2")}
    k = laws["desorption"].parameters["k"]
    assert k.unit == "s^-0.5"
    assert k.value == pytest.approx(0.12 / 7200.0**0.5, abs=4 * (k.u or 0))
    assert laws["nucleation"].remark
    assert laws["constant"].parameters["y0"].unit == "cm^2"


def test_small_sample_term_does_not_change_sign() -> None:
    assert aicc(10.0, 5, 6.0) == pytest.approx(10.0 + 10.0 + 60.0)
    assert aicc(10.0, 5, 3.0) == aicc(10.0, 5, 7.0 - 1.0)


def test_spikes_are_marked_and_steps_are_not() -> None:
    rng = np.random.default_rng(4)
    y = 0.1 * rng.normal(size=5000)
    y[1234] += 5.0
    assert np.flatnonzero(spikes(y)).tolist() == [1234]
    assert not spikes(np.round(y[:1000], 1)).any()
    assert not spikes(np.full(200, 3.0)).any()


def test_settling_needs_a_start_unlike_the_rest() -> None:
    rng = np.random.default_rng(5)
    t = np.arange(4000.0)
    flat = 30.0 + 0.05 * rng.normal(size=t.size)
    assert settled_after(t, flat) == 0.0
    assert settled_after(t, np.full(t.size, 30.0)) == 0.0
    # exp(-t/100 s): one per cent left after 460 s, below the scatter of a mean
    found = settled_after(t, flat + 2.0 * np.exp(-t / 100.0))
    assert 300.0 < found < 800.0
    knocked = flat.copy()
    knocked[2000:2100] += 1.0
    assert settled_after(t, knocked) == 0.0
