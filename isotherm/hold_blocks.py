"""Rows of a hold condensed into equal blocks, spikes set aside first."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import robust_noise

__all__ = ["RESOLUTION", "Blocks", "block_means", "spikes"]

FloatArray = NDArray[np.float64]

# A row this many robust standard deviations off the running median is a spike, not noise: a normal
# distribution puts 2 in 10^9 rows there, so none of an honest hold is lost.
_SPIKE_SIGMAS = 6.0
# Median absolute deviation of a normal distribution, to its standard deviation.
_MAD_TO_SIGMA = 1.4826
_WINDOW = 11  # rows of the running median: it sees past five bad ones
# No trough reads area or pressure to better than a millionth: smaller scatter is arithmetic (our choice).
RESOLUTION = 1e-6


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
    """Mark rows far off their neighbours, up to five in a row; a lasting step is not a spike.

    Parameters
    ----------
    level : (n,) array
        Values in the order recorded, any unit.

    Returns
    -------
    (n,) bool array
        True where a row lies more than six robust standard deviations from the running median.
    """
    from scipy.ndimage import median_filter

    if level.size < 3 * _WINDOW:
        return np.zeros(level.size, dtype=bool)
    residual = np.abs(level - median_filter(level, size=_WINDOW, mode="mirror"))
    # a quantised signal may have half its residuals at zero: the mean absolute value still sees the steps
    scale = max(_MAD_TO_SIGMA * float(np.median(residual)), float(np.mean(residual)))
    # on a steep stretch the median is the row itself: the scatter of second differences knows no slope
    scale = max(scale, robust_noise(level), RESOLUTION * float(np.median(np.abs(level))))
    # at the ends there are no neighbours on one side to tell a spike from a slope
    half = _WINDOW // 2
    residual[:half] = residual[-half:] = 0.0
    return np.asarray(residual > _SPIKE_SIGMAS * scale)


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
