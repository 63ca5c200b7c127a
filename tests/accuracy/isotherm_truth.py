"""What a simulated isotherm is known to be: the answer key, and the noise-free film behind it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "Film",
    "FloatArray",
    "TrueCollapse",
    "TruePoint",
    "TrueTransition",
    "Truth",
    "finish_truth",
    "limiting_area",
]

FloatArray = NDArray[np.float64]
Curve = Callable[[FloatArray], FloatArray]

# A rise counts as sharp when the first branch starts with at least this modulus (mN/m): condensed,
# by the customary ranges (50 mN/m is the top of liquid-expanded). A softer foot has no single area
# a person would call lift-off, so no truth is claimed there.
SHARP_MODULUS = 50.0
# An area at a pressure is a property of the film only where the film resists: below this modulus
# (gas or coexistence in the customary ranges) the area is set by the zero, not by the film.
DEFINED_MODULUS = 12.5
# The limiting area is scored only where the choice of the stretch regressed does not decide it.
LIMITING_AGREEMENT = 4e-3


@dataclass(frozen=True)
class TruePoint:
    """Area (nm^2) and pressure (mN/m) where two branches meet when extended."""

    area: float
    pressure: float


@dataclass(frozen=True)
class TrueTransition:
    """`coexistence` has onset and end, `kink` has at."""

    kind: str
    onset: TruePoint | None = None
    end: TruePoint | None = None
    at: TruePoint | None = None


@dataclass(frozen=True)
class TrueCollapse:
    """kind is `constant-area` or `constant-pressure`."""

    kind: str
    area: float
    pressure: float


@dataclass(frozen=True)
class Truth:
    """The answer key of one trace; pressures exclude zero offset and drift.

    lift_off, limiting_area: nm^2, None where the film has no single such value (then not scored).
    area_at: pressure (mN/m) -> area (nm^2), only where the film is stiff enough to define it.
    knees: areas (nm^2, falling) of every knee, lift-off and collapse included, for the limit fit.
    """

    family: str
    generator: str
    collapse: TrueCollapse | None
    transitions: tuple[TrueTransition, ...]
    lift_off: float | None
    limiting_area: float | None
    area_at: dict[float, float]
    highest_pressure: float
    knees: tuple[float, ...]
    foot: float  # nm^2, where the first branch leaves zero pressure, sharp or not
    noise: float = 0.0
    settings: dict[str, float | str] = field(default_factory=dict)


@dataclass(frozen=True)
class Film:
    """A noise-free compression: area falling (m,) nm^2, pressure (m,) mN/m, and its truth."""

    area: FloatArray
    pressure: FloatArray
    truth: Truth


def limiting_area(branch: Curve, first: float, last: float) -> float | None:
    """Extend the least-squares line over `branch` between two areas (nm^2) to zero pressure.

    Returns None when the line over the middle four fifths gives another area: the branch is then
    too curved for the word to have one meaning.
    """

    def foot(high: float, low: float) -> float:
        area = np.linspace(low, high, 400)
        slope, intercept = np.polyfit(area, branch(area), 1)
        return float(-intercept / slope)

    trim = 0.1 * (first - last)
    whole, middle = foot(first, last), foot(first - trim, last + trim)
    return whole if abs(middle / whole - 1) < LIMITING_AGREEMENT else None


def finish_truth(
    area: FloatArray,
    pressure: FloatArray,
    *,
    family: str,
    generator: str,
    knees: dict[str, TruePoint],
    collapse_kind: str | None,
    first_modulus: float,
    limiting: float | None,
    foot: float,
    wanted: tuple[float, ...] = (10.0, 20.0, 30.0),
) -> Truth:
    """Assemble the key from named knees: lift_off, onset, end, kink, collapse."""
    transitions: list[TrueTransition] = []
    if "onset" in knees:
        transitions.append(
            TrueTransition("coexistence", onset=knees["onset"], end=knees.get("end"))
        )
    if "kink" in knees:
        transitions.append(TrueTransition("kink", at=knees["kink"]))
    collapse = None
    if collapse_kind is not None:
        point = knees["collapse"]
        collapse = TrueCollapse(collapse_kind, point.area, point.pressure)
    top = int(np.argmax(pressure))
    if collapse is not None:
        top = min(top, int(np.searchsorted(-area, -collapse.area)))
    rising_a, rising_p = area[: top + 1], pressure[: top + 1]
    areas: dict[float, float] = {}
    for level in wanted:
        above = np.flatnonzero(rising_p >= level)
        if above.size == 0 or above[0] < 3 or above[0] + 3 >= rising_p.size:
            continue
        i = int(above[0])
        modulus = -(rising_p[i + 3] - rising_p[i - 3]) / np.log(rising_a[i + 3] / rising_a[i - 3])
        if modulus < DEFINED_MODULUS:
            continue
        areas[level] = float(np.interp(level, rising_p[i - 1 : i + 1], rising_a[i - 1 : i + 1]))
    sharp = "lift_off" in knees and first_modulus >= SHARP_MODULUS
    return Truth(
        family=family,
        generator=generator,
        collapse=collapse,
        transitions=tuple(transitions),
        lift_off=knees["lift_off"].area if sharp else None,
        limiting_area=limiting,
        area_at=areas,
        highest_pressure=float(pressure.max()),
        knees=tuple(sorted((k.area for k in knees.values()), reverse=True)),
        foot=foot,
    )
