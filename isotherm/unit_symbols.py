"""Unit symbols of the bench and what each means in SI base units."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

__all__ = ["DIMENSIONS", "PREFIXES", "SYMBOLS", "WHOLE", "Dims", "Symbol"]

# Exponents of length, mass, time, temperature, amount of substance, electric current.
Dims = tuple[int, int, int, int, int, int]

_NONE: Final[Dims] = (0, 0, 0, 0, 0, 0)


@dataclass(frozen=True)
class Symbol:
    """A unit symbol: `mantissa` × 10^`exponent` SI units of dimension `dims`.

    prefixed : takes SI prefixes.
    counts : counts molecules (dimensionless, but tells an area per molecule).
    """

    mantissa: float
    exponent: int
    dims: Dims
    prefixed: bool = False
    counts: bool = False


# SI prefixes as the SI brochure lists them, within reach of a laboratory.
PREFIXES: Final[dict[str, int]] = {
    "f": -15, "p": -12, "n": -9, "u": -6, "m": -3, "c": -2, "d": -1, "h": 2, "k": 3, "M": 6, "G": 9,
}  # fmt: skip

_MOLECULE: Final = Symbol(1.0, 0, _NONE, counts=True)

# One spelling may mean two units (A: ampere, or ångström as typed without the ring): all are listed,
# and the dimension asked for decides.
SYMBOLS: Final[dict[str, tuple[Symbol, ...]]] = {
    "m": (Symbol(1.0, 0, (1, 0, 0, 0, 0, 0), True),),
    "g": (Symbol(1.0, -3, (0, 1, 0, 0, 0, 0), True),),
    "s": (Symbol(1.0, 0, (0, 0, 1, 0, 0, 0), True),),
    "K": (Symbol(1.0, 0, (0, 0, 0, 1, 0, 0), True),),
    "mol": (Symbol(1.0, 0, (0, 0, 0, 0, 1, 0), True),),
    "A": (
        Symbol(1.0, 0, (0, 0, 0, 0, 0, 1), True),
        Symbol(1.0, -10, (1, 0, 0, 0, 0, 0)),
    ),
    "Å": (Symbol(1.0, -10, (1, 0, 0, 0, 0, 0)),),
    "N": (Symbol(1.0, 0, (1, 1, -2, 0, 0, 0), True),),
    "J": (Symbol(1.0, 0, (2, 1, -2, 0, 0, 0), True),),
    "Pa": (Symbol(1.0, 0, (-1, 1, -2, 0, 0, 0), True),),
    "W": (Symbol(1.0, 0, (2, 1, -3, 0, 0, 0), True),),
    "V": (Symbol(1.0, 0, (2, 1, -3, 0, 0, -1), True),),
    "C": (Symbol(1.0, 0, (0, 0, 1, 0, 0, 1), True),),
    "F": (Symbol(1.0, 0, (-2, -1, 4, 0, 0, 2), True),),
    "ohm": (Symbol(1.0, 0, (2, 1, -3, 0, 0, -2), True),),
    "Hz": (Symbol(1.0, 0, (0, 0, -1, 0, 0, 0), True),),
    "L": (Symbol(1.0, -3, (3, 0, 0, 0, 0, 0), True),),
    "l": (Symbol(1.0, -3, (3, 0, 0, 0, 0, 0), True),),
    "M": (Symbol(1.0, 3, (-3, 0, 0, 0, 1, 0), True),),
    # Dalton: numerically g/mol; the molar mass constant differs from 1 g/mol by 3e-10 (CODATA 2022).
    "Da": (Symbol(1.0, -3, (0, 1, 0, 0, -1, 0), True),),
    "degC": (Symbol(1.0, 0, (0, 0, 0, 1, 0, 0)),),
    "dyn": (Symbol(1.0, -5, (1, 1, -2, 0, 0, 0), True),),
    "erg": (Symbol(1.0, -7, (2, 1, -2, 0, 0, 0)),),
    "min": (Symbol(60.0, 0, (0, 0, 1, 0, 0, 0)),),
    "h": (Symbol(3600.0, 0, (0, 0, 1, 0, 0, 0)),),
    "d": (Symbol(86400.0, 0, (0, 0, 1, 0, 0, 0)),),
    "in": (Symbol(2.54, -2, (1, 0, 0, 0, 0, 0)),),
    "cc": (Symbol(1.0, -6, (3, 0, 0, 0, 0, 0)),),
    "%": (Symbol(1.0, -2, _NONE),),
    "‰": (Symbol(1.0, -3, _NONE),),
    "ppm": (Symbol(1.0, -6, _NONE),),
    "molecule": (_MOLECULE,),
    "residue": (_MOLECULE,),
}  # fmt: skip

_SPELLINGS: Final[dict[str, tuple[str, ...]]] = {
    "molecule": (
        "molecules", "molec", "molecs", "molecul", "mlc", "mlcl", "mol.", "lipid", "lipids", "molekül",
        "Molekül", "molekul", "Molekul", "molécule", "molécula", "molecola", "Molecule", "Molec", "Lipid",
    ),
    "residue": ("residues", "monomer", "monomers"),
    "s": ("sec", "secs", "second", "seconds", "Sec", "Sekunde", "Sekunden", "sek", "Sek", "secondes",
          "segundos", "Seconds", "Second"),
    "min": ("mins", "minute", "minutes", "Min", "Minuten", "minutos", "Minutes"),
    "h": ("hr", "hrs", "hour", "hours", "Std", "Stunden", "heures", "horas", "Hours"),
    "d": ("day", "days"),
    "dyn": ("dyne", "dynes", "Dyn", "Dyne", "dyns"),
    "degC": ("celsius", "Celsius"),
    "K": ("kelvin", "Kelvin"),
    "Å": ("angstrom", "Angstrom", "ångström", "Ångström", "angström", "Ang", "ang", "angstroms"),
    "in": ("inch", "inches"),
    "ohm": ("Ω", "Ohm", "ohms", "Ohms"),
    "V": ("volt", "volts", "Volt", "Volts"),
    "m": ("metre", "meter", "metres", "meters"),
    "Da": ("dalton", "Dalton", "amu"),
    "mol": ("mole", "moles", "Mol"),
    "L": ("litre", "liter", "litres", "liters"),
    "%": ("percent",),
}  # fmt: skip
for _symbol, _others in _SPELLINGS.items():
    for _other in _others:
        SYMBOLS[_other] = SYMBOLS[_symbol]
SYMBOLS["msec"] = (Symbol(1.0, -3, (0, 0, 1, 0, 0, 0)),)
SYMBOLS["micron"] = SYMBOLS["microns"] = (Symbol(1.0, -6, (1, 0, 0, 0, 0, 0)),)

# Whole units as typed carelessly (case lost, or run together), folded to lower case without blanks.
WHOLE: Final[dict[str, str]] = {
    "mn/m": "mN/m", "mnm-1": "mN/m", "mn.m-1": "mN/m", "mn·m-1": "mN/m", "mnm^-1": "mN/m",
    "mnperm": "mN/m", "n/m": "N/m", "dyn/cm": "dyn/cm", "dyne/cm": "dyn/cm",
    "dynes/cm": "dyn/cm", "dyncm-1": "dyn/cm", "mj/m2": "mJ/m^2", "mj/m^2": "mJ/m^2", "cm2": "cm^2",
    "cm^2": "cm^2", "sqcm": "cm^2", "qcm": "cm^2", "mm2": "mm^2", "mm^2": "mm^2", "sqmm": "mm^2",
    "nm2": "nm^2",
    "nm^2": "nm^2", "sqnm": "nm^2", "a2": "Å^2", "å2": "Å^2", "å^2": "Å^2", "a^2": "Å^2",
    "sqa": "Å^2", "sqå": "Å^2",
    "sec": "s", "min": "min", "h": "h", "s": "s", "mm": "mm", "cm": "cm", "mv": "mV", "v": "V",
    "c": "degC", "k": "K", "ml": "mL", "ul": "uL", "mg/ml": "mg/mL", "g/l": "g/L", "g/mol": "g/mol",
    "mmol/l": "mmol/L", "ms": "ms", "m2": "m^2",
    "å2/molecule": "Å^2/molecule", "a2/molecule": "Å^2/molecule",
}  # fmt: skip

# name -> the units (this project's labels) a quantity of that kind is kept in.
DIMENSIONS: Final[dict[str, tuple[str, ...]]] = {
    "length": ("mm",),
    "thickness": ("nm",),
    "area": ("cm^2",),
    "molecular_area": ("nm^2",),
    "pressure": ("mN/m",),
    "time": ("s",),
    "temperature": ("degC",),
    "potential": ("mV",),
    "volume": ("µL",),
    "concentration": ("mg/mL", "mmol/L"),
    "molar_mass": ("g/mol",),
    "fraction": ("1",),
    "speed": ("mm/s",),
    "rate": ("1/s",),
}
