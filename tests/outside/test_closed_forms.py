"""The whole path on films whose equations are known: a gas, a Volmer film, a hand-worked spreading."""

import numpy as np
import pytest

from isotherm.analysis import analyse
from isotherm.constants import (
    AVOGADRO,
    BOLTZMANN,
    BOLTZMANN_MN_NM,
    ELEMENTARY_CHARGE,
    EPSILON_0,
    FARADAY,
    GAS_CONSTANT,
)
from isotherm.molecular_area import mean_molar_mass, molecules_spread
from isotherm.quantity import Quantity
from isotherm.sheet import Component, Film
from tests.support.isotherm_traces import make_trace

KT = BOLTZMANN_MN_NM * 298.0


def test_gaseous_limit() -> None:
    # physics: k T = 4.114 mN/m nm^2 at 298 K
    assert pytest.approx(4.114, abs=1e-3) == KT


def test_ideal_gas_has_no_features() -> None:
    # ideal two-dimensional gas, Π A = k T: the modulus equals the pressure, and nothing else is there
    area = np.linspace(40.0, 4.0, 4000)
    branch = analyse(make_trace(area, KT / area, noise=0.01), at=(0.5,)).headline
    assert branch.transitions == ()
    assert branch.collapse is None
    at = branch.area_at[0]
    assert at.area is not None
    assert at.area.u is not None
    assert abs(at.area.value - KT / 0.5) < 3 * at.area.u
    i = int(np.argmin(np.abs(branch.curve.area - 5.0)))
    assert branch.curve.u_modulus[i] < 0.3
    exact = KT / branch.curve.area[i]
    assert branch.curve.modulus[i] == pytest.approx(exact, abs=3 * branch.curve.u_modulus[i])


@pytest.mark.parametrize("at", [0.6, 0.8, 1.0])
def test_volmer_modulus(at: float) -> None:
    # Volmer film, Π = kT/(A - ω) - Π_coh: modulus kT A/(A - ω)^2 in closed form
    area = np.linspace(1.4, 0.55, 3000)
    branch = analyse(make_trace(area, KT / (area - 0.4) - 1.0, noise=0.03)).headline
    assert branch.transitions == ()
    i = int(np.argmin(np.abs(branch.curve.area - at)))
    exact = KT * branch.curve.area[i] / (branch.curve.area[i] - 0.4) ** 2
    assert branch.curve.u_modulus[i] < 0.1 * exact
    assert branch.curve.modulus[i] == pytest.approx(exact, abs=4 * branch.curve.u_modulus[i])


def test_spreading_worked_by_hand() -> None:
    # 50 µL of 1.00 mg/mL octadecanoic acid, 284.48 g/mol:
    # 50e-6 L x 1.00 g/L / 284.48 g/mol x 6.02214076e23 /mol = 1.05845e17 molecules;
    # u: sqrt(0.01^2 + 0.01^2) = 1.414 %
    film = Film(
        components=(Component("acid", Quantity(284.48, None, "g/mol"), Quantity(1.0, None, "1")),),
        concentration=Quantity(1.0, 0.01, "mg/mL"),
        volume=Quantity(50.0, 0.5, "µL"),
    )
    molecules = molecules_spread(film)
    assert molecules.value == pytest.approx(1.05845e17, rel=1e-5)
    assert molecules.u_systematic == pytest.approx(0.014142 * molecules.value, rel=1e-4)
    # 240 cm^2 over them: 240e14 nm^2 / 1.05845e17 = 0.22675 nm^2
    assert 240e14 / molecules.value == pytest.approx(0.22675, rel=1e-4)


def test_molar_spreading_of_a_mixture() -> None:
    # 40 µL of 1.2 mmol/L: 4.8e-8 mol, whatever the masses; mean mass by hand 0.7*734.04 + 0.3*386.65
    film = Film(
        components=(
            Component("a", Quantity(734.04, None, "g/mol"), Quantity(0.7, None, "1")),
            Component("b", Quantity(386.65, None, "g/mol"), Quantity(0.3, None, "1")),
        ),
        concentration=Quantity(1.2, None, "mmol/L"),
        volume=Quantity(40.0, None, "µL"),
    )
    assert molecules_spread(film).value == pytest.approx(4.8e-8 * 6.02214076e23, rel=1e-12)
    mass = mean_molar_mass(film)
    assert mass is not None
    assert mass.value == pytest.approx(629.823, abs=1e-9)


def test_constants_are_those_of_scipy() -> None:
    # CODATA, as scipy.constants carries it; its vacuum permittivity may be one adjustment older
    from scipy import constants

    assert constants.Avogadro == AVOGADRO
    assert constants.Boltzmann == BOLTZMANN
    assert constants.elementary_charge == ELEMENTARY_CHARGE
    # tables before 2022 print R with ten digits
    assert pytest.approx(constants.R, rel=1e-9) == GAS_CONSTANT
    assert pytest.approx(constants.value("Faraday constant"), rel=1e-9) == FARADAY
    assert pytest.approx(constants.epsilon_0, rel=1e-9) == EPSILON_0
