"""Generator 'modulus': a profile of the compression modulus against ln A, integrated to Π."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
from isotherm_recipe import Recipe
from isotherm_truth import (
    Film,
    FloatArray,
    TruePoint,
    finish_truth,
    limiting_area,
)
from scipy.special import expit, ndtr

__all__ = ["modulus_film"]

POINTS = 24_000
STEPS = ("logistic", "normal", "two-sided")


def _step(form: str, x: FloatArray, at: float, width: float) -> FloatArray:
    """A step from 0 to 1 whose density has its mean at `at`, so that integrals meet there."""
    z = (x - at) / width
    if form == "logistic":
        return np.asarray(expit(z))
    if form == "normal":
        return np.asarray(ndtr(z / 1.6))
    # double exponential with unequal sides (ratio 2); its density's mean lies at long - short
    short, long = 0.8, 1.6
    z = z + (long - short)
    share = short / (short + long)
    low = share * np.exp(np.minimum(z, 0) / short)
    high = 1 - (1 - share) * np.exp(-np.maximum(z, 0) / long)
    return np.asarray(np.where(z < 0, low, high))


def _levels(recipe: Recipe, rng: np.random.Generator) -> list[tuple[str, float, float, float]]:
    """Segments after the first: name of the knee they start at, ln-area length, mean K, tilt.

    The tilt is the relative change of K from the middle of the segment to its end.
    """
    out: list[tuple[str, float, float, float]] = []
    pressure = 0.0
    if recipe.fluid:
        goal = recipe.onset if recipe.onset is not None else (recipe.fluid_top or 0.0, recipe.top)
        length = math.log(recipe.lift_off / goal[0])
        tilt = float(rng.uniform(0.2, 0.45) if recipe.onset else rng.uniform(0.5, 0.85))
        out.append(("lift_off", length, goal[1] / length, tilt))
        pressure = goal[1]
    if recipe.onset is not None and recipe.end is not None:
        length = math.log(recipe.onset[0] / recipe.end[0])
        rise = recipe.end[1] - recipe.onset[1]
        out.append(("onset", length, rise / length, float(rng.uniform(-0.3, 0.3))))
        pressure = recipe.end[1]
    for i, modulus in enumerate(recipe.moduli):
        more = i + 1 < len(recipe.moduli)
        goal_pressure = recipe.kink_pressure if more and recipe.kink_pressure else recipe.top
        name = "kink" if i else ("end" if recipe.onset else "lift_off")
        tilt = float(rng.uniform(-0.05, 0.15))
        out.append((name, (goal_pressure - pressure) / modulus, modulus, tilt))
        pressure = goal_pressure
    if recipe.collapse == "constant-pressure":
        out.append(("collapse", recipe.overrun, float(rng.uniform(0.0, 8.0)), 0.0))
    elif recipe.collapse == "constant-area":
        fall = min(float(rng.uniform(3.0, 18.0)), 0.5 * pressure)
        length = min(recipe.overrun, 0.08)
        out.append(("collapse", length, -fall / length, -0.6))
    return out


def modulus_film(recipe: Recipe, rng: np.random.Generator) -> Film:
    """Build the film of `recipe` from levels of K(ln A) joined by smooth steps."""
    segments = _levels(recipe, rng)
    starts = [math.log(recipe.start / recipe.lift_off)]
    for _, length, _, _ in segments:
        starts.append(starts[-1] + length)
    x = np.linspace(0.0, starts[-1], POINTS)
    gas = float(rng.uniform(0.0, 0.15))  # mN/m: a dilute film's rise is below any noise
    profiles = [np.full_like(x, gas)]
    for (_, length, mean, tilt), start in zip(segments, starts, strict=False):
        profiles.append(mean * (1 + tilt * 2 * (x - start - 0.5 * length) / length))
    steps = []
    for i, (name, length, _, _) in enumerate(segments):
        before = starts[i] - (starts[i - 1] if i else 0.0)
        width = recipe.softness * 10 ** float(rng.uniform(-3.5, -2.2))
        width = min(width, 0.05 * min(recipe.softness, 1.5) * min(before, length))
        if name == "collapse":
            width *= 0.5
        if name == "lift_off" and recipe.fluid_top is not None:
            width = min(0.25 * before, float(rng.uniform(0.005, 0.03)))  # gradual foot
        steps.append(_step(STEPS[int(rng.integers(3))], x, starts[i], width))
    modulus = profiles[0].copy()
    for i, step in enumerate(steps):
        modulus += step * (profiles[i + 1] - profiles[i])
    dx = x[1] - x[0]
    pressure = np.concatenate([[0.0], np.cumsum(0.5 * (modulus[1:] + modulus[:-1]) * dx)])
    # Each branch extended: its own profile integrated from the middle of its segment.
    centres = [0.5 * starts[0], *(0.5 * (a + b) for a, b in pairwise(starts))]
    branches = []
    for profile, centre in zip(profiles, centres, strict=True):
        whole = np.concatenate([[0.0], np.cumsum(0.5 * (profile[1:] + profile[:-1]) * dx)])
        branches.append(whole - np.interp(centre, x, whole) + np.interp(centre, x, pressure))
    knees: dict[str, TruePoint] = {}
    area = recipe.start * np.exp(-x)
    for i, (name, length, _, _) in enumerate(segments):
        before = starts[i] - (starts[i - 1] if i else 0.0)
        place = _meeting(x, branches[i], branches[i + 1], starts[i], 0.3 * min(before, length))
        knees[name] = TruePoint(
            recipe.start * math.exp(-place), float(np.interp(place, x, branches[i]))
        )
    limiting = None
    if recipe.moduli:
        last = len(segments) - (1 if recipe.collapse else 0)
        branch = branches[last]
        limiting = limiting_area(
            lambda a: np.interp(np.log(recipe.start / a), x, branch),
            recipe.start * math.exp(-starts[last - 1]),
            recipe.start * math.exp(-starts[last]),
        )
    truth = finish_truth(
        area,
        pressure,
        family=recipe.family,
        generator="modulus",
        knees=knees,
        collapse_kind=recipe.collapse,
        first_modulus=0.0 if recipe.fluid else recipe.moduli[0],
        limiting=limiting,
        foot=knees["lift_off"].area,
    )
    return Film(area, pressure, truth)


def _meeting(x: FloatArray, one: FloatArray, two: FloatArray, at: float, reach: float) -> float:
    """Where two extended branches (m,) cross nearest `at`; closest approach if they do not."""
    near = np.flatnonzero(np.abs(x - at) <= max(reach, 2 * (x[1] - x[0])))
    gap = two[near] - one[near]
    turns = np.flatnonzero(np.sign(gap[1:]) != np.sign(gap[:-1]))
    if turns.size == 0:
        return float(x[near[int(np.argmin(np.abs(gap)))]])
    i = int(turns[np.argmin(np.abs(x[near[turns]] - at))])
    return float(x[near[i]] + (x[1] - x[0]) * gap[i] / (gap[i] - gap[i + 1]))
