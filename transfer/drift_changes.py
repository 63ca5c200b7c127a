"""Sudden changes of the transfer ratio along a build."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["change_points", "common_level"]

FloatArray = NDArray[np.float64]

# Ratios of one build scatter from stroke to stroke by about this much in good practice; it steadies the
# estimate of scatter when only a few strokes are there (weight in strokes).
_SCATTER = 0.012
_SCATTER_WEIGHT = 3.0
# Price of one change in the penalised likelihood, times ln n: calibrated on steady builds of 4 to 64 strokes
# so that the three searches together show a change in fewer than one in a hundred (tests repeat this).
_PRICE = 3.0
_PRICE_BASE = 3.5
# ... and of one in the strokes of one direction only.
_PRICE_SINGLE = 6.0
# A change of one direction this near one of both (strokes) is the same.
_SAME = 2
# Price of a straight trend, which explains a slow fade without any change.
_TREND_PRICE = 1.0
_MOST_CHANGES = 4
_LEAST_STROKES = 4
_SHORTEST = 2
# A single stroke this many scatters off its neighbours is an odd stroke, not a change of the build.
_ODD = 5.0


def common_level(ratios: FloatArray, group: NDArray[np.intp]) -> FloatArray:
    """Bring up-strokes to the level of down-strokes by the middle up/down ratio of neighbours.

    Where strokes alternate, each is compared with the mean of the two around it, so that a fading build is
    not taken for unequal.

    Parameters
    ----------
    ratios : (n,) in stroke order.
    group : (n,) 1 for down, 0 for up.

    Returns
    -------
    (n,) array
        One population with the same steps and trend.
    """
    if np.unique(group).size < 2:
        return ratios.copy()
    quotients = _quotients(ratios, group)
    if not quotients:
        return ratios.copy()
    return np.where(group == 1, ratios, ratios / float(np.median(quotients)))


def _quotients(ratios: FloatArray, group: NDArray[np.intp]) -> list[float]:
    """Up over down: each stroke and the mean of its neighbours, else pairs of neighbours."""
    others = group[1:] != group[:-1]
    pairs: list[tuple[float, float, int]] = [
        (float(ratios[k]), 0.5 * float(ratios[k - 1] + ratios[k + 1]), int(group[k]))
        for k in range(1, ratios.size - 1)
        if others[k - 1] and others[k]
    ] or [
        (float(ratios[k]), float(ratios[k + 1]), int(group[k]))
        for k in range(ratios.size - 1)
        if others[k]
    ]
    return [
        around / own if which == 1 else own / around
        for own, around, which in pairs
        if own > 0 and around > 0
    ]


def change_points(ratios: FloatArray, group: NDArray[np.intp], u: FloatArray) -> tuple[int, ...]:
    """Positions k such that strokes [..k) and [k..) lie on different levels, in one direction or in both.

    Three searches: all strokes on one level; the down-strokes alone; the up-strokes alone. Those of one
    direction cost more, so that the three together invent a change in no more steady builds than the first
    alone is allowed to. A change both find is placed where all strokes put it.

    Parameters
    ----------
    ratios : (n,) in stroke order.
    group : (n,) 1 for down, 0 for up.
    u : (n,) random standard uncertainty of each ratio.

    Returns
    -------
    tuple of int
        Empty when the build is steady or only fades. A change of one direction only is put at its first
        changed stroke.
    """
    found = list(_changes(common_level(ratios, group), u, _PRICE_BASE))
    if np.unique(group).size == 2:
        single: set[int] = set()
        for value in (1, 0):
            mine = np.flatnonzero(group == value)
            single |= {int(mine[k]) for k in _changes(ratios[mine], u[mine], _PRICE_SINGLE)}
        for k in sorted(single):
            if all(abs(k - other) > _SAME for other in found):
                found.append(k)
    return tuple(sorted(found))


def _changes(level: FloatArray, u: FloatArray, base: float) -> tuple[int, ...]:
    """Changes of one series about one level.

    Optimal partitions for one, two, ... changes come from `ruptures` (dynamic programming); their number,
    none included, is the one with the best penalised likelihood, in competition with a straight trend.
    """
    n = level.size
    if n < _LEAST_STROKES:
        return ()
    level = _without_odd(level)
    scale = max(float(np.median(level)), 1e-3)
    level = level / scale
    # independent noise already known bounds the scatter from below
    floor = _SCATTER_WEIGHT * (_SCATTER**2 + float(np.median(u)) ** 2 / scale**2)

    def score(squares: float, price: float) -> float:
        return (n + _SCATTER_WEIGHT) * float(np.log((squares + floor) / n)) + price

    steady = float(((level - level.mean()) ** 2).sum())
    place = np.arange(n) - 0.5 * (n - 1)
    slope = float(place @ level) / float(place @ place)
    trend = steady - slope**2 * float(place @ place)
    best = min(score(steady, 0.0), score(trend, _TREND_PRICE * float(np.log(n))))

    import ruptures

    search = ruptures.KernelCPD(kernel="linear", min_size=_SHORTEST).fit(level.reshape(-1, 1))
    found: tuple[int, ...] = ()
    for count in range(1, min(_MOST_CHANGES, n // _SHORTEST - 1) + 1):
        ends = search.predict(n_bkps=count)
        squares = sum(
            float(((level[a:b] - level[a:b].mean()) ** 2).sum())
            for a, b in zip([0, *ends[:-1]], ends, strict=True)
        )
        value = score(squares, count * (base + _PRICE * float(np.log(n))))
        if value < best:
            best, found = value, tuple(int(e) for e in ends[:-1])
    return found


def _without_odd(level: FloatArray) -> FloatArray:
    """Replace a single stroke far off both neighbours by their middle."""
    n = level.size
    if n < 5:
        return level
    steps = np.abs(np.diff(level))
    spread = max(1.4826 * float(np.median(steps)) / np.sqrt(2.0), _SCATTER)
    out = level.copy()
    for k in range(n):
        around = [level[j] for j in (k - 2, k - 1, k + 1, k + 2) if 0 <= j < n]
        middle = float(np.median(around))
        near = [level[j] for j in (k - 1, k + 1) if 0 <= j < n]
        lone = all(abs(level[k] - v) > _ODD * spread for v in around)
        if lone and max(near) - min(near) < _ODD * spread:
            out[k] = middle
    return out
