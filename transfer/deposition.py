"""Deposition type X, Y, Z or XY from the strokes' ratios, and what single strokes show."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from transfer.result import Deposition

__all__ = ["DirectionMeans", "deposition_type", "first_stroke_took_nothing", "gives_back"]

FloatArray = NDArray[np.float64]

# Between these, up / down is "about one": limits of 0.95 to 1.05 on each (common practice) allow 0.90 to
# 1.11, and the mean of a few strokes scatters a little more. Outside, the strokes are unequal (XY).
_EQUAL = (0.85, 1.0 / 0.85)
# Below this, one direction takes so little of what the other takes that it is called none (X or Z).
_NONE = 0.12
# A direction takes film at all when its mean ratio is above this: less would not be called a transfer.
_TAKES = 0.15
# A stroke takes nothing when its ratio is this small; a failed stroke usually still takes some.
_NOTHING = 0.15
_CLEAR = 3.0


@dataclass(frozen=True)
class DirectionMeans:
    """Ratios of one direction: middle value, its standard uncertainty, how many."""

    value: float
    u: float
    count: int


def gives_back(ratio: float, u: float) -> bool:
    """Whether a stroke gave film back to the surface: a ratio below zero beyond its uncertainty.

    Parameters
    ----------
    ratio, u : float
        The ratio and its standard uncertainty.
    """
    return ratio < -_CLEAR * u and ratio < -0.02


def first_stroke_took_nothing(
    directions: list[str], ratios: FloatArray, wetting: bool | None
) -> bool:
    """Whether the first stroke is the empty first dip of a wetting substrate.

    A water-wet surface drags no film down on its first way in; the film goes on from the first way out.
    That is normal, and says nothing of the type or of a drift.

    Parameters
    ----------
    directions : list of str
        "down" or "up" for each stroke.
    ratios : (s,)
    wetting : bool or None
        The sheet's word on the substrate; None where it says nothing.
    """
    if not directions or directions[0] != "down" or wetting is False:
        return False
    if not abs(ratios[0]) < _NOTHING:
        return False
    later_down = [r for r, d in zip(ratios[1:], directions[1:], strict=True) if d == "down"]
    # where later down-strokes take nothing either, it is the type (Z) that shows, not the first dip
    return wetting is True or not later_down or float(np.median(later_down)) > _TAKES


def deposition_type(
    directions: list[str], ratios: FloatArray, u: FloatArray, counted: list[bool]
) -> Deposition:
    """Name the type from up over down.

    Each stroke is compared with its neighbours of the other direction, so that a build that fades does not
    look unequal; the middle of these comparisons decides, and one failed stroke does not.

    Parameters
    ----------
    directions : list of str
    ratios, u : (s,) transfer ratios and their random standard uncertainties.
    counted : list of bool
        False for strokes to leave out.

    Returns
    -------
    Deposition
    """
    criterion = (
        f"up/down within {_EQUAL[0]:.2f}-{_EQUAL[1]:.2f}: Y; one direction below {_NONE:.2f} of the "
        "other: X (down only) or Z (up only); else XY"
    )
    use = [k for k, c in enumerate(counted) if c and np.isfinite(ratios[k])]
    down = _means([k for k in use if directions[k] == "down"], ratios, u)
    up = _means([k for k in use if directions[k] == "up"], ratios, u)
    down_q = None if down is None else Quantity(down.value, down.u, "1")
    up_q = None if up is None else Quantity(up.value, up.u, "1")
    if down is None or up is None:
        return Deposition(None, None, down_q, up_q, criterion, False)
    if max(down.value, up.value) < _TAKES:
        return Deposition(None, None, down_q, up_q, criterion, False)
    if down.value < _TAKES * up.value:
        ratio, u_ratio = np.inf, 0.0
    else:
        ratio, u_ratio = _up_over_down(directions, ratios, u, use)
    if not np.isfinite(ratio):
        # down takes (almost) nothing: compare the other way round
        share = down.value / up.value
        u_share = float(np.hypot(down.u, share * up.u)) / up.value
        name = "Z" if share < _NONE else "XY"
        decided = abs(share - _NONE) > 2.0 * u_share
        quantity = None
        if share > 2.0 * u_share > 0:
            quantity = Quantity(1.0 / share, u_share / share**2, "1")
        return Deposition(name, quantity, down_q, up_q, criterion, bool(decided))
    quantity = Quantity(ratio, u_ratio, "1")
    if ratio < _NONE:
        name = "X"
    elif ratio > 1.0 / _NONE:
        name = "Z"
    elif _EQUAL[0] <= ratio <= _EQUAL[1]:
        name = "Y"
    else:
        name = "XY"
    edges = np.asarray([_NONE, _EQUAL[0], _EQUAL[1], 1.0 / _NONE])
    decided = bool(np.min(np.abs(ratio - edges)) > 2.0 * u_ratio)
    return Deposition(name, quantity, down_q, up_q, criterion, decided)


def _means(which: list[int], ratios: FloatArray, u: FloatArray) -> DirectionMeans | None:
    """Median of some strokes; its u from their scatter or their own uncertainties, whichever is larger."""
    if not which:
        return None
    values = ratios[which]
    middle = float(np.median(values))
    own = float(np.sqrt(np.mean(u[which] ** 2) / len(which)))
    spread = 1.4826 * float(np.median(np.abs(values - middle))) / np.sqrt(len(which))
    return DirectionMeans(middle, max(own, spread), len(which))


def _up_over_down(
    directions: list[str], ratios: FloatArray, u: FloatArray, use: list[int]
) -> tuple[float, float]:
    """Middle of up / down over neighbouring strokes of opposite direction, and its u."""
    pairs, u_pairs = [], []
    for a, b in pairwise(use):
        if directions[a] == directions[b]:
            continue
        top, bottom = (a, b) if directions[a] == "up" else (b, a)
        if ratios[bottom] <= 0.02:
            continue
        value = ratios[top] / ratios[bottom]
        pairs.append(value)
        u_pairs.append(np.hypot(u[top], value * u[bottom]) / ratios[bottom])
    if not pairs:
        return np.inf, 0.0
    values = np.asarray(pairs)
    middle = float(np.median(values))
    own = float(np.sqrt(np.mean(np.square(u_pairs)) / values.size))
    spread = 1.4826 * float(np.median(np.abs(values - middle))) / np.sqrt(values.size)
    return middle, max(own, spread)
