"""The layer after which a line bends, named only when chance cannot explain it."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from transfer.evidence_fit import LineFit, fit_line, hinge_column

__all__ = ["Bend", "find_bend"]

FloatArray = NDArray[np.float64]

# Draws of the null distribution of the largest of many correlated statistics. 20 000 draws give
# a probability of 0.005 with a relative standard uncertainty of 10 %.
_DRAWS = 20_000
_SEED = 20_413
# A hinge that chance alone would make at this rate, were it the only one tried, is none: no drawing.
_NO_QUESTION = 0.05
# Δχ² that bounds the set of hinges not worse than the best at 95 % (one position parameter).
_NOT_WORSE = 3.84
# Each arm needs two points of its own: with one, a bend and an outlying last point look the same.
_POINTS_PER_ARM = 2


@dataclass(frozen=True)
class Bend:
    """A change of slope.

    Parameters
    ----------
    index : int
        Strokes made when the line bends.
    index_range : tuple of int
        First and last number of strokes not worse at 95 %.
    p_value : float
        Probability of a bend as strong as this, at any layer, by chance alone; an upper bound
        where no bend is in question.
    fit : LineFit
        The hinged line.
    """

    index: int
    index_range: tuple[int, int]
    p_value: float
    fit: LineFit


def find_bend(
    x: FloatArray,
    y: FloatArray,
    cov_y: FloatArray,
    cov_x: FloatArray,
    line: LineFit,
    reached: FloatArray,
) -> Bend | None:
    """Find the best hinge of `line` and the probability that chance alone made it.

    The statistic is the largest fall of χ² over all hinges allowed. Its distribution without any
    bend depends on where the points lie, so it is drawn for these very points.

    Parameters
    ----------
    x, y, cov_y, cov_x
        As given to `fit_line` for `line`.
    line : LineFit
        The straight line.
    reached : (n + 1,) array, layers
        Layers after 0, 1, … n strokes: where a hinge may lie.

    Returns
    -------
    Bend or None
        None when the points are too few to tell a bend. The caller judges `p_value`.
    """
    if line.dof < 2:
        return None
    places = _places(x, reached)
    if not places:
        return None
    root = np.linalg.cholesky(line.weight).T  # whitens: root.T @ root = weight
    base = np.linalg.qr(root @ line.design(x))[0]
    columns = np.array([root @ hinge_column(x, float(reached[k])) for k in places])
    columns = columns - (columns @ base) @ base.T
    length = np.linalg.norm(columns, axis=1)
    usable = length > 1e-9 * np.linalg.norm(root @ x)
    if not np.any(usable):
        return None
    columns = columns[usable] / length[usable, None]
    places = [k for k, good in zip(places, usable, strict=True) if good]

    white = root @ line.residuals
    falls = (columns @ white) ** 2
    best = int(np.argmax(falls))
    alone = math.erfc(math.sqrt(float(falls[best]) / 2.0))
    if line.noise_scale is None and alone > _NO_QUESTION:
        p_value = min(1.0, alone * len(places))
        return _bend(x, y, cov_y, cov_x, line, reached, places, falls, p_value)
    rng = np.random.default_rng(_SEED)
    noise = rng.standard_normal((_DRAWS, len(x)))
    noise -= (noise @ base) @ base.T
    drawn = np.max((noise @ columns.T) ** 2, axis=1)
    found = float(falls[best])
    if line.noise_scale is not None:
        # unknown noise: the fall is judged against what is left
        drawn = drawn / np.maximum(np.sum(noise**2, axis=1) - drawn, 1e-300)
        found = found / max(float(white @ white) - found, 1e-300)
    p_value = float((1 + np.count_nonzero(drawn >= found)) / (1 + _DRAWS))
    return _bend(x, y, cov_y, cov_x, line, reached, places, falls, p_value)


def _bend(
    x: FloatArray,
    y: FloatArray,
    cov_y: FloatArray,
    cov_x: FloatArray,
    line: LineFit,
    reached: FloatArray,
    places: list[int],
    falls: FloatArray,
    p_value: float,
) -> Bend | None:
    best = int(np.argmax(falls))
    near = [k for k, fall in zip(places, falls, strict=True) if falls[best] - fall <= _NOT_WORSE]
    scale = 1.0 if line.noise_scale is None else line.noise_scale**2
    try:
        fit = fit_line(
            x,
            y,
            cov_y * scale,
            cov_x,
            free_intercept=line.free_intercept,
            hinge=float(reached[places[best]]),
        )
    except UpstrokeError:  # values so wild that no hinged line goes through them
        return None
    return Bend(places[best], (min(near), max(near)), p_value, fit)


def _places(x: FloatArray, reached: FloatArray) -> list[int]:
    """Numbers of strokes with enough points (of different x) on either side of the hinge."""
    distinct = np.unique(x)
    return [
        k
        for k in range(1, len(reached) - 1)
        if np.count_nonzero(distinct <= reached[k]) >= _POINTS_PER_ARM
        and np.count_nonzero(distinct > reached[k]) >= _POINTS_PER_ARM
    ]
