"""Knees of a branch told by few points, as read off a figure: straight pieces first, meaning second.

With some tens of points a smooth rival of six parameters explains anything, so the evidence used for
dense runs has no power. Here the branch is cut into straight pieces (exact partition, cost per piece),
and only what the moduli of these pieces say plainly becomes a knee: the flat start, a dip between two
stiffer branches, a large step up between two straight branches, a yield at the end.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.knee_evidence import Candidate
from isotherm.partition import best_subset

__all__ = ["Piece", "pieces_of", "sparse_candidates", "sparse_degrees"]

FloatArray = NDArray[np.float64]

SHAPE: Final = 0.004  # share of the pressure range that a straight piece may miss a curved film by
PENALTY: Final = 2.0  # of a piece, in ln n
FEWEST: Final = 2  # points of a piece; neighbours share none
FLAT: Final = 2.0  # mN/m; a start softer than this is a baseline
DIP: Final = 0.7  # a dip against both shoulders
SHOULDER: Final = 0.4  # right shoulder of a dip against the left one
STEP: Final = 1.5  # a kink between two straight branches
STRAIGHT: Final = 3  # points each branch beside a kink needs
EVIDENCE: Final = (
    10.0  # by which two lines must fit better (in χ²) than one cubic of as many parameters
)
FALL: Final = 1.0  # mN/m by which a pressure must fall to tell a collapse by itself
FALL_SIGMAS: Final = 5.0
CURVED: Final = 5  # points
YIELD: Final = (
    0.4  # a film that softens to this share of its stiffest and stays there has collapsed
)
BEYOND: Final = 2  # points that must fall short of the rising line, extended, to tell a collapse
SHORT_SIGMAS: Final = 4.0  # by this many u
SIGMAS: Final = 2.0


@dataclass(frozen=True)
class Piece:
    """A straight piece: nodes first to last - 1, line p = level + modulus (x - x0), u of the modulus."""

    first: int
    last: int
    x0: float
    level: float
    modulus: float
    u: float

    def at(self, x: float) -> float:
        """Pressure of the line at x, mN/m."""
        return self.level + self.modulus * (x - self.x0)


def pieces_of(x: FloatArray, y: FloatArray, sigma: FloatArray) -> list[Piece]:
    """Cut (n,) points into straight pieces: exact optimum of residuals plus a penalty a piece."""
    n = x.size
    spread = np.hypot(sigma, SHAPE * float(np.ptp(y)))
    edges = np.arange(n + 1)
    costs = np.zeros((n + 1, n + 1))
    w = 1.0 / spread**2
    sums = [
        np.concatenate([[0.0], np.cumsum(v)])
        for v in (w, w * x, w * y, w * x * x, w * x * y, w * y * y)
    ]
    i, j = np.triu_indices(n + 1, FEWEST)
    s, sx, sy, sxx, sxy, syy = (c[j] - c[i] for c in sums)
    cxx = sxx - sx * sx / s
    cxy = sxy - sx * sy / s
    cyy = syy - sy * sy / s
    costs[i, j] = np.maximum(cyy - np.where(cxx > 0, cxy**2 / np.maximum(cxx, 1e-300), 0.0), 0.0)
    inner = best_subset(costs, edges, PENALTY * float(np.log(n)), FEWEST)
    stops = [0, *inner, n]
    out = []
    for a, b in itertools.pairwise(stops):
        wx, px, py = w[a:b], x[a:b], y[a:b]
        total = float(wx.sum())
        x0, level = float((wx * px).sum()) / total, float((wx * py).sum()) / total
        spread_x = float((wx * (px - x0) ** 2).sum())
        modulus = float((wx * (px - x0) * py).sum()) / max(spread_x, 1e-300)
        out.append(Piece(a, b, x0, level, modulus, 1.0 / np.sqrt(max(spread_x, 1e-300))))
    return out


def sparse_candidates(x: FloatArray, y: FloatArray, sigma: FloatArray) -> list[Candidate]:
    """Knees of (n,) few points, in order of x."""
    pieces = pieces_of(x, y, sigma)
    first = 1 if len(pieces) > 1 and pieces[0].modulus < FLAT and _flat(pieces[0], x, y) else 0
    last = _last_rising(pieces, first)
    knees: list[Candidate] = []
    if first:
        knees.append(_meeting(pieces[0], pieces[1], x))
    j = first
    while j < last:
        end = _dip_end(pieces, j, last)
        if end is not None:
            softest = min(range(j + 1, end), key=lambda k: pieces[k].modulus)
            knees.append(_meeting(pieces[j], pieces[softest], x))
            knees.append(_meeting(pieces[softest], pieces[end], x))
            j = end
            continue
        here, after = pieces[j], pieces[j + 1]
        sure = after.modulus - SIGMAS * after.u > STEP * (here.modulus + SIGMAS * here.u)
        if sure and here.modulus > FLAT and _beats_smooth(here, after, x, y, sigma):
            knees.append(_meeting(here, after, x))
        j += 1
    if last + 1 < len(pieces):
        knee = _meeting(pieces[last], pieces[last + 1], x)
        beyond = x > knee.x
        rising = pieces[last]
        spread = np.hypot(sigma, SHAPE * float(np.ptp(y)))
        doubt = np.hypot(spread, rising.u * (x - rising.x0))
        short = rising.level + rising.modulus * (x - rising.x0) - y > SHORT_SIGMAS * doubt
        fall = float(np.max(y[~beyond], initial=-np.inf) - np.min(y[beyond], initial=np.inf))
        fallen = fall > max(FALL, FALL_SIGMAS * float(np.max(sigma)))
        if fallen or int((short & beyond).sum()) >= BEYOND:
            knees.append(knee)
    return sorted(knees, key=lambda c: c.x)


def _beats_smooth(
    here: Piece, after: Piece, x: FloatArray, y: FloatArray, sigma: FloatArray
) -> bool:
    """Whether two lines describe the points of two neighbouring pieces better than a cubic does."""
    if min(here.last - here.first, after.last - after.first) < STRAIGHT:
        return False
    part = slice(here.first, after.last)
    px, py, s = x[part], y[part], np.hypot(sigma[part], SHAPE * float(np.ptp(y)))
    t = (px - px.mean()) / max(float(np.ptp(px)), 1e-12)
    powers = np.vander(t, 4) / s[:, None]
    smooth = py / s - powers @ np.linalg.lstsq(powers, py / s, rcond=None)[0]
    first = np.arange(here.first, after.last) < here.last
    line = np.where(
        first,
        here.level + here.modulus * (px - here.x0),
        after.level + after.modulus * (px - after.x0),
    )
    bent = (py - line) / s
    return float(smooth @ smooth - bent @ bent) > EVIDENCE


def sparse_degrees(candidates: list[Candidate], x: FloatArray) -> tuple[int, ...]:
    """Highest polynomial degree of each stretch: curved only where a fluid branch may be.

    A stretch between a fall and a rise of the modulus (a plateau), and what follows a collapse, is
    straight; so is a stretch of fewer than `CURVED` points.
    """
    steps = [c.after - c.before for c in candidates]
    counts = np.diff(np.searchsorted(x, [x[0], *(c.x for c in candidates), x[-1] + 1.0]))
    out = []
    for j, count in enumerate(counts):
        after_fall = j > 0 and steps[j - 1] < 0
        flat_start = j == 0 and bool(steps) and candidates[0].before < FLAT
        out.append(1 if after_fall or flat_start or count < CURVED else 2)
    return tuple(out)


def _flat(piece: Piece, x: FloatArray, y: FloatArray) -> bool:
    return abs(piece.at(float(x[piece.last - 1])) - piece.at(float(x[0]))) < 0.02 * float(np.ptp(y))


def _last_rising(pieces: list[Piece], first: int) -> int:
    last, stiffest = first, 0.0
    for j in range(first, len(pieces)):
        stiffest = max(stiffest, pieces[j].modulus)
        if pieces[j].modulus > 0 and pieces[j].modulus >= YIELD * stiffest:
            last = j
    return last


def _dip_end(pieces: list[Piece], j: int, last: int) -> int | None:
    """The piece that ends a dip begun after piece j: the first clearly stiffer than dip and shoulder."""
    here = pieces[j]
    softest = np.inf
    for k in range(j + 1, last + 1):
        piece = pieces[k]
        bound = piece.modulus + SIGMAS * piece.u
        if bound < DIP * here.modulus:
            softest = min(softest, piece.modulus)
        elif not np.isfinite(softest):
            return None
        # roundings have moduli between: the end is where the modulus stops doubling
        stiff = DIP * (piece.modulus - SIGMAS * piece.u) > softest
        if np.isfinite(softest) and stiff and piece.modulus > SHOULDER * here.modulus:
            while k < last and pieces[k + 1].modulus > 2.0 * pieces[k].modulus:
                k += 1
            return k
    return None


def _meeting(a: Piece, b: Piece, x: FloatArray) -> Candidate:
    """Where two pieces meet when extended, kept between their middles."""
    low, high = float(a.x0), float(b.x0)
    slope = a.modulus - b.modulus
    at = (b.level - b.modulus * b.x0 - a.level + a.modulus * a.x0) / slope if slope else low
    if not low < at < high:
        at = 0.5 * float(x[a.last - 1] + x[b.first])
    return Candidate(float(at), 0.1 * (high - low), a.modulus, b.modulus, np.inf)
