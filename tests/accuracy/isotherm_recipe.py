"""Which film is simulated: landmarks drawn at random inside what is known of such films.

Ranges follow the general literature (from memory, approximate): phosphatidylcholines with a
coexistence at 3-14 mN/m and collapse at 50-72; straight-chain acids with lift-off near 0.25 nm^2,
a kink near 24 mN/m and collapse at 45-62; unsaturated lipids liquid-expanded to 40-47 mN/m;
ethanolamines condensed from lift-off near 0.5 nm^2.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

__all__ = ["FILM_FAMILIES", "Recipe", "draw_recipe"]

FILM_FAMILIES = (
    "coexistence",
    "kink",
    "le",
    "condensed",
    "coexistence_kink",
    "gas",
    "stopped",
)


@dataclass(frozen=True)
class Recipe:
    """Landmarks of one film. Areas nm^2, pressures and moduli mN/m.

    onset, end : (area, pressure) of the coexistence, None without one.
    moduli : of the condensed branches, in order of compression; empty for a fluid film.
    top : pressure of collapse, or where the trace stops when `collapse` is None.
    fluid_top : area where a fluid film reaches `top`.
    overrun : how far, in ln area, the barrier goes on after collapse.
    softness : factor on the rounding of every knee.
    """

    family: str
    start: float
    lift_off: float
    top: float
    collapse: str | None
    onset: tuple[float, float] | None = None
    end: tuple[float, float] | None = None
    moduli: tuple[float, ...] = ()
    kink_pressure: float | None = None
    fluid_top: float | None = None
    overrun: float = 0.1
    softness: float = 1.0

    @property
    def fluid(self) -> bool:
        """True where the first branch is liquid-expanded."""
        return self.onset is not None or self.fluid_top is not None


def _ending(rng: np.random.Generator) -> str | None:
    return (None, "constant-area", "constant-pressure")[int(rng.choice(3, p=[0.3, 0.3, 0.4]))]


def _stop(rng: np.random.Generator, lowest: float, highest: float) -> float:
    """A pressure well below collapse where the barrier is stopped."""
    return float(rng.uniform(lowest + 0.25 * (highest - lowest), 0.97 * highest))


def _coexistence(rng: np.random.Generator, *, kink: bool) -> Recipe:
    while True:
        onset = (float(rng.uniform(0.68, 0.86)), float(rng.uniform(3.0, 14.0)))
        lift = float(rng.uniform(1.12, 1.4)) * onset[0]
        end = (
            float(onset[0] * rng.uniform(0.66, 0.85)),
            float(onset[1] + rng.uniform(0.3, 3.0)),
        )
        plateau = (end[1] - onset[1]) / math.log(onset[0] / end[0])
        fluid = onset[1] / math.log(lift / onset[0])
        # a coexistence is a low modulus between two higher ones: below 12.5 mN/m by the customary
        # ranges and clearly below the branch before it
        if plateau < 10.0 and 12.0 < fluid < 45.0 and fluid > 2.5 * plateau:
            break
    collapse = _ending(rng)
    top = float(rng.uniform(50.0, 72.0))
    if not kink:
        moduli: tuple[float, ...] = (float(rng.uniform(100.0, 260.0)),)
        kink_pressure = None
        lowest = end[1] + 8.0
    else:
        first = float(rng.uniform(80.0, 150.0))
        moduli = (first, first * float(rng.uniform(1.7, 3.5)))
        kink_pressure = float(rng.uniform(end[1] + 9.0, min(top - 14.0, 45.0)))
        lowest = kink_pressure + 8.0
    if collapse is None:
        top = _stop(rng, lowest, top)
    return Recipe(
        family="coexistence_kink" if kink else "coexistence",
        start=lift * float(rng.uniform(1.06, 1.5)),
        lift_off=lift,
        top=top,
        collapse=collapse,
        onset=onset,
        end=end,
        moduli=moduli,
        kink_pressure=kink_pressure,
    )


def _kink(rng: np.random.Generator) -> Recipe:
    lift = float(rng.uniform(0.232, 0.262))
    kink = float(rng.uniform(16.0, 32.0))
    first = float(rng.uniform(80.0, 180.0))
    collapse = _ending(rng)
    top = float(rng.uniform(max(45.0, kink + 16.0), 62.0))
    moduli: tuple[float, ...] = (first, first * float(rng.uniform(2.2, 7.0)))
    kink_pressure: float | None = kink
    if collapse is None and rng.random() < 0.2:  # stopped before the kink: none to find
        top, moduli, kink_pressure = kink * float(rng.uniform(0.6, 0.9)), (first,), None
    elif collapse is None:
        top = _stop(rng, kink + 8.0, top)
    return Recipe(
        family="kink",
        start=lift * float(rng.uniform(1.06, 1.7)),
        lift_off=lift,
        top=top,
        collapse=collapse,
        moduli=moduli,
        kink_pressure=kink_pressure,
    )


def _fluid(rng: np.random.Generator) -> Recipe:
    lift = float(rng.uniform(0.98, 1.25))
    top = float(rng.uniform(39.0, 48.0))
    return Recipe(
        family="le",
        start=lift * float(rng.uniform(1.05, 1.5)),
        lift_off=lift,
        top=top,
        collapse=_ending(rng),
        fluid_top=lift * float(rng.uniform(0.46, 0.58)),
    )


def _shorten_fluid(recipe: Recipe, rng: np.random.Generator, reach: float) -> Recipe:
    """Stop a fluid film at `reach` of its top pressure, keeping the shape of its branch."""
    assert recipe.fluid_top is not None
    # the branch is convex: pressure fraction f is reached at about f**0.7 of the way in ln area
    way = math.log(recipe.lift_off / recipe.fluid_top) * reach**0.7
    return replace(
        recipe,
        top=recipe.top * reach,
        collapse=None,
        fluid_top=recipe.lift_off * math.exp(-way),
        start=recipe.lift_off * float(rng.uniform(1.06, 1.4)),
    )


def _condensed(rng: np.random.Generator) -> Recipe:
    lift = float(rng.uniform(0.40, 0.54))
    collapse = _ending(rng)
    top = float(rng.uniform(44.0, 64.0))
    return Recipe(
        family="condensed",
        start=lift * float(rng.uniform(1.06, 1.7)),
        lift_off=lift,
        top=top if collapse else _stop(rng, 12.0, top),
        collapse=collapse,
        moduli=(float(rng.uniform(110.0, 420.0)),),
    )


def _stopped(rng: np.random.Generator) -> Recipe:
    if rng.random() < 0.5:
        return replace(
            _shorten_fluid(_fluid(rng), rng, float(rng.uniform(0.2, 0.9))), family="stopped"
        )
    whole = _coexistence(rng, kink=False)
    assert whole.onset is not None
    return Recipe(
        family="stopped",
        start=whole.start,
        lift_off=whole.lift_off,
        top=whole.onset[1],
        collapse=None,
        fluid_top=whole.onset[0],
    )


def draw_recipe(family: str, rng: np.random.Generator) -> Recipe:
    """Draw the landmarks of one film of `family` (one of FILM_FAMILIES)."""
    if family == "coexistence":
        recipe = _coexistence(rng, kink=False)
    elif family == "coexistence_kink":
        recipe = _coexistence(rng, kink=True)
    elif family == "kink":
        recipe = _kink(rng)
    elif family == "le":
        recipe = _fluid(rng)
        if recipe.collapse is None:
            recipe = _shorten_fluid(recipe, rng, float(rng.uniform(0.5, 0.95)))
    elif family == "condensed":
        recipe = _condensed(rng)
    elif family == "stopped":
        recipe = _stopped(rng)
    elif family == "gas":
        recipe = Recipe(family, float(rng.uniform(4.0, 15.0)), 0.0, 0.0, None)
    else:
        raise ValueError(f"unknown family {family!r}; known: {', '.join(FILM_FAMILIES)}")
    return replace(recipe, overrun=float(rng.uniform(0.04, 0.2)))
