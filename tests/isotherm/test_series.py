"""Area against pressure and the small statistics every series shares."""

import math

import numpy as np
import pytest
from series_films import Lipid, result_of

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.result import Collapse
from isotherm.series import (
    area_against_pressure,
    effective_freedom,
    pressure_range,
    quantity_cells,
    random_part,
    run_names,
    spoken,
    student_factor,
    two_sided_p,
)

PRESSURES = np.array([2.0, 5.0, 9.0, 15.0, 30.0, 50.0])


def test_area_of_an_exact_film_is_read_back() -> None:
    lipid = Lipid()
    read = area_against_pressure(result_of(lipid).headline, PRESSURES)
    np.testing.assert_allclose(read.area, lipid.area(PRESSURES), rtol=5e-4)


@pytest.mark.parametrize("seed", range(4))
def test_noise_leaves_the_area_within_its_uncertainty(seed: int) -> None:
    lipid = Lipid()
    result = result_of(lipid, noise=0.1, rng=np.random.default_rng(seed))
    read = area_against_pressure(result.headline, PRESSURES)
    pull = (read.area - lipid.area(PRESSURES)) / read.u_random
    assert np.abs(pull).max() < 4.0
    assert (read.u_random < 0.02 * read.area).all()


def test_no_area_outside_the_range_or_past_collapse() -> None:
    branch = result_of(Lipid(collapse=45.0)).headline
    low, high = pressure_range(branch)
    assert high == pytest.approx(45.0, abs=0.01)
    read = area_against_pressure(branch, np.array([low - 0.2, high + 0.5]))
    assert np.isnan(read.area).all()
    assert np.isnan(read.u_random).all()


def test_area_past_a_constant_pressure_collapse_is_not_read() -> None:
    result = result_of(Lipid(collapse=60.0))
    branch = result.headline
    earlier = Collapse("constant-pressure", Quantity(0.45, 0.001, "nm^2"), branch.highest_pressure)
    cut = type(branch)(**{**branch.__dict__, "collapse": earlier})
    _, high = pressure_range(cut)
    expected = np.interp(-0.45, -branch.curve.area, branch.curve.pressure)
    assert high == pytest.approx(expected, abs=0.6)
    assert high < 50.0


def test_too_short_a_curve_is_refused() -> None:
    branch = result_of(Lipid(), points=300).headline
    curve = branch.curve
    two = type(curve)(
        *(getattr(curve, n)[:2] for n in ("area", "pressure", "u_pressure", "modulus", "u_modulus"))
    )
    with pytest.raises(UpstrokeError, match=r"run\.csv: fewer than three points"):
        pressure_range(type(branch)(**{**branch.__dict__, "curve": two}), where="run.csv")


def test_names_are_unique() -> None:
    a, b, c = (result_of(Lipid(), name=n) for n in ("x", "x", "y"))
    assert run_names([a, b, c]) == ("x (1)", "x (2)", "y")


def test_random_part() -> None:
    assert random_part(Quantity(1.0, 0.3, "1")) == 0.3
    assert random_part(Quantity.combine(1.0, "1", u_random=0.1, u_systematic=0.2)) == 0.1
    assert random_part(Quantity.combine(1.0, "1", u_random=None, u_systematic=0.2)) == 0.0
    assert random_part(Quantity(1.0, None, "1")) == 0.0


def test_spoken_names() -> None:
    assert spoken("lift_off_area") == "lift-off area"
    assert spoken("area_at_30") == "area at 30 mN/m"


def test_cells_hold_no_nan() -> None:
    assert quantity_cells("a", Quantity(math.nan, math.inf, "1")) == {"a": None, "u_a": None}
    assert quantity_cells("a", None) == {"a": None, "u_a": None}
    assert quantity_cells("a", Quantity(2.0, 0.5, "1")) == {"a": 2.0, "u_a": 0.5}


def test_effective_freedom_limits() -> None:
    assert effective_freedom([(1.0, 4.0), (0.0, math.inf)]) == pytest.approx(4.0)
    assert effective_freedom([(1.0, math.inf)]) == math.inf
    assert effective_freedom([(1.0, 4.0), (1.0, 4.0)]) == pytest.approx(8.0)
    assert student_factor(0) == math.inf
    assert math.isnan(two_sided_p(1.0, 0.0))
