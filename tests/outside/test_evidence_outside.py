"""Evidence against values and libraries from outside the project."""

import math
import warnings

import lmfit
import numpy as np
import pytest

from isotherm.constants import AVOGADRO
from isotherm.quantity import Quantity
from transfer.evidence_capacitance import ELASTANCE_PER_NM
from transfer.evidence_fit import fit_line
from transfer.evidence_joint import Member, combine
from transfer.evidence_optical import SURFACE_DENSITY
from transfer.evidence_resonator import mass_sensitivity
from transfer.expected import contraction


def test_sauerbrey_constant_of_a_5_mhz_crystal():
    # Sauerbrey, Z. Phys. 1959, 155, 206, with density 2.648 g/cm^3 and shear modulus 2.947e11
    # g/(cm s^2) of AT-cut quartz: 17.7 ng/(cm^2 Hz) (derived)
    assert 1e9 / mass_sensitivity(5e6) == pytest.approx(17.7, abs=0.05)
    # 10 MHz: a quarter, 4.42 (common practice, from memory)
    assert 1e9 / mass_sensitivity(10e6) == pytest.approx(4.42, abs=0.01)
    # the n-th overtone shifts n times as much
    assert mass_sensitivity(5e6, 3) == pytest.approx(3 * mass_sensitivity(5e6))


def test_close_packed_chains():
    # Slowinski et al., dodecanethiol on mercury: 20.3 Å^2 per chain is 8.18e-10 mol/cm^2 (derived)
    assert pytest.approx(8.18e-10, rel=1e-3) == SURFACE_DENSITY / 0.203


def test_full_redox_layer_is_within_reach_of_its_area():
    # Langmuir 2004, 20, 4147: a full ferrocene-carboxylate layer is about 3e-10 mol/cm^2; that is the
    # area of a sphere of a little over 0.6 nm, hexagonally packed
    area = SURFACE_DENSITY / 3e-10
    diameter = math.sqrt(area * 2 / math.sqrt(3))
    assert 0.6 < diameter < 0.9


def test_capacitance_of_n_alkyl_layers_is_inverse_to_thickness():
    # Yu et al., J. Phys. Chem. B 2000, 104, 11157: n-alkyl layers on silicon, relative permittivity
    # 3.3 ± 0.6, 1/C proportional to thickness. A layer of 2 nm is then about 1.46 µF/cm^2.
    thickness = np.array([1.0, 1.5, 2.0, 2.5])
    elastance = ELASTANCE_PER_NM * thickness / 3.3
    assert np.ptp(elastance / thickness) == pytest.approx(0.0, abs=1e-15)
    assert 1 / elastance[2] == pytest.approx(1.46, abs=0.01)
    # and their u of 0.6 is what a layer count by capacitance inherits: 18 %
    assert pytest.approx(0.18, abs=0.005) == 0.6 / 3.3
    slope = fit_line(thickness, elastance, np.eye(4) * 1e-6, np.zeros((4, 4)))
    assert ELASTANCE_PER_NM / slope.slope == pytest.approx(3.3, rel=1e-9)
    assert slope.intercept == pytest.approx(0.0, abs=1e-9)


def test_parallel_plate_capacitance_in_other_units():
    # C/A = ε0 ε_r / d: 8.854 pF/m, so 1 nm of vacuum is 0.8854 µF/cm^2 (arithmetic)
    assert pytest.approx(0.8854, abs=1e-4) == 1 / ELASTANCE_PER_NM


def test_cadmium_arachidate_contracts_on_the_substrate():
    # Kenn, Möhwald & Tippmann-Krayer, Thin Solid Films 1992, doi 10.1016/0040-6090(92)90346-D:
    # 0.197 nm^2 per chain in the monolayer on water, 0.182 nm^2 in multilayers.
    found = contraction(
        Quantity(0.197, None, "nm^2"), Quantity(0.182, None, "nm^2"), Quantity(1.0, 0.01, "1")
    )
    # a substrate wholly covered takes 8.2 % more film than its area (derived)
    assert found.ratio.value == pytest.approx(1.0824, abs=1e-4)
    # and a transfer ratio of 1 covers 92.4 % of it (derived)
    assert found.covered.value == pytest.approx(0.9239, abs=1e-4)
    assert found.covered.u == pytest.approx(0.00924, abs=1e-4)


def test_mass_of_a_lead_stearate_layer_from_its_lattice():
    # Lead stearate lattice, J. Appl. Cryst.: 4.96 x 7.38 Å holds two chains, layer pair 47 Å. Two
    # layers' mass over the pair's thickness is a density; the salt's is near that of its crystals,
    # 1.3-1.5 g/cm^3 (memory).
    area = 0.496 * 0.738 / 2
    molar_mass = (774.5) / 2  # g/mol per chain: Pb(C18H35O2)2 is 774.5
    per_layer = molar_mass / AVOGADRO / (area * 1e-14)  # g/cm^2
    density = 2 * per_layer / 47e-8
    assert 1.2 < density < 1.6


def line_with_noise(seed):
    rng = np.random.default_rng(seed)
    true = np.sort(rng.uniform(0, 20, 12))
    u_x, u_y = rng.uniform(0.05, 0.4, 12), rng.uniform(0.1, 1.0, 12)
    x = true + rng.normal(0, u_x)
    y = 2.0 - 1.7 * true + rng.normal(0, u_y)
    return x, y, u_x, u_y


@pytest.mark.parametrize("seed", range(8))
def test_line_with_errors_in_both_against_scipy_odr(seed):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # announced to leave scipy for a package of its own
        odr = pytest.importorskip("scipy.odr")
    x, y, u_x, u_y = line_with_noise(seed)
    model = odr.Model(lambda b, at: b[0] + b[1] * at)
    found = odr.ODR(odr.RealData(x, y, sx=u_x, sy=u_y), model, beta0=[0.0, -1.0]).run()
    ours = fit_line(x, y, np.diag(u_y**2), np.diag(u_x**2))
    np.testing.assert_allclose(ours.parameters, found.beta, rtol=1e-5)
    # cov_beta there is before scaling by the residual variance, as ours
    np.testing.assert_allclose(ours.covariance, found.cov_beta, rtol=1e-4)
    assert ours.chi_square == pytest.approx(found.sum_square, rel=1e-6)


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("hinge", [None, 9.0])
def test_line_with_errors_in_both_against_lmfit(seed, hinge):
    # lmfit minimises the residuals over effective errors (slope times u of x in quadrature)
    x, y, u_x, u_y = line_with_noise(seed)

    def residual(p):
        change = p["change"] if hinge is not None else 0.0
        local = p["slope"] + change * (x > (hinge or 0.0))
        line = p["intercept"] + p["slope"] * x + change * np.maximum(0, x - (hinge or 0.0))
        return (y - line) / np.sqrt(u_y**2 + (local * u_x) ** 2)

    start = lmfit.Parameters()
    start.add("intercept", 0.0)
    start.add("slope", -1.0)
    if hinge is not None:
        start.add("change", 0.1)
    found = lmfit.minimize(residual, start, scale_covar=False, ftol=1e-14, xtol=1e-14)
    ours = fit_line(x, y, np.diag(u_y**2), np.diag(u_x**2), hinge=hinge)
    theirs = np.array([p.value for p in found.params.values()])
    np.testing.assert_allclose(ours.parameters, theirs, rtol=3e-4, atol=3e-4)
    np.testing.assert_allclose(
        np.sqrt(np.diag(ours.covariance)), [p.stderr for p in found.params.values()], rtol=0.25
    )


def test_best_estimate_against_weighted_mean_of_uncertainties_package():
    # `uncertainties` carries the shared input through; the estimate's u must match linear propagation
    uncertainties = pytest.importorskip("uncertainties")
    d = uncertainties.ufloat(2.5, 0.05)
    rises = [uncertainties.ufloat(50.0, 0.4), uncertainties.ufloat(50.6, 0.6)]
    layers = [r / d for r in rises]
    members = [
        Member(str(n), q.nominal_value, 1.0, rises[n].std_dev / 2.5, np.zeros(1), {"d": -1.0})
        for n, q in enumerate(layers)
    ]
    found = combine(members, {"d": Quantity(2.5, 0.05, "nm")}, np.zeros((1, 1)), 20.0)
    covariance = np.array(uncertainties.covariance_matrix(layers))
    weights = np.linalg.solve(covariance, np.ones(2))
    weights /= weights.sum()
    mean = sum(w * q for w, q in zip(weights, layers, strict=True))
    # the package takes errors at the measured values, ours at the common one: a 1 % effect here
    assert found.value == pytest.approx(mean.nominal_value, rel=2e-3)
    assert found.u == pytest.approx(mean.std_dev, rel=2e-2)


def test_lack_of_fit_against_scipy_chi2():
    from scipy.stats import chi2

    from transfer.evidence_fit import lack_of_fit

    x, y, u_x, u_y = line_with_noise(3)
    fit = fit_line(x, y, np.diag(u_y**2), np.diag(u_x**2))
    assert lack_of_fit(fit) == pytest.approx(chi2.sf(fit.chi_square, fit.dof), rel=1e-10)
