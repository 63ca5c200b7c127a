"""Generator 'pieces': branches written as Π(A), joined at knees, the knees rounded afterwards."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from isotherm_recipe import Recipe
from isotherm_rounding import FORMS, excess
from isotherm_truth import (
    Film,
    FloatArray,
    TruePoint,
    finish_truth,
    limiting_area,
)
from scipy.optimize import brentq

__all__ = ["after_collapse", "condensed", "fluid", "pieces_film", "volmer"]

Curve = Callable[[FloatArray], FloatArray]
POINTS = 24_000
KT = 4.114  # mN/m nm^2 at 298 K, Boltzmann's constant times temperature


def volmer(lift: float, area: float, pressure: float, scale: float) -> tuple[float, float, float]:
    """Solve Π = s kT/(A - ω) - Πcoh (Volmer 1925) for Π(lift) = 0 and Π(area) = pressure.

    Returns s kT (mN/m nm^2), ω (nm^2) and Πcoh (mN/m).
    """
    strength = scale * KT

    def miss(omega: float) -> float:
        return strength / (area - omega) - strength / (lift - omega) - pressure

    omega = float(brentq(miss, -200.0, area - 1e-4))
    return strength, omega, strength / (lift - omega)


def fluid(rng: np.random.Generator, lift: float, area: float, pressure: float) -> Curve:
    """A liquid-expanded branch through (lift, 0) and (area, pressure): Volmer or a power law."""
    # below this strength the branch would stiffen beyond any fluid; above it is near a line
    reach = pressure * (lift - area) / KT
    if rng.random() < 0.6:
        strength, omega, cohesion = volmer(lift, area, pressure, reach * float(rng.uniform(0.6, 2)))

        def equation(a: FloatArray) -> FloatArray:
            return np.asarray(strength / np.maximum(a - omega, 0.02) - cohesion)

        return equation
    power = float(rng.uniform(1.2, 1.8))

    def law(a: FloatArray) -> FloatArray:
        part = np.clip((lift - a) / (lift - area), 0.0, None)
        return np.asarray(pressure * part**power)

    return law


def condensed(
    rng: np.random.Generator, area: float, pressure: float, modulus: float
) -> tuple[Curve, Callable[[float], float]]:
    """A condensed branch from (area, pressure) and its inverse, area at a pressure.

    Straight in A, of constant modulus, or of a modulus that grows with pressure.
    """
    form = int(rng.integers(3))
    if form == 0:
        slope = modulus / area
        return (
            lambda a: np.asarray(pressure + slope * (area - a)),
            lambda p: area - (p - pressure) / slope,
        )
    if form == 1:
        return (
            lambda a: np.asarray(pressure + modulus * np.log(area / a)),
            lambda p: area * math.exp(-(p - pressure) / modulus),
        )
    growth = float(rng.uniform(0.2, 1.2))  # dK/dΠ
    scale = modulus / growth
    return (
        lambda a: np.asarray(pressure + scale * ((area / a) ** growth - 1)),
        lambda p: area * (1 + (p - pressure) / scale) ** (-1 / growth),
    )


def after_collapse(rng: np.random.Generator, kind: str, area: float, pressure: float) -> Curve:
    """What follows collapse at (area, pressure): a slow rise, or a fall to a lower level."""
    if kind == "constant-pressure":
        modulus = float(rng.uniform(0.0, 8.0))
        return lambda a: np.asarray(pressure + modulus * np.log(area / a))
    drop = float(rng.uniform(4.0, 20.0))
    reach = float(rng.uniform(0.01, 0.08))

    def falling(a: FloatArray) -> FloatArray:
        x = np.log(area / a)
        # before the collapse the extension is the straight line, not the exponential
        return np.asarray(
            pressure - drop * np.where(x > 0, 1 - np.exp(-np.maximum(x, 0) / reach), x / reach)
        )

    return falling


def _coexistence(
    rng: np.random.Generator, onset: tuple[float, float], end: tuple[float, float]
) -> Curve:
    bend = float(rng.uniform(-0.3, 0.4)) if rng.random() < 0.5 else 0.0

    def plateau(a: FloatArray) -> FloatArray:
        way = (onset[0] - a) / (onset[0] - end[0])
        return np.asarray(onset[1] + (end[1] - onset[1]) * ((1 - bend) * way + bend * way * way))

    return plateau


def _slope(curve: Curve, area: float) -> float:
    step = 1e-5 * area
    ends = curve(np.array([area - step, area + step]))
    return float((ends[1] - ends[0]) / (2 * step))


def _round(
    rng: np.random.Generator,
    area: FloatArray,
    curves: list[Curve],
    knees: list[float],
    names: list[str],
    edges: list[float],
    soft: float,
) -> FloatArray:
    """The pressure (m,) over `area` (m,): sharp pieces plus the rounding of every knee."""
    index = np.searchsorted(-np.array(knees), -area)
    out = np.zeros_like(area)
    for i, curve in enumerate(curves):
        out[index == i] = curve(area[index == i])
    for i, knee in enumerate(knees):
        before, after = (edges[i] - knee), (knee - edges[i + 2])
        shorter = min(before, after)
        width = soft * knee * 10 ** float(rng.uniform(-3.3, -1.95))
        width = min(width, 0.1 * min(soft, 1.5) * shorter)
        if names[i] == "collapse":
            width *= 0.5
        step = _slope(curves[i + 1], knee) - _slope(curves[i], knee)
        form = FORMS[int(rng.integers(len(FORMS)))]
        lift = -math.copysign(1.0, step) if step else 0.0  # steeper on the small side: convex
        for side, reach in ((area >= knee, before), (area < knee, after)):
            near = side & (np.abs(area - knee) < 0.7 * reach)
            distance = curves[i + 1](area[near]) - curves[i](area[near])
            away = np.abs(area[near] - knee) / reach
            fade = np.where(away < 0.4, 1.0, 0.5 + 0.5 * np.cos(np.pi * (away - 0.4) / 0.3))
            out[near] += lift * fade * excess(form, distance, abs(step) * width)
    return out


def pieces_film(recipe: Recipe, rng: np.random.Generator) -> Film:
    """Build the film of `recipe` from branches Π(A) with rounded knees."""
    curves: list[Curve] = [lambda a: np.zeros_like(a)]
    knees: dict[str, TruePoint] = {"lift_off": TruePoint(recipe.lift_off, 0.0)}
    here = (recipe.lift_off, 0.0)
    last = recipe.lift_off
    if recipe.fluid:
        goal = recipe.onset if recipe.onset is not None else (recipe.fluid_top or 0.0, recipe.top)
        curves.append(fluid(rng, recipe.lift_off, *goal))
        here, last = goal, goal[0]
    if recipe.onset is not None and recipe.end is not None:
        knees["onset"] = TruePoint(*recipe.onset)
        knees["end"] = TruePoint(*recipe.end)
        curves.append(_coexistence(rng, recipe.onset, recipe.end))
        here = recipe.end
    limiting = None
    for i, modulus in enumerate(recipe.moduli):
        branch, inverse = condensed(rng, *here, modulus)
        curves.append(branch)
        more = i + 1 < len(recipe.moduli)
        goal_pressure = recipe.kink_pressure if more and recipe.kink_pressure else recipe.top
        first, last = here[0], inverse(goal_pressure)
        here = (last, goal_pressure)
        if more:
            knees["kink"] = TruePoint(*here)
        else:
            limiting = limiting_area(branch, first, last)
    if recipe.collapse is not None:
        knees["collapse"] = TruePoint(*here)
        curves.append(after_collapse(rng, recipe.collapse, *here))
        last = here[0] * math.exp(-recipe.overrun)
    area = np.linspace(recipe.start, last, POINTS)
    places = [k.area for k in knees.values()]
    edges = [recipe.start, *places, last]
    pressure = _round(rng, area, curves, places, list(knees), edges, recipe.softness)
    truth = finish_truth(
        area,
        pressure,
        family=recipe.family,
        generator="pieces",
        knees=knees,
        collapse_kind=recipe.collapse,
        first_modulus=0.0 if recipe.fluid else recipe.moduli[0],
        limiting=limiting,
        foot=recipe.lift_off,
    )
    return Film(area, pressure, truth)
