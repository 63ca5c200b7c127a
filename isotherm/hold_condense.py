"""A record of holds in compact form, with the bands that tell kept from drifting."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import quantum, robust_noise
from isotherm.hold_blocks import spikes

__all__ = ["Condensed", "condense_record"]

FloatArray = NDArray[np.float64]

_BLOCKS = 1500
_SIGMAS = 8.0  # full width of the band within which a quantity counts as kept, in block noise
# mN/m, full width: controllers keep a few tenths of a mN/m (common practice, no source).
_PRESSURE_BAND = 1.0
# Relative, full width: a stopped barrier's reading wanders less than this.
_AREA_BAND = 1e-3


@dataclass(frozen=True)
class Condensed:
    """Block means of a record and the widths within which a quantity counts as kept.

    edges : (b + 1,) rows at which blocks begin.  time, area, pressure : (b,) means.
    area_band, pressure_band : full widths.  area_noise : scatter of one block's area.
    """

    edges: NDArray[np.int64]
    time: FloatArray
    area: FloatArray
    pressure: FloatArray
    area_band: float
    pressure_band: float
    area_noise: float


def condense_record(time: FloatArray, area: FloatArray, pressure: FloatArray) -> Condensed:
    """Condense a record of (n,) rows to block means, spikes left out."""
    n = time.size
    edges = np.unique(np.linspace(0, n, min(n, _BLOCKS) + 1).astype(np.int64))
    good = (~(spikes(area) | spikes(pressure))).astype(float)
    good[edges[:-1]] += 1e-9  # a block of nothing but spikes keeps a mean
    counts = np.add.reduceat(good, edges[:-1])
    means = [np.add.reduceat(x * good, edges[:-1]) / counts for x in (time, area, pressure)]
    area_noise = robust_noise(means[1])
    area_floor = max(_AREA_BAND * float(np.median(np.abs(means[1]))), 2.0 * quantum(area))
    return Condensed(
        edges,
        means[0],
        means[1],
        means[2],
        max(_SIGMAS * area_noise, area_floor),
        max(_SIGMAS * robust_noise(means[2]), _PRESSURE_BAND, 2.0 * quantum(pressure)),
        area_noise,
    )
