"""Fluid films against general libraries, closed forms and physics."""

import lmfit
import numpy as np
import pytest
from scipy import stats
from series_traces import volmer_trace

from isotherm.analysis import analyse
from isotherm.constants import BOLTZMANN_MN_NM
from isotherm.fluid import analyse_fluid
from isotherm.fluid_fit import fit_volmer, runs_test
from isotherm.series import area_against_pressure


@pytest.mark.parametrize("free", [False, True])
def test_fit_and_covariance_against_lmfit(free: bool) -> None:
    rng = np.random.default_rng(1)
    thermal = 4.08
    area = np.linspace(1.2, 0.55, 80)
    sigma = np.linspace(0.02, 0.1, 80)
    pressure = 1.1 * thermal / (area - 0.37) - 4.0 + rng.normal(0, sigma)

    def volmer(x, omega, cohesion, factor):  # type: ignore[no-untyped-def]
        return factor * thermal / (x - omega) - cohesion

    model = lmfit.Model(volmer)
    parameters = model.make_params(omega=0.3, cohesion=3.0, factor=1.0)
    parameters["factor"].vary = free
    fit = model.fit(pressure, parameters, x=area, weights=1 / sigma, scale_covar=False)
    own = fit_volmer(area, pressure, sigma, thermal, free_factor=free)
    assert own.co_area == pytest.approx(fit.params["omega"].value, rel=1e-4)
    assert own.cohesion == pytest.approx(fit.params["cohesion"].value, rel=1e-3)
    assert own.chi2 == pytest.approx(fit.chisqr, rel=1e-6)
    birge = max(1.0, fit.redchi) ** 0.5
    assert own.covariance[0, 0] ** 0.5 == pytest.approx(
        fit.params["omega"].stderr * birge, rel=0.02
    )


def test_ideal_gas_constant() -> None:
    """Π A = kT = 4.114 mN/m nm² at 298 K (physics)."""
    assert pytest.approx(4.114, abs=5e-4) == BOLTZMANN_MN_NM * 298.0


def test_a_gas_of_points_through_the_whole_path() -> None:
    """A film without co-area or cohesion goes to Π A = kT (physics)."""
    trace = volmer_trace(
        np.random.default_rng(2), omega=0.0, cohesion=0.0, start=4.0, top=8.0, kelvin=298.0
    )
    result = analyse_fluid(trace, analyse(trace))
    ratio = result.gaseous
    assert ratio is not None
    assert ratio.ratio.u is not None
    assert abs(ratio.ratio.value - 1.0) < 2 * ratio.ratio.u
    omega = result.whole.co_area
    assert omega.u is not None
    assert abs(omega.value) < 3 * omega.u


def test_modulus_of_a_volmer_film_against_its_closed_form() -> None:
    """-A dΠ/dA = A kT/(A - ω)² (calculus): the softness the series use is A over it."""
    trace = volmer_trace(np.random.default_rng(3), noise=0.02, rows=6000)
    read = area_against_pressure(analyse(trace).headline, np.array([5.0, 10.0, 20.0]))
    closed = (read.area - 0.38) ** 2 / (BOLTZMANN_MN_NM * 295.0)
    np.testing.assert_allclose(read.softness, closed, rtol=0.05)


def test_runs_test_against_exact_counts() -> None:
    """Wald-Wolfowitz: the exact distribution by counting (combinatorics), 12 signs, 6 of each."""
    from itertools import combinations

    counts = []
    for up in combinations(range(12), 6):
        signs = np.full(12, -1.0)
        signs[list(up)] = 1.0
        counts.append(1 + int(np.count_nonzero(np.diff(signs))))
    few = np.array(counts)
    residual = np.array([1.0] * 5 + [-1.0] * 6 + [1.0])  # three runs
    exact = 2 * np.mean(few <= 3)
    assert runs_test(residual) == pytest.approx(exact, rel=0.5)
    # the normal form against scipy's normal distribution, worked by hand
    z = (7 - 3 - 0.5) / np.sqrt(6 * 5 / 11)
    assert runs_test(residual) == pytest.approx(2 * stats.norm.sf(z), rel=1e-9)
