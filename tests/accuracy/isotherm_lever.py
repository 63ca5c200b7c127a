"""Generator 'lever': equations of state, A(Π), with a lever rule where two phases coexist.

A fluid obeying Volmer's equation and an elastic condensed phase share the film; the condensed part
grows along Π = Πt + S x + δ ln(x/(1 - x)), S the rise over the coexistence and δ the finite
cooperativity. A second-order change of compressibility makes the kink. Inhomogeneity along the
trough smears the result over ln A.
"""

from __future__ import annotations

import math

import numpy as np
from isotherm_pieces import KT, after_collapse, volmer
from isotherm_recipe import Recipe
from isotherm_truth import (
    Film,
    FloatArray,
    TruePoint,
    finish_truth,
    limiting_area,
)
from scipy.ndimage import gaussian_filter1d
from scipy.special import expit

__all__ = ["gas_film", "lever_film"]

POINTS = 24_000


class _Condensed:
    """A(Π) of the condensed phase: elastic, its compressibility stepping at the kink."""

    def __init__(self, recipe: Recipe, rng: np.random.Generator) -> None:
        self.area, self.pressure = recipe.end if recipe.end else (recipe.lift_off, 0.0)
        self.moduli = recipe.moduli
        self.kink = recipe.kink_pressure
        self.width = float(rng.uniform(0.05, 0.6))  # mN/m

    def log_area(self, pressure: FloatArray) -> FloatArray:
        """ln A (n,) at `pressure` (n,), by integrating the compressibility."""
        first = 1 / self.moduli[0]
        out = math.log(self.area) - first * (pressure - self.pressure)
        if self.kink is not None:
            change = 1 / self.moduli[1] - first
            z = (pressure - self.kink) / self.width
            out = out - change * self.width * np.logaddexp(0.0, z)
        return np.asarray(out)

    def branch(self, last: bool) -> tuple[float, float, float]:
        """(area, pressure, modulus) that fix the first or the last branch, unrounded."""
        if not last or self.kink is None:
            return self.area, self.pressure, self.moduli[0]
        at = self.area * math.exp(-(self.kink - self.pressure) / self.moduli[0])
        return at, self.kink, self.moduli[1]


def _plateau_knees(
    fluid_area: FloatArray, condensed_area: FloatArray, pressure: FloatArray, part: FloatArray
) -> tuple[TruePoint, TruePoint]:
    """Where the coexistence, extended as a quadratic in A, meets the fluid and the condensed."""
    area = (1 - part) * fluid_area + part * condensed_area
    inside = (part > 0.08) & (part < 0.92)
    plateau = np.polynomial.Polynomial.fit(area[inside], pressure[inside], 2)

    def meet(branch: FloatArray) -> TruePoint:
        gap = plateau(branch) - pressure
        turns = np.flatnonzero((gap[1:] <= 0) != (gap[:-1] <= 0))
        middle = pressure[int(np.argmin(np.abs(part - 0.5)))]
        i = int(turns[np.argmin(np.abs(pressure[turns] - middle))])
        way = gap[i] / (gap[i] - gap[i + 1])
        return TruePoint(
            float(branch[i] + way * (branch[i + 1] - branch[i])),
            float(pressure[i] + way * (pressure[i + 1] - pressure[i])),
        )

    return meet(fluid_area), meet(condensed_area)


def lever_film(recipe: Recipe, rng: np.random.Generator) -> Film:
    """Build the film of `recipe` from its equations of state."""
    knees: dict[str, TruePoint] = {"lift_off": TruePoint(recipe.lift_off, 0.0)}
    condensed = _Condensed(recipe, rng) if recipe.moduli else None
    high = recipe.top + 3.0
    grid = np.linspace(0.0, high, POINTS)
    if recipe.fluid:
        goal = recipe.onset if recipe.onset is not None else (recipe.fluid_top or 0.0, recipe.top)
        scale = goal[1] * (recipe.lift_off - goal[0]) / KT * float(rng.uniform(0.6, 2.0))
        strength, omega, cohesion = volmer(recipe.lift_off, *goal, scale)
    if recipe.onset is not None and recipe.end is not None and condensed is not None:
        rise = recipe.end[1] - recipe.onset[1]
        delta = float(rng.uniform(0.002, 0.012)) * min(2.0, recipe.onset[1])
        # ln(x/(1-x)) spans the film from zero pressure to the top; evenly in Π, then in x
        logit = np.unique(
            np.concatenate(
                [
                    np.linspace(-recipe.onset[1] / delta, (high - recipe.end[1]) / delta, POINTS),
                    np.linspace(-12.0, 12.0, POINTS // 2),
                ]
            )
        )
        part = expit(logit)
        grid = recipe.onset[1] + rise * part + delta * logit
        fluid_area = omega + strength / (grid + cohesion)
        solid_area = np.exp(condensed.log_area(grid))
        area = (1 - part) * fluid_area + part * solid_area
        knees["onset"], knees["end"] = _plateau_knees(fluid_area, solid_area, grid, part)
    elif condensed is not None:
        area = np.exp(condensed.log_area(grid))
    else:
        area = omega + strength / (grid + cohesion)
    if condensed is not None and condensed.kink is not None:
        at = condensed.branch(last=True)
        knees["kink"] = TruePoint(at[0], at[1])
    order = np.argsort(area)
    area, grid = area[order], np.maximum.accumulate(grid[order][::-1])[::-1]
    last = float(np.interp(recipe.top, grid[::-1], area[::-1]))
    limiting = None
    if condensed is not None:
        first, start_p, modulus = condensed.branch(last=True)
        limiting = limiting_area(
            lambda a: np.asarray(start_p + modulus * np.log(first / a)), first, last
        )
    stop = last
    if recipe.collapse is not None:
        stop = last * math.exp(-recipe.overrun)
        knees["collapse"] = TruePoint(last, recipe.top)
    x = np.linspace(math.log(recipe.start), math.log(stop), POINTS)
    lowest, fine = float(area[0]), np.exp(x)
    pressure = np.interp(fine, area, grid, right=0.0)
    if recipe.collapse is not None:
        # the rising branch goes on, unseen, beyond the tabulated pressures: keep its last slope
        rate = (grid[1] - grid[0]) / math.log(area[1] / area[0])
        pressure = np.where(
            fine < lowest, grid[0] + rate * np.log(np.minimum(fine, lowest) / lowest), pressure
        )
        later = after_collapse(rng, recipe.collapse, last, recipe.top)(fine)
        pressure = np.where(fine < last, np.minimum(pressure, later), pressure)
    smear = min(recipe.softness, 2.0) * 10 ** float(rng.uniform(-3.4, -2.4))
    step = abs(x[1] - x[0])
    pressure = _smear(pressure, smear / step)
    truth = finish_truth(
        fine,
        pressure,
        family=recipe.family,
        generator="lever",
        knees=knees,
        collapse_kind=recipe.collapse,
        first_modulus=0.0 if recipe.fluid else recipe.moduli[0],
        limiting=limiting,
        foot=recipe.lift_off,
    )
    return Film(fine, pressure, truth)


def _smear(pressure: FloatArray, sigma: float) -> FloatArray:
    """Gaussian blur (sigma in points) that carries straight ends on instead of bending them."""
    pad = int(5 * sigma) + 2
    left = pressure[0] - (pressure[1] - pressure[0]) * np.arange(pad, 0, -1)
    right = pressure[-1] + (pressure[-1] - pressure[-2]) * np.arange(1, pad + 1)
    blurred = gaussian_filter1d(np.concatenate([left, pressure, right]), sigma)
    return np.asarray(blurred[pad:-pad])


def gas_film(recipe: Recipe, rng: np.random.Generator) -> Film:
    """A gaseous film: ideal (Π A = kT), with excluded area, or with a second virial coefficient."""
    stop = float(rng.uniform(0.8, 1.6))
    area = np.exp(np.linspace(math.log(recipe.start), math.log(stop), POINTS))
    form = int(rng.integers(3))
    if form == 0:
        pressure = KT / area
    elif form == 1:
        pressure = KT / (area - float(rng.uniform(0.1, 0.4)))
    else:
        pressure = KT / area * (1 - float(rng.uniform(0.0, 0.2)) / area)
    truth = finish_truth(
        area,
        pressure,
        family=recipe.family,
        generator=("ideal", "excluded", "virial")[form],
        knees={},
        collapse_kind=None,
        first_modulus=0.0,
        limiting=None,
        foot=recipe.start,
    )
    return Film(area, pressure, truth)
