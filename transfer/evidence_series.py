"""Measurements on the deposited film as read: points of one kind, and the set of all kinds."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity

__all__ = [
    "EvidencePoint",
    "EvidenceSeries",
    "EvidenceSet",
    "Impedance",
    "RawRecord",
    "Voltammogram",
]

FloatArray = NDArray[np.float64]
Setting = Quantity | int | str | bool


@dataclass(frozen=True)
class Voltammogram:
    """A cyclic or linear voltammogram: potential V and current A, rows in file order."""

    potential: FloatArray
    current: FloatArray
    path: str


@dataclass(frozen=True)
class Impedance:
    """An impedance record: frequency Hz, real and imaginary part ohm (imaginary is negative
    for a capacitor), rows in file order."""

    frequency: FloatArray
    real: FloatArray
    imaginary: FloatArray
    path: str


@dataclass(frozen=True)
class RawRecord:
    """One raw file and how it was taken. scan_rate V/s, frequency Hz (to read a spectrum at)."""

    curve: Voltammogram | Impedance
    scan_rate: Quantity | None = None
    frequency: Quantity | None = None


@dataclass(frozen=True)
class EvidencePoint:
    """One measurement.

    Parameters
    ----------
    axis : "layers" | "stroke"
        What `position` counts; 0 is the bare substrate.
    position : int
    value : Quantity or None
        In the kind's fixed unit; u None where it was not given. None where `records` give it.
    records : tuple of RawRecord
    where : str
        File and line or key, for messages.
    """

    axis: str
    position: int
    value: Quantity | None
    records: tuple[RawRecord, ...] = ()
    where: str = ""


@dataclass(frozen=True)
class EvidenceSeries:
    """All points of one kind taken in one way. `settings` hold quantities in fixed units."""

    kind: str
    label: str
    points: tuple[EvidencePoint, ...]
    settings: dict[str, Setting] = field(default_factory=dict)
    where: str = ""

    def quantity(self, key: str) -> Quantity | None:
        """The setting `key` as a quantity; None where it was not given."""
        value = self.settings.get(key)
        if isinstance(value, Quantity):
            return value
        if isinstance(value, int) and not isinstance(value, bool):
            return Quantity(float(value), 0.0, "1")
        return None

    def text(self, key: str) -> str | None:
        """The setting `key` as text; None where it was not given."""
        value = self.settings.get(key)
        return value if isinstance(value, str) else None


@dataclass(frozen=True)
class EvidenceSet:
    """Everything one evidence file says. sha256 is that of the file's bytes."""

    path: str
    sha256: str
    series: tuple[EvidenceSeries, ...]
    raw_files: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
