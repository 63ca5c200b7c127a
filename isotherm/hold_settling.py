"""How long the controlled quantity takes to settle at its set point, found from its own scatter."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_blocks import block_means

__all__ = ["settled_after"]

FloatArray = NDArray[np.float64]

_BLOCKS = 400
# Windows of these many blocks are compared: short ones catch a sharp overshoot, long ones a slow tail.
_WINDOWS = (1, 2, 4, 8, 16)
# The last part of the hold says what settled looks like.
_REFERENCE_PART = 0.6
# A window this many standard deviations off is not settled: with some 10^3 windows of a normal
# distribution, fewer than one settled hold in a hundred is flagged by chance.
_SIGMAS = 4.5
# An overshoot rings: flagged windows may be this many blocks apart, or as far as they already reach.
_GAP = 6
# What remains of an exponential tail when it sinks into the scatter is still there for a while.
_MARGIN = 0.25
_FEWEST = 30


def settled_after(time: FloatArray, controlled: FloatArray) -> float:
    """Time after which the controlled quantity shows no transient from reaching its set point.

    Parameters
    ----------
    time : (n,) array
        s, from the moment the set point was first reached.
    controlled : (n,) array
        What the trough controls: pressure (isobaric) or area (isochoric), any unit.

    Returns
    -------
    float
        s; 0 where the start cannot be told from the rest.
    """
    if time.size < _FEWEST:
        return 0.0
    blocks = block_means(time, controlled, _BLOCKS)
    level = blocks.level
    n = level.size
    first = n - int(_REFERENCE_PART * n)
    reference = level[first:]
    centre = float(np.median(reference))
    flagged = np.zeros(first, dtype=bool)
    for width in _WINDOWS:
        if width > first // 2 or 4 * width > reference.size:
            break
        total = np.concatenate([[0.0], np.cumsum(level - centre)])
        means = (total[width:] - total[:-width]) / width
        settled = means[first:]
        scatter = float(np.sqrt(np.mean(settled**2)))
        if scatter == 0.0:
            # a reading that never moves once settled: any other value is a transient
            scatter = 1e-9 * max(abs(centre), 1e-9)
        # a window that is off says the transient lasts at least to where the window begins
        off = np.flatnonzero(np.abs(means[: first - width + 1]) > _SIGMAS * scatter)
        flagged[off] = True
    reach = -1
    for i in np.flatnonzero(flagged).tolist():
        if i - reach > max(_GAP, reach):
            break
        reach = i
    if reach < 0:
        return 0.0
    end = float(blocks.time[reach] + blocks.half_width[reach])
    return end * (1.0 + _MARGIN)
