"""Quantities: two parts of u, JSON without NaN, and honest digits."""

import math

import pytest

from isotherm.quantity import Quantity, format_quantity, json_number


@pytest.mark.parametrize(
    ("value", "u", "text"),
    [
        # GUM 7.2.6: U with at most two digits, the value to the same place; U = 2 u
        (0.20513, 0.0011, "0.2051 ± 0.0022"),
        (0.20513, 0.004, "0.205 ± 0.008"),
        (25.04, 0.13, "25.04 ± 0.26"),
        (25.04, 0.49, "25.0 ± 1.0"),
        (1234.0, 60.0, "1230 ± 120"),
        (1234.0, 400.0, "1200 ± 800"),
        (-0.00001, 0.00025, "0.0000 ± 0.0005"),
        (34.995616532713, 3e-12, "34.99562 ± 6e-12"),
        (3.14159, None, "3.142"),
        (math.nan, 1.0, "n/a"),
    ],
)
def test_digits(value: float, u: float | None, text: str) -> None:
    assert format_quantity(Quantity(value, u, "nm^2")) == text


def test_parts_combine_in_quadrature() -> None:
    both = Quantity.combine(1.0, "nm^2", u_random=0.3, u_systematic=0.4)
    assert both.u == pytest.approx(0.5)
    assert both.expanded == pytest.approx(1.0)
    assert Quantity.combine(1.0, "nm^2", u_random=None, u_systematic=None).u is None
    assert Quantity.combine(1.0, "nm^2", u_random=0.3, u_systematic=None).u == 0.3


def test_json_has_no_nan() -> None:
    assert json_number(math.nan) is None
    assert json_number(math.inf) is None
    assert Quantity(math.nan, math.inf, "mN/m").to_json() == {
        "value": None,
        "u": None,
        "unit": "mN/m",
    }
