"""Student's t and Welch-Satterthwaite against general libraries and the GUM."""

import math

import numpy as np
import pytest
from scipy import stats
from series_films import Lipid, result_of

from isotherm.replicates import analyse_replicates
from isotherm.series import effective_freedom, student_factor, two_sided_p


@pytest.mark.parametrize("freedom", [1, 2, 3.5, 7, 30, 200])
def test_student_factor_and_p_against_scipy_stats(freedom: float) -> None:
    assert student_factor(freedom) == pytest.approx(stats.t.ppf(0.975, freedom), rel=1e-9)
    assert two_sided_p(-2.2, 1.0, freedom) == pytest.approx(2 * stats.t.sf(2.2, freedom), rel=1e-9)


def test_student_factor_against_the_gum_table() -> None:
    """JCGM 100:2008, table G.2, p = 95 % (from memory): 12.71, 4.30, 2.78, 2.23, 1.960."""
    for freedom, t in ((1, 12.71), (2, 4.30), (4, 2.78), (10, 2.23), (math.inf, 1.960)):
        assert student_factor(freedom) == pytest.approx(t, abs=0.005)


def test_effective_freedom_against_the_welch_t_test() -> None:
    """The same formula gives scipy's unequal-variance t test its degrees of freedom."""
    rng = np.random.default_rng(4)
    a, b = rng.normal(size=5), rng.normal(scale=3, size=9)
    parts = [(x.std(ddof=1) / math.sqrt(len(x)), len(x) - 1.0) for x in (a, b)]
    assert effective_freedom(parts) == pytest.approx(
        stats.ttest_ind(a, b, equal_var=False).df, rel=1e-9
    )


def test_feature_interval_against_scipy_stats() -> None:
    rng = np.random.default_rng(5)
    collapses = 60 + rng.normal(0, 0.5, 6)
    runs = [result_of(Lipid(collapse=float(c)), name=f"{i}") for i, c in enumerate(collapses)]
    f = analyse_replicates(runs).feature("collapse_pressure")
    assert f is not None
    low, high = stats.t.interval(0.95, 5, collapses.mean(), stats.sem(collapses))
    assert f.interval == pytest.approx((low, high), rel=1e-9)
    chi = stats.chi2(5)
    s = collapses.std(ddof=1)
    assert f.repeatability_s_interval == pytest.approx(
        (s * math.sqrt(5 / chi.ppf(0.975)), s * math.sqrt(5 / chi.ppf(0.025))), rel=1e-9
    )


def test_repeatability_limit_is_the_difference_exceeded_in_one_case_of_twenty() -> None:
    """ISO 5725-6:1994 (from memory): |difference of two results| stays below 2.8 s_r in 95 %."""
    rng = np.random.default_rng(6)
    a, b = rng.normal(size=(2, 40000))
    assert np.mean(np.abs(a - b) < 2.8) == pytest.approx(0.95, abs=0.005)
