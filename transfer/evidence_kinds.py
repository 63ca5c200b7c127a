"""Every kind of evidence: what it measures, in which units, and which settings it takes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from isotherm.sheet_schema import Key

__all__ = ["COMMON", "ELECTRODE", "KINDS", "POINT_KEYS", "Kind"]


@dataclass(frozen=True)
class Kind:
    """One kind of evidence.

    Parameters
    ----------
    name : str
        As the evidence file has it.
    meaning : str
        One line.
    units : tuple of str
        Fixed units a value may be kept in; the first whose dimension fits is taken.
    keys : tuple of Key
        Settings beside the common ones.
    files : str
        What a raw file of this kind holds: "" (none), "voltammogram", "capacitance" (voltammogram
        or impedance).
    lowest : float
        Values below are impossible.
    """

    name: str
    meaning: str
    units: tuple[str, ...]
    keys: tuple[Key, ...] = ()
    files: str = ""
    lowest: float = float("-inf")

    @property
    def words(self) -> str:
        """The kind's name as people write it."""
        plain = self.name.replace("_", " ")
        return plain.replace("xray", "X-ray").replace("bragg", "Bragg")


# Bounds are physical, or so wide that only a slip crosses them.
def _positive(
    name: str, dimension: str, meaning: str, example: str, low: float, high: float
) -> Key:
    return Key(name, "quantity", meaning, f'"{example}"', dimension, low, high)


def _whole(name: str, meaning: str, example: int, high: int) -> Key:
    return Key(name, "integer", meaning, str(example), low=1, high=high)


COMMON: Final = (
    Key("label", "text", "what to call this series", '"crystal B"'),
    Key("film", "text", "which of alternating films it sees; all when left out", '"spacer"'),
    Key("intercept", "choice", "value of the bare substrate: fitted, or zero", '"free"',
        choices=("free", "zero")),
    _positive("common_uncertainty", "fraction",
              "relative u shared by all its values (calibration, optical model)", "2 %", 1e-9, 1.0),
)  # fmt: skip
_FACES: Final = _whole("faces", "faces coated and seen by the measurement", 2, 2)
_FRACTION: Final = _positive(
    "fraction",
    "fraction",
    "part of the molecules that carries the group measured",
    "1.0",
    1e-9,
    1.0,
)

_SCAN_RATE: Final = _positive("scan_rate", "V/s", "of the voltammograms", "50 mV/s", 1e-7, 1e7)

ELECTRODE: Final = (
    _positive("area", "cm^2", "geometric area", "0.196 ± 0.004 cm^2", 1e-10, 1e6),
    _positive("roughness", "fraction", "true area over geometric area", "1.15 ± 0.05", 0.1, 1e4),
)
_ELECTRODE_COLUMNS: Final = (
    _positive("electrode_area", "cm^2", "geometric area", "0.196 ± 0.004 cm^2", 1e-10, 1e6),
    _positive("roughness", "fraction", "true area over geometric area", "1.15 ± 0.05", 0.1, 1e4),
)

POINT_KEYS: Final = (
    "layers", "stroke", "value", "u", "unit", "file", "files", "scan_rate", "scan_rates", "frequency",
)  # fmt: skip

_LIST: Final = (
    Kind(
        "absorbance",
        "absorbance (decadic) of the coated substrate",
        ("1",),
        (
            _positive("absorptivity", "L/mol/cm", "molar, decadic, at the wavelength measured",
                      "1.2e4 ± 0.05e4 L/(mol·cm)", 1e-3, 1e9),
            _positive("orientation", "fraction",
                      "absorption relative to random molecules (3/2: in the plane)", "1.5", 1e-6, 3.0),
            _FRACTION,
            _FACES,
        ),
    ),
    Kind(
        "resonator_frequency",
        "frequency, or its change, of a coated quartz resonator",
        ("Hz",),
        (
            _positive("crystal_frequency", "Hz", "fundamental of the bare crystal", "5 MHz", 1e3, 1e10),
            _whole("overtone", "overtone measured at", 1, 101),
            _FACES,
        ),
    ),
    Kind("ellipsometric_thickness", "thickness by ellipsometry", ("nm",)),
    Kind("xray_thickness", "thickness by X-ray reflectivity fringes", ("nm",)),
    Kind(
        "bragg_spacing",
        "repeat distance from Bragg peaks",
        ("nm",),
        (_whole("layers_per_period", "layers in one repeat: 2 for Y, 1 for X and Z", 2, 1000),),
        lowest=0.0,
    ),
    Kind(
        "electroactive_coverage",
        "coverage, or charge, of a surface-bound wave; or its voltammogram",
        ("mol/cm^2", "C", "C/cm^2"),
        (
            _whole("electrons", "electrons per molecule", 1, 100),
            _FRACTION,
            _SCAN_RATE,
            *_ELECTRODE_COLUMNS,
        ),
        files="voltammogram",
        lowest=0.0,
    ),
    Kind(
        "interfacial_capacitance",
        "capacitance; or voltammograms at several scan rates; or impedance",
        ("F", "F/cm^2"),
        (
            _positive("permittivity", "fraction", "relative permittivity of the film", "2.6 ± 0.1", 1.0, 1e4),
            _SCAN_RATE,
            Key("at", "quantity", "potential at which the charging current is read", '"0.10 V"', "V",
                -1e3, 1e3),
            _positive("frequency", "Hz", "at which the impedance is read", "100 Hz", 1e-6, 1e12),
            *_ELECTRODE_COLUMNS,
        ),
        files="capacitance",
        lowest=0.0,
    ),
    Kind(
        "blocking_test",
        "current or charge of a dissolved couple, or its charge-transfer resistance",
        ("A", "A/cm^2", "C", "ohm", "ohm·cm^2"),
        lowest=0.0,
    ),
)  # fmt: skip

KINDS: Final[dict[str, Kind]] = {
    kind.name: Kind(
        kind.name, kind.meaning, kind.units, (*COMMON, *kind.keys), kind.files, kind.lowest
    )
    for kind in _LIST
}
