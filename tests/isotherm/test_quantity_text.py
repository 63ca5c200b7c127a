"""Quantities as text."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from isotherm.errors import UpstrokeError
from isotherm.quantity_text import parse_quantity


@pytest.mark.parametrize(
    ("text", "dimension", "value", "u", "unit"),
    [
        ("50 µL", "volume", 50.0, None, "µL"),
        ("1.00 ± 0.01 mg/mL", "concentration", 1.0, 0.01, "mg/mL"),
        ("1.00 +/- 0.01 g/L", "concentration", 1.0, 0.01, "mg/mL"),
        ("1,00 +- 0,01 mmol/L", "concentration", 1.0, 0.01, "mmol/L"),
        ("20.0 ± 0.2 degC", "temperature", 20.0, 0.2, "degC"),
        ("293.15 ± 0.2 K", "temperature", 20.0, 0.2, "degC"),
        ("293.15 K ± 0.2 K", "temperature", 20.0, 0.2, "degC"),
        ("(50 ± 0.5) µL", "volume", 50.0, 0.5, "µL"),
        ("0.05 mL ± 1 %", "volume", 50.0, 0.5, "µL"),
        ("50 µL ± 0.001 mL", "volume", 50.0, 1.0, "µL"),
        ("1.234(5) mg/mL", "concentration", 1.234, 0.005, "mg/mL"),
        ("98 ± 1 %", "fraction", 0.98, 0.01, "1"),
        ("0.98", "fraction", 0.98, None, "1"),
        ("-3.5e-1 mm", "length", -0.35, None, "mm"),
        ("−3,5 mm", "length", -3.5, None, "mm"),
        (".5 nm", "thickness", 0.5, None, "nm"),
        ("25 Å", "thickness", 2.5, None, "nm"),
        ("10 mN/m", "pressure", 10.0, None, "mN/m"),
    ],
)
def test_reads(text: str, dimension: str, value: float, u: float | None, unit: str) -> None:
    quantity = parse_quantity(text, dimension)
    assert quantity.value == pytest.approx(value, rel=1e-12, abs=1e-12)
    assert quantity.unit == unit
    assert quantity.u == (None if u is None else pytest.approx(u))
    assert quantity.u_systematic == quantity.u


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "not a quantity"),
        ("mL", "not a quantity"),
        ("50", "has no unit"),
        ("50 ± µL", "not a quantity"),
        ("50 ± 0 µL", "uncertainty in '50 ± 0 µL' is not above zero"),
        ("50 ± -1 µL", "not above zero"),
        ("50 ± 1 ± 2 µL", "not a quantity"),
        ("50 60 µL", "not a quantity"),
        ("(50 ± 0.5 µL", "not a quantity"),
        ("1e999 µL", "not finite"),
        ("nan µL", "not a quantity"),
        ("inf µL", "not a quantity"),
        ("9e305 L", "not finite"),
        ("50 mN/m", "'mN/m' is not a unit of volume"),
        ("50 mLL", "unknown unit 'mLL'; did you mean mL?"),
        ("5" * 500, "not a quantity"),
    ],
)
def test_refuses(text: str, says: str) -> None:
    with pytest.raises(UpstrokeError) as caught:
        parse_quantity(text, "volume", where="film.volume")
    assert says in str(caught.value)
    assert str(caught.value).startswith("film.volume")
    assert "\n" not in str(caught.value)


@given(st.text(alphabet="0123456789.,±+-/() eEµLmg%²^", max_size=130))
def test_any_text_is_a_quantity_or_refused(text: str) -> None:
    try:
        quantity = parse_quantity(text, "volume")
    except UpstrokeError:
        return
    assert quantity.unit == "µL"
    assert quantity.u is None or quantity.u > 0
