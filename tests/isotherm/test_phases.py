"""What stretches mean, and the names of phases."""

import pytest

from isotherm.phases import phase_name


@pytest.mark.parametrize(
    ("modulus", "name"),
    [
        # Davies & Rideal 1963, as widely quoted: 12.5-50 expanded, 50-100 intermediate,
        # 100-250 condensed; above 250 solid by practice
        (0.0, "gaseous"),
        (12.4, "gaseous"),
        (12.5, "liquid-expanded"),
        (49.0, "liquid-expanded"),
        (75.0, "intermediate"),
        (100.0, "liquid-condensed"),
        (249.0, "liquid-condensed"),
        (400.0, "solid"),
        (1500.0, "solid"),
    ],
)
def test_names_follow_the_customary_ranges(modulus: float, name: str) -> None:
    assert phase_name(modulus) == name
