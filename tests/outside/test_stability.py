"""Film stability, cycles and checks against general libraries, published relations and closed forms."""

from __future__ import annotations

import math
from typing import Any

import lmfit
import numpy as np
import pytest
from scipy import stats
from uncertainties import ufloat, umath

from isotherm.check_fit import fit_bare
from isotherm.check_items import water_tension
from isotherm.check_plate import two_point_calibration, wilhelmy_tension
from isotherm.constants import BOLTZMANN_MN_NM
from isotherm.cycles import analyse_cycles
from isotherm.hold_average import law_loss
from isotherm.hold_blocks import block_means
from isotherm.hold_fit import aicc, fit_laws
from isotherm.hold_laws import law_results
from isotherm.hold_models import LAWS
from isotherm.hold_noise import noise_grid
from isotherm.hold_solve import solve_nodes, whiten_hold
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet, Subphase
from isotherm.source import Source
from isotherm.trace import Trace

# lmfit takes each mean at its mean time, which for sqrt(t) is only right away from 0
T = np.linspace(300.0, 7200.0, 5760)


def desorption(t: Any, y0: float, k: float) -> Any:
    return y0 * (1.0 - k * np.sqrt(t))


def dissolution(t: Any, y0: float, r: float) -> Any:
    return y0 * (1.0 - r * t)


def relaxation(t: Any, y0: float, L: float, tau: float) -> Any:
    return y0 * (1.0 - L * (1.0 - np.exp(-t / tau)))


def nucleation(t: Any, y0: float, L: float, t_half: float, x: float) -> Any:
    return y0 * (1.0 - L * (1.0 - np.exp(-math.log(2.0) * (np.maximum(t, 1e-9) / t_half) ** x)))


CASES: dict[str, tuple[Any, dict[str, float]]] = {
    "desorption": (desorption, {"y0": 50.0, "k": 1.2e-3}),
    "dissolution": (dissolution, {"y0": 50.0, "r": 1.4e-5}),
    "relaxation": (relaxation, {"y0": 50.0, "L": 0.12, "tau": 1800.0}),
    "nucleation": (nucleation, {"y0": 50.0, "L": 0.12, "t_half": 2600.0, "x": 2.5}),
}


@pytest.mark.parametrize("name", list(CASES))
def test_fits_and_uncertainties_against_lmfit(name: str) -> None:
    """Source: lmfit (Levenberg-Marquardt, covariance from the Jacobian), independent noise, same means."""
    law, true = CASES[name]
    rng = np.random.default_rng(11)
    y = law(T, **true) + 0.05 * rng.normal(size=T.size)
    blocks = block_means(T, y, 96)
    theirs = lmfit.Model(law).fit(blocks.level, lmfit.Model(law).make_params(**true), t=blocks.time)
    ours = next(one for one in law_results(fit_laws(blocks), 7200.0, "cm^2") if one.name == name)
    for key, parameter in theirs.params.items():
        found = ours.parameters[key]
        assert found.u is not None
        assert abs(found.value - parameter.value) < 0.8 * parameter.stderr
        # ours may be wider: it does not know that the noise is independent
        assert 0.85 * parameter.stderr < found.u < 2.5 * parameter.stderr


def test_deviance_and_criterion_against_lmfit() -> None:
    """Source: lmfit's AIC, N ln(chi2/N) + 2 k (sigma not counted), and the AICc of Hurvich & Tsai (1989)."""
    rng = np.random.default_rng(12)
    y = dissolution(T, 50.0, 1.4e-5) + 0.05 * rng.normal(size=T.size)
    blocks = block_means(T, y, 96)
    hold = whiten_hold(blocks, noise_grid(blocks.time))
    one = np.ones(1)
    nodes = solve_nodes(LAWS["dissolution"], hold, one, one, np.array([0]))
    fitted = lmfit.Model(dissolution).fit(blocks.level / hold.scale, t=blocks.time, y0=1.0, r=1e-5)
    assert nodes.deviance[0, 0] == pytest.approx(fitted.aic - 2 * 2, abs=1e-6)
    # worked by hand: k = 3, n = 20: 2 k = 6, 2 k (k + 1)/(n - k - 1) = 24/16 = 1.5
    assert aicc(100.0, 3, 20.0) == pytest.approx(107.5)
    assert aicc(100.0, 3, 1e12) == pytest.approx(106.0)


def test_correlated_fit_is_generalised_least_squares() -> None:
    """Source: Seber & Wild, Nonlinear Regression (1989), sec. 2.1.4: b = (X'C^-1 X)^-1 X'C^-1 y."""
    rng = np.random.default_rng(13)
    y = dissolution(T, 50.0, 1.4e-5) + 0.05 * rng.normal(size=T.size)
    blocks = block_means(T, y, 60)
    grid = noise_grid(blocks.time)
    j = int(np.flatnonzero((grid.share == 0.5) & (grid.short == 0.5))[3])
    lags = np.abs(blocks.time[:, None] - blocks.time)
    d = float(np.median(np.diff(blocks.time)))
    white = 0.5 * np.eye(60) + 0.5 * np.exp(-lags / d)
    cov = 0.5 * white + 0.5 * np.exp(-lags / grid.correlation_time[j])
    x = np.column_stack([np.ones(60), -blocks.time])
    weighted = np.linalg.solve(cov, x)
    expected = np.linalg.solve(x.T @ weighted, weighted.T @ blocks.level)
    one = np.ones(1)
    nodes = solve_nodes(LAWS["dissolution"], whiten_hold(blocks, grid), one, one, np.array([j]))
    scale = float(np.mean(blocks.level))
    assert nodes.level[0, 0] * scale == pytest.approx(expected[0], rel=1e-9)
    assert nodes.drop[0, 0] * scale == pytest.approx(expected[1], rel=1e-9)
    residual = blocks.level - x @ expected
    likelihood = 60 * math.log(residual @ np.linalg.solve(cov, residual) / 60)
    likelihood += np.linalg.slogdet(cov)[1]
    assert nodes.deviance[0, 0] == pytest.approx(likelihood - 120 * math.log(scale), abs=1e-6)
    effective = np.ones(60) @ np.linalg.solve(cov, np.ones(60))
    assert grid.effective[j] == pytest.approx(effective)


@pytest.mark.parametrize(
    ("growth", "progressive", "exponent"),
    [(1.5, False, 1.5), (2.0, False, 2.0), (1.5, True, 2.5), (2.0, True, 3.0)],
)
def test_exponents_follow_from_nucleation_and_growth(
    growth: float, progressive: bool, exponent: float
) -> None:
    """Source: Vollhardt & Retter, J. Phys. Chem. 1991, 95, 3723: convolution of nucleation with growth at
    the edge (hemisphere t^1.5, disc t^2), overlap after Avrami; the exponents from memory and derived."""
    t = np.linspace(0.0, 7200.0, 7201)
    rate = np.ones_like(t) if progressive else np.eye(1, t.size)[0]
    extended = np.convolve(rate, t**growth)[: t.size]
    extended *= math.log(2.0) / np.interp(3000.0, t, extended)
    rng = np.random.default_rng(14)
    y = 80.0 * (1.0 - 0.2 * -np.expm1(-extended)) + 0.02 * rng.normal(size=t.size)
    laws = {one.name: one for one in law_results(fit_laws(block_means(t, y, 96)), 7200.0, "cm^2")}
    found = laws["nucleation"].parameters
    assert found["x"].value == pytest.approx(exponent, abs=0.03)
    assert found["t_half"].value == pytest.approx(3000.0, rel=0.01)
    assert ("progressive" in laws["nucleation"].remark) == progressive
    assert ("disc" in laws["nucleation"].remark) == (growth == 2.0)


def test_loss_of_desorption_worked_by_hand() -> None:
    """k = 0.001 s^-0.5 over 4 h: sqrt(14400 s) = 120 s^0.5, so 12 % are lost."""
    rng = np.random.default_rng(15)
    y = desorption(T, 50.0, 1e-3) + 0.01 * rng.normal(size=T.size)
    fit = next(f for f in fit_laws(block_means(T, y, 96)) if f.name == "desorption")
    assert law_loss(fit, 14400.0).value == pytest.approx(0.12, abs=0.0005)


def test_work_on_an_ideal_gas() -> None:
    """Physics: a two-dimensional ideal gas, Pi A = kT, costs kT ln(A1/A2) to compress and gives it back."""
    kelvin = 298.15
    kt = BOLTZMANN_MN_NM * kelvin  # 4.116 mN/m nm^2
    down = np.linspace(40.0, 2.0, 4000)
    area = np.concatenate([down, down[::-1]])
    rng = np.random.default_rng(16)
    trace = Trace(
        area, kt / area + 0.001 * rng.normal(size=area.size), Source("gas", "", area.size),
        time=np.arange(area.size, dtype=float),
    )  # fmt: skip
    (cycle,) = analyse_cycles(trace, at=(1.0,)).cycles
    assert cycle.compression.work.value == pytest.approx(kt * math.log(20.0), rel=2e-3)
    assert cycle.hysteresis is not None
    assert cycle.hysteresis.u is not None
    assert abs(cycle.hysteresis.value) < 4.0 * cycle.hysteresis.u


def test_plate_worked_by_hand_and_against_uncertainties() -> None:
    """Source: Wilhelmy, Ann. Phys. 1863, 195, 177; hand: a plate 19.9 mm × 0.2 mm has P = 40.2 mm, and
    2.9243 mN / 40.2 mm = 72.74 mN/m. Propagation: the package `uncertainties`."""
    plain = wilhelmy_tension(Quantity(2.9243, None, "mN"), Quantity(40.2, None, "mm"))
    assert plain.value == pytest.approx(72.74, abs=0.01)
    assert plain.u is None
    found = wilhelmy_tension(
        Quantity(2.60, 0.01, "mN"), Quantity(40.2, 0.1, "mm"), Quantity(25.0, 1.0, "1")
    )
    theirs = 1000.0 * ufloat(2.60, 0.01) / ufloat(40.2, 0.1)
    theirs = theirs / umath.cos(ufloat(25.0, 1.0) * math.pi / 180.0)
    assert found.value == pytest.approx(theirs.nominal_value)
    assert found.u == pytest.approx(theirs.std_dev, rel=1e-3)


def test_plate_near_zero_angle_against_sampling() -> None:
    """Source: JCGM 101:2008 (sampling); first order gives the angle no share at 0 degrees."""
    found = wilhelmy_tension(
        Quantity(2.9243, 0.0, "mN"), Quantity(40.2, 0.0, "mm"), Quantity(0.0, 8.0, "1")
    )
    rng = np.random.default_rng(17)
    drawn = 72.74 / np.cos(np.radians(8.0) * rng.normal(size=200_000))
    assert found.u == pytest.approx(float(np.std(drawn)), rel=0.1)


def test_two_point_calibration_against_uncertainties() -> None:
    """Source: the package `uncertainties`."""
    low, high = ufloat(0.3, 0.05), ufloat(71.9, 0.08)
    true_low, true_high = ufloat(0.0, 0.02), ufloat(72.7, 0.1)
    gain = (true_high - true_low) / (high - low)
    offset = true_low - gain * low
    found = two_point_calibration(
        *(Quantity(v.nominal_value, v.std_dev, "mN/m") for v in (low, true_low, high, true_high))
    )
    assert found.gain.value == pytest.approx(gain.nominal_value)
    assert found.gain.u == pytest.approx(gain.std_dev)
    assert found.offset.value == pytest.approx(offset.nominal_value)
    assert found.offset.u == pytest.approx(offset.std_dev)


def test_drift_against_a_straight_line() -> None:
    """Source: scipy.stats.linregress, independent noise."""
    rng = np.random.default_rng(18)
    t = np.arange(0.0, 3600.0, 37.5)
    pressure = 0.1 + 0.25 * t / 3600.0 + 0.02 * rng.normal(size=t.size)
    line = stats.linregress(t / 3600.0, pressure)
    drift = fit_bare(t, None, pressure, timed=True).drift
    assert drift is not None
    assert drift.u is not None
    assert abs(drift.value - line.slope) < 0.35 * line.stderr
    assert 0.85 * line.stderr < drift.u < 2.0 * line.stderr


def test_water_against_iapws() -> None:
    """Source: the package `iapws`, its R1-76(2014)."""
    from iapws._iapws import _Tension

    sheet = RunSheet(subphase=Subphase(temperature=Quantity(20.0, 0.5, "degC")))
    water = water_tension(sheet, None)
    assert water is not None
    assert water.value == pytest.approx(1000.0 * _Tension(293.15), abs=1e-4)
    slope = 1000.0 * (_Tension(293.65) - _Tension(292.65))
    assert water.u == pytest.approx(abs(0.5 * slope), rel=1e-3)
