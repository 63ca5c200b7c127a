"""Stretches between knees get their meaning: baseline, phases, coexistences, kinks, collapse."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from isotherm.knee_model import KneeModel

__all__ = ["Reading", "Stretch", "phase_name", "read_stretches"]

# Customary ranges of the compression modulus, mN/m (Davies & Rideal, Interfacial Phenomena, 2nd ed.,
# Academic Press 1963, as widely quoted); practice also calls everything above 250 mN/m solid.
GASEOUS_BELOW: Final = 12.5
EXPANDED_BELOW: Final = 50.0
INTERMEDIATE_BELOW: Final = 100.0
CONDENSED_BELOW: Final = 250.0

# Our choices, ratios of moduli of neighbouring stretches:
PLATEAU_RATIO: Final = 0.7  # a plateau is this much softer than both neighbours
SHORTEST_PLATEAU: Final = 0.01  # of ln A; a shorter one is a glitch of the barrier or the probe
KINK_RATIO: Final = 1.3  # a kink is a step up by at least this factor
YIELD_RATIO: Final = (
    0.4  # a film that softens to this share of its stiffest and stays there has collapsed
)
STEEPEST_END: Final = 4.0  # of a stretch's end modulus against its mean that is believed
BASELINE_RISE: Final = (
    0.5  # mN/m; a baseline rises by less, or by less than BASELINE_SHARE of the whole
)
BASELINE_SHARE: Final = 0.02
SHARP: Final = 1.5  # a kink's rounding (4 widths) may take this share of the shorter neighbour

OPEN_NOTE: Final = (
    "the trace stops on a plateau that follows a liquid-expanded branch: called a "
    "coexistence; compress further to tell it from a collapse"
)


@dataclass(frozen=True)
class Stretch:
    """Stretch j of a model: x from start to stop, mean modulus, and moduli at its two ends, mN/m."""

    start: float
    stop: float
    modulus: float
    first: float
    last: float


@dataclass(frozen=True)
class Reading:
    """What the knees mean; every number is the index of a knee (or of a stretch, for `stretches`).

    lift_off : knee, or None. coexistences : (onset, end) knees, end None where the trace stops inside.
    kinks : knees. collapse : knee, or None. falls : whether the pressure falls after the collapse.
    baseline : whether stretch 0 is a flat baseline. last : index of the last rising stretch.
    """

    stretches: tuple[Stretch, ...]
    baseline: bool
    lift_off: int | None
    coexistences: tuple[tuple[int, int | None], ...]
    kinks: tuple[int, ...]
    collapse: int | None
    falls: bool
    last: int
    notes: tuple[str, ...] = ()


def phase_name(modulus: float) -> str:
    """The customary name for a modulus, mN/m. A judgement: the number is always given beside it."""
    if modulus < GASEOUS_BELOW:
        return "gaseous"
    if modulus < EXPANDED_BELOW:
        return "liquid-expanded"
    if modulus < INTERMEDIATE_BELOW:
        return "intermediate"
    if modulus < CONDENSED_BELOW:
        return "liquid-condensed"
    return "solid"


def read_stretches(model: KneeModel) -> Reading:
    """Interpret a fitted branch."""
    stretches = _stretches(model)
    n = len(stretches)
    pressures = [model.knee_pressure(k)[0] for k in range(n - 1)]
    x = np.array([model.start, model.stop])
    ends = model.pressure(x)
    levels = [float(ends[0]), *pressures, float(ends[1])]
    span = max(levels) - min(levels)
    rise = levels[1] - levels[0]
    flat = abs(rise) < max(BASELINE_RISE, BASELINE_SHARE * span)
    baseline = n > 1 and flat and stretches[0].modulus < GASEOUS_BELOW
    if n == 1:
        baseline = span < BASELINE_RISE
        return Reading(stretches, baseline, None, (), (), None, False, 0)
    if model.roles is not None:
        return _told(stretches, model.roles)
    first = 1 if baseline else 0
    last = _last_rising(stretches, first)
    notes: list[str] = []
    collapse = last if last < n - 1 else None
    open_coexistence: int | None = None
    if collapse is not None:
        falls = any(s.modulus < 0 for s in stretches[last + 1 : last + 2])
        rising = stretches[first : last + 1]
        fluid = max(stretches[last].last, *(s.modulus for s in rising)) < EXPANDED_BELOW
        fluid = fluid and not falls
        if fluid and last + 2 == n:
            open_coexistence, collapse = collapse, None
            notes.append(OPEN_NOTE)
    else:
        falls = False
    coexistences: list[tuple[int, int | None]] = []
    kinks: list[int] = []
    j = first
    while j < last:
        here, after = stretches[j], stretches[j + 1]
        if after.modulus < PLATEAU_RATIO * here.modulus or (
            after.first < PLATEAU_RATIO * here.last and after.modulus < here.last
        ):
            end = _plateau_end(stretches, j, last)
            if end is not None:
                if stretches[end].start - here.stop >= SHORTEST_PLATEAU:
                    coexistences.append((j, end - 1))
                j = end
                continue
        elif _is_kink(model, stretches, j):
            kinks.append(j)
        j += 1
    if open_coexistence is not None:
        coexistences.append((open_coexistence, None))
    return Reading(
        stretches,
        baseline,
        0 if baseline else None,
        tuple(coexistences),
        tuple(kinks),
        collapse,
        falls if collapse is not None else False,
        last,
        tuple(notes),
    )


def _told(stretches: tuple[Stretch, ...], roles: tuple[str, ...]) -> Reading:
    """The reading of knees whose meaning was told before the fit."""
    coexistences: list[tuple[int, int | None]] = []
    for k, role in enumerate(roles):
        if role == "onset":
            closed = k + 1 < len(roles) and roles[k + 1] == "end"
            coexistences.append((k, k + 1 if closed else None))
    collapse = roles.index("collapse") if "collapse" in roles else None
    baseline = roles[:1] == ("lift-off",)
    open_end = bool(coexistences) and coexistences[-1][1] is None
    last = len(roles) if collapse is None else collapse
    return Reading(
        stretches,
        baseline,
        0 if baseline else None,
        tuple(coexistences),
        tuple(k for k, role in enumerate(roles) if role == "kink"),
        collapse,
        collapse is not None and stretches[collapse + 1].modulus < 0,
        last - 1 if open_end and collapse is None else last,
        (OPEN_NOTE,) if open_end else (),
    )


def _stretches(model: KneeModel) -> tuple[Stretch, ...]:
    knots = [model.start, *map(float, model.knots), model.stop]
    n = len(knots) - 1
    ends = model.pressure(np.array([model.start, model.stop]))
    levels = [float(ends[0]), *(model.knee_pressure(k)[0] for k in range(n - 1)), float(ends[1])]
    out = []
    for j in range(n):
        length = max(knots[j + 1] - knots[j], 1e-12)
        moduli = model.stretch_modulus(j)
        mean = (levels[j + 1] - levels[j]) / length
        out.append(Stretch(knots[j], knots[j + 1], mean, float(moduli[0]), float(moduli[2])))
    return tuple(out)


def _last_rising(stretches: tuple[Stretch, ...], first: int) -> int:
    """Index of the last stretch as stiff as a good part of the stiffest one so far."""
    last, stiffest = first, 0.0
    for j in range(first, len(stretches)):
        stiff = stretches[j].modulus
        if stiff > 0 and stiff >= YIELD_RATIO * stiffest:
            last = j
        # a fluid branch is far stiffer at its end than on the whole
        stiffest = max(stiffest, stiff, min(stretches[j].last, STEEPEST_END * stiff))
    return last


def _plateau_end(stretches: tuple[Stretch, ...], before: int, last: int) -> int | None:
    """The stretch that ends a plateau begun after stretch `before`, if a stiffer one follows."""
    softest = np.inf
    for j in range(before + 1, last + 1):
        softest = min(softest, stretches[j].modulus)
        if j > before + 1 and stretches[j].modulus * PLATEAU_RATIO > softest:
            return j
    return None


def _is_kink(model: KneeModel, stretches: tuple[Stretch, ...], j: int) -> bool:
    here, after = stretches[j], stretches[j + 1]
    if here.modulus < GASEOUS_BELOW:
        return False
    shorter = min(here.stop - here.start, after.stop - after.start)
    sharp = 4.0 * float(model.widths[j]) < SHARP * shorter
    return sharp and after.modulus > KINK_RATIO * here.modulus
