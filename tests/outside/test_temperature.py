"""Lines with two errors, Clapeyron units and published transitions."""

import os
from pathlib import Path

import lmfit
import numpy as np
import pytest
from scipy import stats
from series_films import Lipid, result_of, sheet_of

from isotherm.analysis import analyse
from isotherm.source import Source
from isotherm.temperature import analyse_temperature
from isotherm.temperature_line import fit_straight_line
from isotherm.trace import Trace


def test_pearsons_data_with_yorks_weights() -> None:
    """The standard example of lines with errors in both coordinates (Pearson 1901, weights of York 1966;
    data and result as reviewed by York et al. 2004, from memory): slope -0.48053, intercept 5.47991,
    standard errors 0.0580 and 0.2950."""
    x = np.array([0.0, 0.9, 1.8, 2.6, 3.3, 4.4, 5.2, 6.1, 6.5, 7.4])
    y = np.array([5.9, 5.4, 4.4, 4.6, 3.5, 3.7, 2.8, 2.8, 2.4, 1.5])
    wx = np.array([1000.0, 1000, 500, 800, 200, 80, 60, 20, 1.8, 1])
    wy = np.array([1.0, 1.8, 4, 8, 20, 20, 70, 70, 100, 500])
    line = fit_straight_line(x, y, wy**-0.5, wx**-0.5)
    assert line.slope == pytest.approx(-0.480533, abs=2e-6)
    at_zero = line.at(0.0, "1")
    assert at_zero.value == pytest.approx(5.479910, abs=1e-5)
    assert line.u_slope / line.inflated == pytest.approx(0.0580, abs=2e-4)
    assert at_zero.u is not None
    assert at_zero.u / line.inflated == pytest.approx(0.2950, abs=1e-3)


def test_line_against_lmfit_and_scipy_stats() -> None:
    rng = np.random.default_rng(3)
    x = np.linspace(290, 310, 8)
    u = rng.uniform(0.05, 0.3, 8)
    y = 1.3 * (x - 300) + rng.normal(0, u)
    line = fit_straight_line(x, y, u)
    model = lmfit.models.LinearModel()
    fit = model.fit(y, x=x - line.pivot, weights=1 / u, slope=1, intercept=0, scale_covar=False)
    assert line.slope == pytest.approx(fit.params["slope"].value, rel=1e-6)
    assert line.u_slope / line.inflated == pytest.approx(fit.params["slope"].stderr, rel=1e-4)
    assert line.chi2 == pytest.approx(fit.chisqr, rel=1e-6)
    # equal points: ordinary least squares, whose interval scipy knows
    plain = fit_straight_line(x, y, np.zeros(8))
    ols = stats.linregress(x, y)
    assert plain.slope == pytest.approx(ols.slope, rel=1e-9)
    assert plain.u_slope == pytest.approx(ols.stderr, rel=1e-9)
    assert plain.factor == pytest.approx(stats.t.ppf(0.975, 6), rel=1e-9)
    # the robust slope of the same points agrees
    robust = stats.theilslopes(y, x)
    assert robust.low_slope < line.slope < robust.high_slope


def test_unit_of_the_clapeyron_relation() -> None:
    """1 mN/m/K × 1 Å² × 298.15 K × N_A = 1.796 kJ/mol (arithmetic)."""
    results, sheets = [], []
    for celsius in (24.0, 25.0, 26.0):
        lipid = Lipid(
            transition=10 + (celsius - 25), gap=0.01, plateau=0.1, kelvin=celsius + 273.15
        )
        results.append(result_of(lipid, name=f"{celsius}"))
        sheets.append(sheet_of({"a": 1.0}, celsius=celsius))
    middle = analyse_temperature(results, sheets).runs[1]
    assert middle.heat is not None
    assert middle.heat.enthalpy.value == pytest.approx(1796.0, rel=1e-3)


def test_published_dppc_at_two_temperatures() -> None:
    """DPPC at 294 K (Shapovalov, doi 10.1016/S0040-6090(98)00721-4) and 298 K (Lee, Lin & Chang, doi
    10.1016/j.jcis.2005.09.050; Mansour & Zografi, doi 10.1021/la063053o). The transition rises by 1.2 to
    1.5 mN/m/K (general literature, from memory). Three laboratories and four kelvin apart, with onsets
    read to 2 mN/m: only sign and size are checked, 0.7 to 2.5 mN/m/K."""
    beside = Path(__file__).resolve().parents[3] / "shared" / "data" / "published-isotherms"
    folder = Path(os.environ.get("UPSTROKE_PUBLISHED_ISOTHERMS", beside))
    files = {
        "DPPC_isotherm_Shapovalov1998.csv": 294.0,
        "DPPC_isotherm_LeeLinChang2006.csv": 298.0,
        "DPPC_isotherm_MansourZografi2007.csv": 298.0,
    }
    if not all((folder / f).is_file() for f in files):
        pytest.skip("published isotherms are not here (UPSTROKE_PUBLISHED_ISOTHERMS)")
    results, sheets = [], []
    for name, kelvin in files.items():
        data = np.loadtxt(folder / name, delimiter=",", comments="#")
        data = data[np.argsort(-data[:, 0], kind="stable")]
        source = Source(name, name, len(data))
        results.append(analyse(Trace(area=data[:, 0] / 100, pressure=data[:, 1], source=source)))
        sheets.append(sheet_of({"DPPC": 1.0}, celsius=kelvin - 273.15))
    result = analyse_temperature(results, sheets)
    assert result.slope is not None
    assert 0.7 < result.slope.value < 2.5
    for run in result.runs:
        assert run.heat is not None
        # tens of kJ/mol taken up from condensed to expanded (general literature, from memory)
        assert 15e3 < run.heat.enthalpy.value < 120e3
