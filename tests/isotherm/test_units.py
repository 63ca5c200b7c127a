"""Units as people type them."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from isotherm.constants import AVOGADRO
from isotherm.errors import UpstrokeError
from isotherm.unit_symbols import DIMENSIONS
from isotherm.units import conversion, dimension_fits, is_unit, parse_unit

# What one of the unit is in the fixed unit: arithmetic on the SI brochure's definitions.
_ONE = [
    ("Å²", "molecular_area", 0.01),
    ("A^2", "molecular_area", 0.01),
    ("A2", "molecular_area", 0.01),
    ("Å^2/molecule", "molecular_area", 0.01),
    ("Å² per molecule", "molecular_area", 0.01),
    ("Å^2 molecule^-1", "molecular_area", 0.01),
    ("A\u030a^2", "molecular_area", 0.01),
    ("\u212b²", "molecular_area", 0.01),
    ("nm2", "molecular_area", 1.0),
    ("nm^2/molec.", "molecular_area", 1.0),
    ("cm^2/molecule", "molecular_area", 1e14),
    ("10⁻¹⁶ cm²", "molecular_area", 0.01),
    ("m^2/mol", "molecular_area", 1e18 / AVOGADRO),
    ("cm²", "area", 1.0),
    ("cm**2", "area", 1.0),
    ("CM2", "area", 1.0),
    ("cmÂ²", "area", 1.0),
    ("㎠", "area", 1.0),
    ("mm^2", "area", 0.01),
    ("m2", "area", 1e4),
    ("mN/m", "pressure", 1.0),
    ("mN m-1", "pressure", 1.0),
    ("mN·m⁻¹", "pressure", 1.0),
    ("mN m^{-1}", "pressure", 1.0),
    ("mN m$^{-1}$", "pressure", 1.0),
    ("mN.m^-1", "pressure", 1.0),
    ("mN⋅m^(-1)", "pressure", 1.0),
    ("mN per m", "pressure", 1.0),
    ("MN/M", "pressure", 1.0),
    ("(mN)/(m)", "pressure", 1.0),
    ("N/m", "pressure", 1000.0),
    ("10^-3 N/m", "pressure", 1.0),
    ("dyn/cm", "pressure", 1.0),
    ("dynes/cm", "pressure", 1.0),
    ("mJ/m^2", "pressure", 1.0),
    ("erg/cm2", "pressure", 1.0),
    ("min", "time", 60.0),
    ("h", "time", 3600.0),
    ("ms", "time", 1e-3),
    ("sec", "time", 1.0),
    ("Sekunden", "time", 1.0),
    ("cm", "length", 10.0),
    ("m", "length", 1000.0),
    ("µm", "length", 1e-3),
    ("μm", "length", 1e-3),
    ("um", "length", 1e-3),
    ("in", "length", 25.4),
    ("Å", "thickness", 0.1),
    ("V", "potential", 1000.0),
    ("mL", "volume", 1000.0),
    ("uL", "volume", 1.0),
    ("l", "volume", 1e6),
    ("g/L", "concentration", 1.0),
    ("µg/µL", "concentration", 1.0),
    ("g/mL", "concentration", 1000.0),
    ("kg/mol", "molar_mass", 1000.0),
    ("Da", "molar_mass", 1.0),
    ("kDa", "molar_mass", 1000.0),
    ("g", "molar_mass", 1.0),
    ("%", "fraction", 0.01),
    ("1", "fraction", 1.0),
    ("mm/min", "speed", 1.0 / 60.0),
    ("1/h", "rate", 1.0 / 3600.0),
    ("h^-1", "rate", 1.0 / 3600.0),
]


@pytest.mark.parametrize(("text", "dimension", "factor"), _ONE)
def test_one_of_each_unit(text: str, dimension: str, factor: float) -> None:
    convert = conversion(text, dimension)
    assert convert.unit == DIMENSIONS[dimension][0]
    assert convert(1.0) == pytest.approx(factor, rel=1e-14)
    assert convert(np.array([2.0, 3.0])) == pytest.approx([2 * factor, 3 * factor], rel=1e-14)


@pytest.mark.parametrize(
    ("text", "factor"), [("mM", 1.0), ("µmol/mL", 1.0), ("mol/L", 1e3), ("M", 1e3)]
)
def test_amount_concentrations_stay_amounts(text: str, factor: float) -> None:
    convert = conversion(text, "concentration")
    assert convert.unit == "mmol/L"
    assert convert(1.0) == pytest.approx(factor)


def test_temperatures_have_their_own_zero() -> None:
    assert conversion("K", "temperature")(293.15) == pytest.approx(20.0)
    assert conversion("K", "temperature").scale(0.2) == pytest.approx(0.2)
    for text in ("°C", "degC", "deg C", "℃", "C", "ºC", "° C"):
        assert conversion(text, "temperature")(20.0) == 20.0


def test_decimal_conversions_are_exact_to_the_last_bit() -> None:
    # 21.5 Å² must be 0.215 nm², not 0.21500000000000002: JSON would show it
    assert conversion("Å^2", "molecular_area")(21.5) == 0.215
    assert conversion("mm^2", "area")(12345.0) == 123.45


@pytest.mark.parametrize(
    "text",
    [
        "furlong",
        "",
        "-",
        "m//s",
        "/m",
        "m/",
        "(m",
        "m)",
        "m^",
        "m^x",
        "mN/q",
        "m" * 61,
        "^" * 50,
        "(" * 50,
        "1e999",
        "m^99999999",
        "/" * 60,
    ],
)
def test_what_is_no_unit(text: str) -> None:
    assert not is_unit(text)


def test_unknown_unit_names_it_and_suggests() -> None:
    with pytest.raises(UpstrokeError, match=r"column 3: unknown unit 'mN/n'; did you mean mN/m\?"):
        conversion("mN/n", "pressure", where="column 3")
    with pytest.raises(UpstrokeError, match="'kPa' is not a unit of pressure"):
        conversion("kPa", "pressure")
    with pytest.raises(UpstrokeError, match="'s' is not a unit of volume; use µL or mL"):
        conversion("s", "volume")


def test_any_unit_may_be_the_target() -> None:
    assert conversion("MHz", "kHz")(5.0) == pytest.approx(5000.0)
    assert conversion("µC", "nC")(1.0) == pytest.approx(1000.0)
    assert conversion("µF/cm^2", "µF/cm^2")(3.0) == 3.0


def test_an_area_per_molecule_is_one_even_in_large_units() -> None:
    assert parse_unit("cm^2/molecule")[0].per_molecule
    assert parse_unit("cm^2 molecule^-1")[0].per_molecule
    assert not parse_unit("cm^2")[0].per_molecule
    assert not parse_unit("cm^2 molecule")[0].per_molecule
    assert dimension_fits("m^2/mol", "molecular_area")
    assert not dimension_fits("m^2/mol", "area")


@given(st.text(max_size=80))
def test_any_text_is_a_unit_or_none(text: str) -> None:
    for unit in parse_unit(text):
        assert math.isfinite(unit.mantissa)
        assert unit.mantissa > 0


_SYMBOLS = st.sampled_from(
    ["m", "cm", "nm", "N", "mN", "s", "min", "Å", "A", "g", "mol", "K", "10", "%", "V"]
)
_JOINS = st.sampled_from(["/", " ", "·", "^2", "^-1", "-1", "(", ")", "²", "⁻¹", ".", "*"])


@given(st.lists(st.one_of(_SYMBOLS, _JOINS), max_size=14).map("".join))
def test_any_pile_of_symbols_is_a_unit_or_none(text: str) -> None:
    for dimension in DIMENSIONS:
        try:
            factor = conversion(text, dimension).scale(1.0)
        except UpstrokeError:
            continue
        assert factor >= 0


@pytest.mark.parametrize(
    "text",
    [
        "(min^30)^30",
        "(min^30)^5 (min^30)^5/(s^30)^10 s",
        "(km^30)^30/(m^30)^30 m",
        "(nm^30)^30/(m^30)^30 mm",
        "45.3^30 (45.3^30)^30 s",
        "(0.001^30)^30 s",
        "s/(0.001^30)^30",
    ],
)
def test_powers_of_powers_beyond_any_number_are_no_units(text: str) -> None:
    assert parse_unit(text) == ()
    for dimension in ("mm", "s"):
        with pytest.raises(UpstrokeError, match="unknown unit"):
            conversion(text, dimension)
