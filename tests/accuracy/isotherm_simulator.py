"""Simulated isotherms with known truth: `simulate(seed, family)`.

Three structurally different generators make the film (pieces, modulus, lever); one instrument model
records it. Even seeds are for tuning, odd seeds for reporting, and nobody tunes on odd ones.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from isotherm_instrument import draw_instrument, record, record_sparse
from isotherm_lever import gas_film, lever_film
from isotherm_modulus import modulus_film
from isotherm_pieces import pieces_film
from isotherm_recipe import FILM_FAMILIES, draw_recipe
from isotherm_truth import Film, Truth

from isotherm.trace import Trace

__all__ = ["FAMILIES", "family_of", "make_film", "simulate"]

FAMILIES = (*FILM_FAMILIES, "sparse", "dense", "soft", "loaded")
BUILDERS = (pieces_film, modulus_film, lever_film)
DENSE_ROWS = (100_000, 1_000_000)
# Films the special families are made of; a gas has no knee to soften and no zero to lose.
SOME_FILMS = ("coexistence", "le", "condensed", "stopped", "kink")


def family_of(seed: int) -> str:
    """The film family a seed gets when none is asked for: each in turn, on both halves alike."""
    return FILM_FAMILIES[(seed // 2) % len(FILM_FAMILIES)]


def make_film(seed: int, family: str) -> tuple[Film, np.random.Generator]:
    """The noise-free film of a seed, and the generator to go on with."""
    rng = np.random.default_rng([seed, FAMILIES.index(family)])
    films = FILM_FAMILIES if family == "dense" else SOME_FILMS
    drawn = family if family in FILM_FAMILIES else films[int(rng.integers(len(films)))]
    recipe = draw_recipe(drawn, rng)
    if drawn == "gas":
        return gas_film(recipe, rng), rng
    if family == "soft":
        recipe = replace(recipe, softness=float(rng.uniform(2.0, 5.0)))
    film = BUILDERS[int(rng.integers(len(BUILDERS)))](recipe, rng)
    if family == "loaded":
        film = _without_zero(film, float(rng.uniform(0.5, 2.5)))
    return film, rng


def _without_zero(film: Film, pressure: float) -> Film:
    """Start the run where the film already shows `pressure` (mN/m): no zero is recorded."""
    start = int(np.argmax(film.pressure > pressure))
    area = film.area[start:]
    truth = replace(
        film.truth, lift_off=None, knees=tuple(k for k in film.truth.knees if k < area[0])
    )
    return Film(area, film.pressure[start:], truth)


def simulate(seed: int, family: str | None = None) -> tuple[Trace, Truth]:
    """Simulate one run.

    Parameters
    ----------
    seed : int
        Even seeds belong to the tune half, odd seeds to the report half.
    family : str or None
        One of FAMILIES; None takes the film families in turn.

    Returns
    -------
    Trace, Truth
        The run as the reader would hand it on, and its answer key.
    """
    name = family_of(seed) if family is None else family
    film, rng = make_film(seed, name)
    if name == "sparse":
        return record_sparse(film, rng)
    tool = draw_instrument(rng, DENSE_ROWS if name == "dense" else (600, 12_000))
    if name == "loaded":  # what no zero could tell must not be asked
        tool = replace(tool, offset=0.0)
    trace, truth = record(film, tool, rng)
    return trace, replace(truth, family=name)
