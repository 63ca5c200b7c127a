"""How numbers are written in tables."""

from __future__ import annotations

import pytest

from cli.render import MISSING, duration_text, interval_text, inverse, scaled, with_unit
from isotherm.quantity import Quantity


def test_what_is_missing_is_a_dash() -> None:
    assert with_unit(None) == MISSING
    assert interval_text(None) == MISSING


@pytest.mark.parametrize(
    ("seconds", "text"),
    [(90.0, "90 s"), (119.9, "120 s"), (1500.0, "25 min"), (7200.0, "2 h"), (16200.0, "4.5 h")],
)
def test_durations(seconds: float, text: str) -> None:
    assert duration_text(seconds) == text


def test_an_inverse_has_the_relative_u_and_only_of_what_is_positive() -> None:
    found = inverse(Quantity(0.004, 0.0002, "m/mN"))
    assert found is not None
    assert (found.value, found.unit) == (pytest.approx(250.0), "mN/m")
    assert found.u == pytest.approx(12.5)  # 5 % of it
    assert inverse(Quantity(0.0, 0.1, "m/mN")) is None
    assert inverse(Quantity(-1.0, 0.1, "m/mN")) is None


def test_scaling_keeps_every_part_of_u_positive() -> None:
    found = scaled(Quantity(2.0, 0.5, "nm", 0.3, 0.4), -10.0, "Å")
    assert (found.value, found.u, found.unit) == (-20.0, 5.0, "Å")
    assert (found.u_random, found.u_systematic) == (pytest.approx(3.0), pytest.approx(4.0))
    assert scaled(Quantity(2.0, None, "nm"), 10.0, "Å").u is None


def test_intervals_have_the_decimals_of_their_width_and_may_be_open() -> None:
    assert interval_text((29.0, 33.0)) == "29.0 to 33.0"
    assert interval_text((None, 33.0)) == "open to 33.000"
    assert interval_text((29.0, 33.0), shift=1.0) == "28.0 to 32.0"
