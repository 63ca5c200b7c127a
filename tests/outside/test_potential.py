"""The unit of the effective dipole moment."""

import numpy as np
import pytest
from scipy import constants, stats
from series_traces import volmer_trace, with_potential

from isotherm.analysis import analyse
from isotherm.potential import MILLIDEBYE_PER_MV_NM2, analyse_potential


def test_helmholtz_factor() -> None:
    """ΔV/mV = 37.67 (μ/mD)/(A/Å²) (arithmetic); ε0 from scipy.constants, 1 D = 3.33564e-30 C m."""
    assert pytest.approx(37.67, abs=0.005) == 100.0 / MILLIDEBYE_PER_MV_NM2
    debye = 3.33564e-30
    assert (
        pytest.approx(constants.epsilon_0 * 1e-18 * 1e-3 / (debye * 1e-3), rel=1e-5)
        == MILLIDEBYE_PER_MV_NM2
    )


def test_noise_of_the_moment_against_plain_statistics() -> None:
    """Before the onset the potential is noise alone: its standard deviation by scipy.stats."""
    rng = np.random.default_rng(2)
    result = analyse_potential(
        analyse(with_potential(volmer_trace(rng), rng, onset=1.2, noise=6.0))
    )
    before = result.potential[result.area > 1.25]
    spread = float(stats.tstd(before))
    assert result.noise == pytest.approx(spread, rel=0.5)
