"""Molecules spread and mean molar mass against the `uncertainties` library and against hand arithmetic."""

from __future__ import annotations

import pytest
from uncertainties import ufloat

from isotherm.errors import UpstrokeError
from isotherm.molecular_area import mean_molar_mass, molecules_spread
from isotherm.sheet_read import parse_sheet

# SI, exact since 2019
AVOGADRO = 6.02214076e23


MIXED = """
[film]
concentration = "1.20 ± 0.02 mg/mL"
volume = "45 ± 0.6 µL"
purity = "98 ± 1 %"
[[film.component]]
name = "one"
molar_mass = "300 ± 2 g/mol"
mole_fraction = "0.3 ± 0.02"
[[film.component]]
name = "two"
molar_mass = "700 ± 5 g/mol"
mole_fraction = "0.7 ± 0.02"
"""


def test_the_mean_mass_of_a_mixture() -> None:
    found = mean_molar_mass(parse_sheet(MIXED).film)
    mean = ufloat(0.3, 0.02) * ufloat(300, 2) + ufloat(0.7, 0.02) * ufloat(700, 5)
    assert found is not None
    assert found.value == pytest.approx(mean.nominal_value)
    assert found.u == pytest.approx(mean.std_dev)
    assert found.unit == "g/mol"


def test_the_number_of_molecules_by_mass() -> None:
    found = molecules_spread(parse_sheet(MIXED).film)
    mean = ufloat(0.3, 0.02) * ufloat(300, 2) + ufloat(0.7, 0.02) * ufloat(700, 5)
    # mg/mL is g/L, µL is 1e-6 L
    grams = ufloat(1.2, 0.02) * ufloat(45, 0.6) * 1e-6
    number = AVOGADRO * grams / mean * ufloat(0.98, 0.01)
    assert found.value == pytest.approx(number.nominal_value, rel=1e-12)
    assert found.u == pytest.approx(number.std_dev, rel=1e-6)
    assert found.u_systematic == found.u
    assert found.u_random is None


def test_the_number_of_molecules_by_amount() -> None:
    film = parse_sheet('[film]\nconcentration = "1.5 ± 0.03 mmol/L"\nvolume = "40 µL"\n').film
    found = molecules_spread(film)
    assert found.value == pytest.approx(AVOGADRO * 1.5e-3 * 40e-6, rel=1e-12)
    assert found.u == pytest.approx(found.value * 0.02, rel=1e-9)


def test_without_any_uncertainty_none_is_claimed() -> None:
    film = parse_sheet('[film]\nconcentration = "1 mmol/L"\nvolume = "40 µL"\n').film
    assert molecules_spread(film).u is None


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ('[film]\nvolume = "40 µL"\n', r"lacks concentration$"),
        ('[film]\nname = "a"\n', r"lacks volume and concentration$"),
        ('[film]\nvolume = "40 µL"\nconcentration = "1 mg/mL"\n', "needs the molar mass"),
    ],
)
def test_what_is_missing_is_named(text: str, says: str) -> None:
    with pytest.raises(UpstrokeError, match=says.replace("$", "")) as caught:
        molecules_spread(parse_sheet(text).film)
    assert "add, for example" in str(caught.value)


def test_a_component_without_mass_leaves_the_mean_unknown() -> None:
    film = parse_sheet(
        '[film]\n[[film.component]]\nname = "a"\nmole_fraction = "0.5"\nmolar_mass = "300 g/mol"\n'
        '[[film.component]]\nname = "b"\nmole_fraction = "0.5"\n'
    ).film
    assert mean_molar_mass(film) is None
    assert mean_molar_mass(parse_sheet('[film]\nname = "a"\n').film) is None
