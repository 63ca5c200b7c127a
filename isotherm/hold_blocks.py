"""Rows of a hold condensed into equal blocks, spikes set aside first."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Blocks", "block_means", "spikes"]

FloatArray = NDArray[np.float64]

# A row this many robust standard deviations off its block's median is a spike, not noise: a normal
# distribution puts 2 in 10^9 rows there, so none of an honest hold is lost.
_SPIKE_SIGMAS = 6.0
# Median absolute deviation of a normal distribution, to its standard deviation.
_MAD_TO_SIGMA = 1.4826
# A median needs a few rows; smaller blocks are grouped for the spike test.
_SMALLEST_GROUP = 9


@dataclass(frozen=True)
class Blocks:
    """A hold in compact form.

    time : (m,) s, mean time of each block, from the hold's own zero.
    half_width : (m,) s, half the time a block spans.
    level : (m,) mean of the drifting quantity in its own unit.
    rows : rows behind one block.
    spikes : rows set aside.
    """

    time: FloatArray
    half_width: FloatArray
    level: FloatArray
    rows: int
    spikes: int


def spikes(level: FloatArray) -> NDArray[np.bool_]:
    """Mark rows far off their neighbours.

    Parameters
    ----------
    level : (n,) array
        Evenly recorded values, any unit.

    Returns
    -------
    (n,) bool array
        True where a row lies more than six robust standard deviations from its group's median.
    """
    n = level.size
    group = max(_SMALLEST_GROUP, n // 2000)
    if n < 3 * group:
        return np.zeros(n, dtype=bool)
    whole = n // group * group
    folded = level[:whole].reshape(-1, group)
    centres = np.median(folded, axis=1)
    middle = (np.arange(centres.size) + 0.5) * group - 0.5
    residual = level - np.interp(np.arange(n), middle, centres)
    scale = _MAD_TO_SIGMA * float(np.median(np.abs(residual)))
    # a quantised signal may have half its residuals at zero: the mean absolute value still sees the steps
    scale = max(scale, float(np.mean(np.abs(residual))))
    return np.abs(residual) > _SPIKE_SIGMAS * scale if scale > 0 else np.zeros(n, dtype=bool)


def block_means(time: FloatArray, level: FloatArray, blocks: int) -> Blocks:
    """Average consecutive rows into at most `blocks` blocks of equal row count.

    Parameters
    ----------
    time : (n,) array
        s, increasing, from the hold's own zero.
    level : (n,) array
        Drifting quantity, any unit.
    blocks : int
        Largest number of blocks.

    Returns
    -------
    Blocks
        Rows left over after the last full block (fewer than one block) are not used.
    """
    bad = spikes(level)
    kept_time, kept = time[~bad], level[~bad]
    rows = max(1, -(-kept.size // blocks))
    whole = kept.size // rows * rows
    folded_time = kept_time[:whole].reshape(-1, rows)
    width = folded_time[:, -1] - folded_time[:, 0]
    # a block of m rows at spacing d stands for m d seconds, not (m - 1) d
    half = 0.5 * width * rows / max(rows - 1, 1)
    return Blocks(
        time=folded_time.mean(axis=1),
        half_width=half,
        level=kept[:whole].reshape(-1, rows).mean(axis=1),
        rows=rows,
        spikes=int(bad.sum()),
    )
