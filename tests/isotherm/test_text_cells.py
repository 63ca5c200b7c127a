"""What one cell is: a number in either notation, a gap, a clock, or text."""

from __future__ import annotations

import math

import pytest

from isotherm.text_cells import cell_kind, to_number


@pytest.mark.parametrize(
    ("cell", "decimal", "number"),
    [
        ("1.25", ".", 1.25),
        ("1,25", ",", 1.25),
        ("-.5", ".", -0.5),
        ("−3", ".", -3.0),
        ("1d2", ".", 100.0),
        ("1,5D-2", ",", 0.015),
        ("1,234.5", ".", 1234.5),
        ("1.234,5", ",", 1234.5),
        ("1,234,567", ".", 1234567.0),
        ("1 234.5", ".", 1234.5),
        ("1'234,5", ",", 1234.5),
        ("1,234", ".", None),  # a decimal comma could be meant
        ("1.234", ",", None),
        ("1_000", ".", None),
        ("0x1f", ".", None),
        ("١٢", ".", None),  # digits of another script
        ("1e1234", ".", None),
        ("-1.#inf", ".", -math.inf),
        ("overload", ".", math.inf),
        ("hello", ".", None),
        ("", ".", math.nan),
        ("n/a", ",", math.nan),
        ("-", ".", math.nan),
    ],
)
def test_numbers(cell: str, decimal: str, number: float | None) -> None:
    found = to_number(cell, decimal)
    if number is None:
        assert found is None
    else:
        assert found is not None
        assert found == number or (math.isnan(found) and math.isnan(number))


def test_a_number_has_at_most_48_characters() -> None:
    assert to_number("1." + "0" * 46, ".") == 1.0
    assert to_number("1." + "0" * 47, ".") is None


@pytest.mark.parametrize(
    ("cell", "kind"),
    [
        ("12.5", "N"),
        ("overload", "N"),
        ("n/a", "E"),
        ("9:15", "C"),
        ("09:15:00.25", "C"),
        ("2031-05-06T09:15:00+01:00", "C"),
        ("6.5.2031 9:15 PM", "C"),
        ("9", "N"),
        ("9 mN/m", "T"),
        (":15", "T"),
        ("Pressure", "T"),
    ],
)
def test_kinds(cell: str, kind: str) -> None:
    assert cell_kind(cell, ".") == kind
