"""The dipping pressure against things outside the project: libraries, closed forms, arithmetic."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy import optimize
from target_films import FOOT, START, STIFF, coexistence, kink, plain_film
from uncertainties import ufloat, umath

from isotherm.constants import BOLTZMANN_MN_NM
from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet
from transfer.target import choose_target
from transfer.target_choice import choose
from transfer.target_film import film_axis
from transfer.target_inputs import gather_inputs, moved
from transfer.target_limits import GASEOUS_BELOW, rules_of

SHEET = """
[film]
name = "octadecanoic acid"
molar_mass = "284.48 g/mol"
concentration = "1.00 mg/mL"
volume = "25.0 ± 0.2 µL"
[substrate]
shape = "plate"
width = "20.0 ± 0.1 mm"
thickness = "1.00 ± 0.02 mm"
[trough]
smallest_area = "60.0 ± 0.3 cm^2"
[dipping]
tolerance = "0.30 ± 0.05 mN/m"
overshoot = "0.5 mN/m"
stroke_length = "25.0 ± 0.2 mm"
[stack]
layers = 12
type = "Y"
first_stroke = "up"
accept = [0.95, 1.05]
"""


def test_packing_error_propagates_as_the_uncertainties_package_has_it() -> None:
    # library: uncertainties (linear propagation, GUM 5.1)
    result = choose_target(plain_film(modulus_u=8.0), parse_sheet(SHEET))
    expected = ufloat(0.30, 0.05) / ufloat(STIFF, 8.0)
    assert result.packing_error is not None
    assert result.packing_error.value == pytest.approx(expected.n)
    assert result.packing_error.u == pytest.approx(expected.s)


def test_film_of_a_stroke_and_areas_propagate_as_the_uncertainties_package_has_it() -> None:
    # library: uncertainties; the plate's dimensions, the stroke and the transfer ratio as inputs
    molecules = 6e16
    result = choose_target(plain_film(molecules=molecules), parse_sheet(SHEET))
    assert result.budget is not None
    assert result.recommended is not None
    width, thick, length = ufloat(20.0, 0.1), ufloat(1.0, 0.02), ufloat(25.0, 0.2)
    ratio = ufloat(1.0, 0.10 / math.sqrt(12.0))
    film = (2 * (width + thick) * length + width * thick) / 100 * ratio
    stroke = result.budget.stroke.film
    assert stroke.value == pytest.approx(film.n)
    # the lower face (2 % of the area) is taken as wholly correlated with the sides, which the package
    # resolves exactly: they agree to a few per cent of u
    assert stroke.u == pytest.approx(film.s, rel=0.03)
    spread = ufloat(25.0, 0.2) / ufloat(25.0, 0.2)  # a new volume over the one of the isotherm
    pressure = ufloat(result.recommended.value, 0.30)
    area = molecules / 1e14 * FOOT * umath.exp(-pressure / STIFF) * spread
    assert result.budget.area.value == pytest.approx(area.n, rel=1e-4)
    assert result.budget.area.u == pytest.approx(area.s, rel=1e-3)
    third = area - 3 * film
    assert result.budget.plan[2].area_at_end.value == pytest.approx(third.n, rel=1e-4)
    assert result.budget.plan[2].area_at_end.u == pytest.approx(third.s, rel=0.03)


def test_the_recommendation_is_the_largest_smallest_margin_found_by_linear_programming() -> None:
    # library: scipy.optimize.linprog. Within one window: maximise r with low + r <= P <= high - r
    # (the Chebyshev centre of an interval); the best window is the one with the largest r.
    film = plain_film(coexistence(8.0, 10.0, u=0.2), kink(21.0, u=0.1), collapse_u=0.4)
    result = choose_target(film, parse_sheet(SHEET))
    best = (-1.0, 0.0)
    for window in result.windows:
        found = optimize.linprog(
            [0.0, -1.0], A_ub=[[-1.0, 1.0], [1.0, 1.0]], b_ub=[-window.low, window.high],
            bounds=[(None, None), (0.0, None)],
        )  # fmt: skip
        best = max(best, (float(found.x[1]), float(found.x[0])))
    assert result.recommended is not None
    assert result.recommended.value == pytest.approx(best[1], abs=1e-6)


def test_no_pressure_on_a_fine_grid_is_deeper_than_the_recommendation() -> None:
    # brute force: distance from each of 40 001 pressures to the nearest one that any rule forbids
    film = plain_film(coexistence(8.0, 10.0, u=0.2), kink(21.0, u=0.1), collapse_u=0.4)
    inputs = gather_inputs(film, parse_sheet(SHEET))
    choice = choose(inputs)
    grid = np.linspace(0.0, 40.0, 40_001)
    free = np.all([rule.slack(grid, 2.0) >= 0 for rule in rules_of(inputs).applied], axis=0)
    forbidden = np.concatenate([[-1e-3], grid[~free], [40.001]])
    nearest = np.abs(
        grid[:, None] - forbidden[np.searchsorted(forbidden, grid)[:, None] - np.array([0, 1])]
    ).min(axis=1)
    deepest = grid[int(np.argmax(np.where(free, nearest, -1.0)))]
    assert choice.recommended == pytest.approx(deepest, abs=2e-3)


def test_uncertainty_of_the_recommendation_against_monte_carlo() -> None:
    # first principles: draw collapse and kink from their distributions and choose again (JCGM 101:2008)
    rng = np.random.default_rng(20)
    text = parse_sheet('[dipping]\ntolerance = "0.2 mN/m"\n')
    base = gather_inputs(plain_film(kink(15.0, u=0.3), collapse_u=0.5), text)
    found = []
    for _ in range(400):
        a, b = rng.normal(0.0, 0.3), rng.normal(0.0, 0.5)
        band = base.bands[0]
        drawn = replace(
            base,
            bands=(replace(band, onset=moved(band.onset, a), end=moved(band.onset, a)),),
            collapse=moved(base.end, b),
            highest=moved(base.highest, b),
        )
        recommended = choose(drawn).recommended
        assert recommended is not None
        found.append(recommended)
    result = choose_target(plain_film(kink(15.0, u=0.3), collapse_u=0.5), text)
    assert result.recommended is not None
    assert result.recommended.u == pytest.approx(np.std(found), rel=0.12)


def test_budget_by_the_arithmetic_of_avogadro() -> None:
    # exact: SI value of the Avogadro constant; molar mass 284.48 g/mol of octadecanoic acid (C18H36O2)
    result = choose_target(plain_film(molecules=None), parse_sheet(SHEET))
    assert result.budget is not None
    assert result.recommended is not None
    molecules = 6.02214076e23 * 25.0e-6 / 284.48
    area = molecules * 1e-14 * FOOT * math.exp(-result.recommended.value / STIFF)
    assert result.budget.area.value == pytest.approx(area, rel=1e-4)
    assert result.budget.strokes_possible == math.floor((area - 60.0) / 10.7)


def test_gas_is_never_recommended() -> None:
    # physics: an ideal two-dimensional gas, P A = kT, has the modulus M = P; below 12.5 mN/m (Davies &
    # Rideal, Interfacial Phenomena, 1963, as widely quoted) nothing is admissible
    kt = BOLTZMANN_MN_NM * 298.15
    assert kt == pytest.approx(4.114, abs=0.003)  # mN/m nm^2 at 298 K
    film = plain_film()
    branch = film.branches[0]
    area = np.geomspace(100.0, kt / 11.0, 400)
    curve = replace(
        branch.curve, area=area, pressure=kt / area, modulus=kt / area,
        u_modulus=np.full(400, 0.01), u_pressure=np.zeros(400), trough_area=None,
    )  # fmt: skip
    gas = replace(
        film,
        branches=(
            replace(
                branch, curve=curve, collapse=None, lift_off=None, phases=(),
                highest_pressure=replace(branch.highest_pressure, value=11.0),
            ),
        ),
    )  # fmt: skip
    result = choose_target(gas, RunSheet())
    assert GASEOUS_BELOW == 12.5
    assert result.recommended is None
    assert "single phase" in result.binding
    wanted = choose_target(gas, parse_sheet('[target]\nphase = "gaseous"\n'))
    assert "single phase" in {item.rule for item in wanted.left_out}


def test_modulus_of_the_axis_is_that_of_the_exponential_film() -> None:
    # closed form: dP = -M d ln A
    axis = film_axis(plain_film())
    at = np.linspace(1.0, 39.0, 20)
    numeric = -axis.area_at(at) * np.gradient(at, axis.area_at(at))
    assert np.allclose(numeric[1:-1], STIFF, rtol=5e-3)
    assert axis.area_at(np.array([0.0]))[0] == pytest.approx(FOOT)
    assert START > FOOT
