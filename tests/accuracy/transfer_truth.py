"""What a simulated dipping log holds, and what is true of it. Shared by the generators and the score."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from isotherm.sheet import Dipping, RunSheet, Substrate, Trough

__all__ = ["Body", "SimulatedLog", "StrokeTruth", "Truth", "make_sheet"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class SimulatedLog:
    """The recorded columns: s, reading of the dipper in mm, trough area in cm^2, mN/m; all (n,)."""

    time: FloatArray
    position: FloatArray
    area: FloatArray
    pressure: FloatArray


@dataclass(frozen=True)
class StrokeTruth:
    """One passage of the substrate through the film.

    start, end : s, of the whole motion; wet_start, wet_end : s, while the waterline is on the substrate.
    coated_area : cm^2, by geometry; ratio : film taken (area at the set pressure) over coated_area.
    judgeable : False where pressure control was lost in the stroke or the log ends inside it.
    flag_due : whether a TR given all the same needs a flag (control lost by more than 1 mN/m, or cut off).
    """

    start: float
    end: float
    wet_start: float
    wet_end: float
    direction: str
    coated_area: float
    ratio: float
    judgeable: bool = True
    flag_due: bool = False


@dataclass(frozen=True)
class Truth:
    """Everything the score may ask. `type` is None where the strokes made cannot tell it."""

    seed: int
    family: str
    strokes: tuple[StrokeTruth, ...]
    type: str | None
    renewals: tuple[tuple[float, float], ...]
    contact: float  # reading of the dipper with the lower edge at the surface, mm
    modulus: float  # mN/m
    creep: float  # mean relative loss per second over the log
    drop_after: int | None = None  # number of the stroke after which TR falls by 20 %
    steady: bool = False  # TR level throughout, so any change point is invented
    exact_sheet: bool = True  # geometry and contact in the sheet carry no error
    contact_given: bool = True
    traits: tuple[str, ...] = field(default=())
    ready: float = 0.0  # s, from when on the first film is at its set pressure


@dataclass(frozen=True)
class Body:
    """The true substrate. Lengths in mm; face is the area of its lower end, cm^2."""

    shape: str
    width: float = 0.0
    thickness: float = 0.0
    diameter: float = 0.0

    @property
    def perimeter(self) -> float:
        """Waterline, mm."""
        if self.shape == "rod":
            return float(np.pi * self.diameter)
        return 2.0 * (self.width + self.thickness)

    @property
    def face(self) -> float:
        """Lower end, cm^2."""
        if self.shape == "rod":
            return float(np.pi * self.diameter**2 / 4.0) / 100.0
        return self.width * self.thickness / 100.0

    def below(self, depth: float) -> float:
        """Area (cm^2) under water with the lower edge `depth` mm below the surface."""
        return 0.0 if depth <= 0.0 else self.perimeter * depth / 100.0 + self.face


def _length(rng: np.random.Generator, true: float, u: float | None, digits: int) -> Quantity:
    """Return what a careful user would write: without u it is exact, with u it is off by a draw of u."""
    if u is None:
        return Quantity(true, None, "mm")
    return Quantity(round(true + u * float(rng.standard_normal()), digits), u, "mm")


def make_sheet(
    rng: np.random.Generator,
    body: Body,
    *,
    pressure: float,
    modulus: float | None,
    modulus_u: float | None,
    reads: str,
    contact: float | None,
    exact: bool,
    wetting: bool | None,
    smallest_area: float,
) -> RunSheet:
    """Write the run sheet of a simulated log; with exact=False every length is off by a draw of its u.

    pressure, modulus, modulus_u in mN/m, contact in mm (None: not given), smallest_area in cm^2.
    """
    size_u, contact_u = (None, None) if exact else (0.03, 0.04)
    if body.shape == "rod":
        substrate = Substrate(
            shape="rod", diameter=_length(rng, body.diameter, size_u, 3), wetting=wetting
        )
    else:
        substrate = Substrate(
            shape="plate",
            width=_length(rng, body.width, size_u, 3),
            thickness=_length(rng, body.thickness, None if exact else 0.01, 3),
            wetting=wetting,
        )
    return RunSheet(
        title="simulated log",
        trough=Trough(smallest_area=Quantity(smallest_area, None, "cm^2")),
        substrate=substrate,
        dipping=Dipping(
            pressure=Quantity(pressure, None, "mN/m"),
            position_reads=reads,
            surface_at=None if contact is None else _length(rng, contact, contact_u, 3),
            modulus=None if modulus is None else Quantity(modulus, modulus_u, "mN/m"),
        ),
    )
