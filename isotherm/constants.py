"""Physical constants in the project's fixed units, each with its source.

CODATA values as `scipy.constants` carries them; a test compares the two. They are written out because
importing `scipy.constants` costs a tenth of a second at start-up.
"""

from __future__ import annotations

from typing import Final

__all__ = [
    "AVOGADRO",
    "BOLTZMANN",
    "BOLTZMANN_MN_NM",
    "ELEMENTARY_CHARGE",
    "EPSILON_0",
    "FARADAY",
    "GAS_CONSTANT",
    "ZERO_CELSIUS",
]

# Exact by definition of the SI (2019).
AVOGADRO: Final = 6.02214076e23  # 1/mol
BOLTZMANN: Final = 1.380649e-23  # J/K
ELEMENTARY_CHARGE: Final = 1.602176634e-19  # C
ZERO_CELSIUS: Final = 273.15  # K
GAS_CONSTANT: Final = AVOGADRO * BOLTZMANN  # J/(mol K)
FARADAY: Final = AVOGADRO * ELEMENTARY_CHARGE  # C/mol
# k in mN/m nm^2 per kelvin: 1 J = 1 N m = 10^3 mN m, 1 mN/m nm^2 = 10^-3 N/m 10^-18 m^2 = 10^-21 J.
BOLTZMANN_MN_NM: Final = BOLTZMANN * 1e21
# CODATA 2022, F/m.
EPSILON_0: Final = 8.8541878188e-12
