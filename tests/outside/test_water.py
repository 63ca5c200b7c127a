"""Tension of water against two general packages and a printed table."""

import chemicals
import iapws
import pytest

from isotherm.errors import UpstrokeError
from isotherm.water import surface_tension, surface_tension_slope

# Haar, Gallagher & Kell, NBS/NRC Steam Tables 1984, p. 267, mN/m against degC.
STEAM_TABLES = {10: 74.22, 20: 72.74, 30: 71.20, 40: 69.60, 50: 67.95, 100: 58.92}


@pytest.mark.parametrize("celsius", [0.1, 10, 20, 25, 37, 50, 80, 200])
def test_packages_agree(celsius: float) -> None:
    # both implement IAPWS R1-76(2014): packages iapws and chemicals
    kelvin = celsius + 273.15
    assert surface_tension(kelvin) == pytest.approx(iapws._iapws._Tension(kelvin) * 1e3, abs=1e-4)
    named = chemicals.interface.sigma_IAPWS(kelvin) * 1e3
    assert surface_tension(kelvin) == pytest.approx(named, abs=1e-4)


@pytest.mark.parametrize(("celsius", "tension"), STEAM_TABLES.items())
def test_steam_tables_agree(celsius: float, tension: float) -> None:
    assert surface_tension(celsius + 273.15) == pytest.approx(tension, abs=0.02)


@pytest.mark.parametrize(("celsius", "slope"), [(20, -0.1514), (25, -0.1542)])
def test_slope(celsius: float, slope: float) -> None:
    # derived from the same equation, mN/m/K
    assert surface_tension_slope(celsius + 273.15) == pytest.approx(slope, abs=1e-4)


def test_slope_is_the_derivative() -> None:
    step = 1e-3
    numeric = (surface_tension(300 + step) - surface_tension(300 - step)) / (2 * step)
    assert surface_tension_slope(300.0) == pytest.approx(numeric, rel=1e-6)


@pytest.mark.parametrize("kelvin", [200.0, 700.0])
def test_outside_the_range_is_refused(kelvin: float) -> None:
    with pytest.raises(UpstrokeError, match="no surface tension of water"):
        surface_tension(kelvin)
