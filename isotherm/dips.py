"""Bends too gradual to show a knee: a dip of the modulus, and a branch that ends soft."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view
from numpy.typing import NDArray

from isotherm.knee_evidence import Candidate
from isotherm.modulus import local_regression

__all__ = ["Dip", "find_dip", "with_dips", "with_yield"]

FloatArray = NDArray[np.float64]

DEPTH: Final = 0.7  # a dip's modulus against the lower of its two shoulders
SHOULDER: Final = 0.4  # the right shoulder against the left: less is a film that has yielded
SIGMAS: Final = 2.0  # bounds of the moduli compared, in u
SHORTEST: Final = 0.05  # share of the branch's range of ln A that a coexistence covers at least
RISEN: Final = 1.0  # mN/m by which the branch has risen where a coexistence begins
RISEN_SIGMAS: Final = 5.0
DOUBT: Final = 0.05  # of a fitted modulus, relative, when looking for a dip in it
ROUNDED: Final = 0.15  # first guess of a rounding, as a share of the dip's half-width


SOFTENED: Final = (
    0.25  # modulus at the end of a branch that has yielded, a share of its largest at most
)
YIELDED: Final = 0.4  # the share at which it counts as yielding
NEAR_YIELD: Final = 0.3  # share of the softened end within which another knee is the same
WINDOW: Final = 9  # nodes by which slopes along the branch are judged


@dataclass(frozen=True)
class Dip:
    """A stretch of low modulus between stiffer ones: x where it begins and ends, and the three moduli."""

    onset: float
    end: float
    before: float
    within: float
    after: float


def find_dip(x: FloatArray, modulus: FloatArray, u: FloatArray) -> Dip | None:
    """The deepest significant dip of (m,) modulus (mN/m, with u) along x, or None."""
    known = np.isfinite(modulus) & np.isfinite(u)
    if int(known.sum()) < 5:
        return None
    x, modulus, u = x[known], modulus[known], u[known]
    sure = modulus - SIGMAS * u
    left = np.concatenate([[-np.inf], np.maximum.accumulate(sure)[:-1]])
    right = np.concatenate([np.maximum.accumulate(sure[::-1])[::-1][1:], [-np.inf]])
    shoulder = np.minimum(left, right)
    top = np.maximum(modulus + SIGMAS * u, 1e-3)
    usable = (shoulder > 0) & (right > SHOULDER * left) & (top < DEPTH * shoulder)
    if not usable.any():
        return None
    i = int(np.argmin(np.where(usable, top / np.maximum(shoulder, 1e-9), np.inf)))
    a = int(np.argmax(sure[:i]))
    # the nearest point to the right that is stiffer than the left shoulder, or the stiffest there is
    stiff = np.flatnonzero(sure[i:] >= max(modulus[a], 0.5 * float(right[i])))
    b = i + (int(stiff[0]) if stiff.size else int(np.argmax(sure[i:])))
    within = max(float(modulus[i]), 1e-3)
    onset = _crossing(x, modulus, a, i, np.sqrt(within * max(float(modulus[a]), within)))
    end = _crossing(x, modulus, b, i, np.sqrt(within * max(float(modulus[b]), within)))
    if not onset < end:
        return None
    return Dip(onset, end, float(modulus[a]), within, float(modulus[b]))


def _crossing(x: FloatArray, modulus: FloatArray, outer: int, inner: int, level: float) -> float:
    """x nearest to `inner`, going from `inner` to `outer`, where the modulus passes `level`."""
    step = 1 if outer > inner else -1
    path = np.arange(inner, outer + step, step)
    above = np.flatnonzero(modulus[path] >= level)
    k = int(above[0]) if above.size else path.size - 1
    return float(0.5 * (x[path[k]] + x[path[max(k - 1, 0)]]))


def with_dips(
    candidates: list[Candidate],
    x: FloatArray,
    y: FloatArray,
    sigma: FloatArray,
    modulus: FloatArray,
) -> list[Candidate]:
    """The candidates, with the two knees of a dip put in where no pair of them encloses one.

    modulus : (m,) of the model fitted so far: without a dip in it there is no need to look closer.
    """
    steps = [c.after - c.before for c in candidates]
    if any(a < 0 < b for a, b in itertools.pairwise(steps)):
        return candidates
    if find_dip(x, modulus, DOUBT * np.abs(modulus)) is None:
        return candidates
    whole = np.array([0, x.size], dtype=np.int64)
    local = local_regression(x, y, sigma, whole)
    dip = find_dip(x, local.modulus, local.u_modulus)
    if dip is None or dip.end - dip.onset < SHORTEST * float(np.ptp(x)):
        return candidates
    risen = float(np.interp(dip.onset, x, local.pressure) - local.pressure[0])
    if risen < max(RISEN, RISEN_SIGMAS * float(np.median(sigma))):
        return candidates
    middle = 0.5 * (dip.onset + dip.end)
    reach = 0.5 * (dip.end - dip.onset)
    out = list(candidates)
    falls = [c for c in out if c.x < middle and c.after < c.before and c.before > 0]
    rises = [c for c in out if c.x > middle and c.after > c.before]
    has_onset = any(abs(c.x - dip.onset) < reach for c in falls)
    has_end = any(abs(c.x - dip.end) < reach for c in rises)
    if has_onset and has_end:
        return candidates
    # knees inside the dip that are neither its onset nor its end describe its rounding
    out = [c for c in out if not dip.onset - 0.3 * reach < c.x < dip.end + 0.3 * reach]
    out.append(Candidate(dip.onset, ROUNDED * reach, dip.before, dip.within, np.inf))
    out.append(Candidate(dip.end, ROUNDED * reach, dip.within, dip.after, np.inf))
    return sorted(out, key=lambda c: c.x)


def with_yield(
    candidates: list[Candidate], x: FloatArray, y: FloatArray, sigma: FloatArray
) -> list[Candidate]:
    """The candidates, with a knee put in where the branch rolls over to a level end.

    To be asked where none of them gives way: a film may do so so gradually that smooth polynomials
    describe it, and has collapsed all the same.
    """
    slope, u = _window_slopes(x, y, sigma)
    if slope.size < 2:
        return candidates
    sure = slope - SIGMAS * u
    peak = int(np.argmax(sure))
    stiffest = float(sure[peak])
    if stiffest <= 0 or slope[-1] + SIGMAS * u[-1] > SOFTENED * stiffest:
        return candidates
    middle = 0.5 * (x[: slope.size] + x[WINDOW - 1 :])
    soft = peak + int(np.argmax(slope[peak:] < YIELDED * stiffest))
    at = float(middle[soft])
    reach = float(x[-1]) - at
    kept = [c for c in candidates if abs(c.x - at) > NEAR_YIELD * reach]
    kept.append(Candidate(at, ROUNDED * reach, stiffest, float(slope[-1]), np.inf))
    return sorted(kept, key=lambda c: c.x)


def _window_slopes(
    x: FloatArray, y: FloatArray, sigma: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Slope of a weighted line through every `WINDOW` nodes in a row, and its u."""
    if x.size < WINDOW:
        return np.empty(0), np.empty(0)
    px, py, w = (sliding_window_view(v, WINDOW) for v in (x, y, sigma**-2.0))
    total = w.sum(axis=1)
    dx = px - (np.sum(w * px, axis=1) / total)[:, None]
    size = np.maximum(np.sum(w * dx**2, axis=1), 1e-300)
    return np.sum(w * dx * py, axis=1) / size, size**-0.5
