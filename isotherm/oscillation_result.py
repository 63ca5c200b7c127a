"""What barrier oscillations say, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number
from isotherm.series import Row, quantity_cells

__all__ = ["AmplitudeCheck", "OscillationResult", "OscillationSegment", "QuasiStatic"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class QuasiStatic:
    """|E*| against the isotherm's compression modulus at the same pressure.

    ratio : unit "1". p : of a ratio this far from one by chance.
    """

    modulus: Quantity
    ratio: Quantity
    p: float

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "modulus": self.modulus.to_json(),
            "ratio": self.ratio.to_json(),
            "p": json_number(self.p),
        }


@dataclass(frozen=True)
class OscillationSegment:
    """One stretch of constant frequency and amplitude.

    frequency Hz; amplitude: of ln A, 1; pressure and pressure_amplitude mN/m; storage, loss and modulus
    mN/m; phase degrees; viscosity: loss/ω, mN s/m. area_distortion, pressure_distortion: second and
    third harmonic over the first, 1. nonlinearity: the part of the pressure's harmonics that the
    area's own do not explain, 1; linear: whether it may be below the limit.
    strain, pressure_wave : (m,) ln A and Π about their drift, for the loop.
    """

    number: int
    start: float
    end: float
    cycles: float
    frequency: Quantity
    amplitude: Quantity
    pressure: Quantity
    pressure_amplitude: Quantity
    storage: Quantity
    loss: Quantity
    modulus: Quantity
    phase: Quantity
    viscosity: Quantity
    area_distortion: float
    pressure_distortion: float
    nonlinearity: Quantity
    linear: bool
    quasi_static: QuasiStatic | None
    strain: FloatArray
    pressure_wave: FloatArray
    flags: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "number": self.number,
            "start_s": self.start,
            "end_s": self.end,
            "cycles": self.cycles,
            "frequency": self.frequency.to_json(),
            "amplitude": self.amplitude.to_json(),
            "pressure": self.pressure.to_json(),
            "pressure_amplitude": self.pressure_amplitude.to_json(),
            "storage": self.storage.to_json(),
            "loss": self.loss.to_json(),
            "modulus": self.modulus.to_json(),
            "phase": self.phase.to_json(),
            "viscosity": self.viscosity.to_json(),
            "area_distortion": json_number(self.area_distortion),
            "pressure_distortion": json_number(self.pressure_distortion),
            "nonlinearity": self.nonlinearity.to_json(),
            "linear": self.linear,
            "quasi_static": None if self.quasi_static is None else self.quasi_static.to_json(),
            "flags": list(self.flags),
        }


@dataclass(frozen=True)
class AmplitudeCheck:
    """Segments of one frequency (Hz) and several amplitudes: does the modulus depend on amplitude?

    change : relative change of |E*| from the smallest to the largest amplitude, 1.
    reading : "linear" or "depends on amplitude".
    """

    frequency: float
    segments: tuple[int, ...]
    amplitudes: tuple[float, float]
    change: Quantity
    p: float
    reading: str

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "frequency": self.frequency,
            "segments": list(self.segments),
            "amplitudes": list(self.amplitudes),
            "change": self.change.to_json(),
            "p": json_number(self.p),
            "reading": self.reading,
        }


@dataclass(frozen=True)
class OscillationResult:
    """Everything one record of barrier oscillations gave. time s, area nm^2, pressure mN/m: thinned."""

    name: str
    path: str
    segments: tuple[OscillationSegment, ...]
    amplitude_checks: tuple[AmplitudeCheck, ...]
    time: FloatArray
    area: FloatArray
    pressure: FloatArray
    limit: float
    warnings: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.oscillation/1."""
        return {
            "schema": "upstroke.oscillation/1",
            "name": self.name,
            "path": self.path,
            "settings": {"nonlinearity_limit": self.limit},
            "warnings": list(self.warnings),
            "segments": [s.to_json() for s in self.segments],
            "amplitude_checks": [a.to_json() for a in self.amplitude_checks],
        }

    def rows(self) -> list[Row]:
        """One row a segment."""
        rows: list[Row] = []
        for s in self.segments:
            row: Row = {"name": self.name, "segment": s.number, "start_s": s.start, "end_s": s.end}
            row["cycles"] = s.cycles
            for name in (
                "frequency",
                "amplitude",
                "pressure",
                "storage",
                "loss",
                "modulus",
                "phase",
                "viscosity",
                "nonlinearity",
            ):
                row.update(quantity_cells(name, getattr(s, name)))
            row["linear"] = int(s.linear)
            row.update(
                quantity_cells("quasi_static", s.quasi_static.modulus if s.quasi_static else None)
            )
            row["flags"] = "; ".join(s.flags)
            rows.append(row)
        return rows
