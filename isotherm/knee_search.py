"""Where a branch may bend: proposals by change-point detection, kept only if they beat a smooth curve."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.knee_evidence import Candidate, Verdict, judge_knee, rounding_floor, with_slopes
from isotherm.partition import StretchCosts, best_subset

__all__ = ["propose", "search"]

FloatArray = NDArray[np.float64]

PROPOSALS: Final = 16  # change points asked for: many more than a film has, so that none is missed
FEWEST_NODES: Final = 3  # nodes between two change points
# BIC difference from which a knee is believed: 10 is "very strong" (Kass & Raftery, J. Am. Stat. Assoc.
# 1995, 90, 773, for twice the log Bayes factor).
EVIDENCE: Final = 10.0
PENALTY: Final = 4.0  # of a stretch in the first cut, in ln n; lenient, the later tests decide
HALVINGS: Final = 3  # of a window that one knee does not describe
SMALLEST_WINDOW: Final = 24  # nodes
ROUNDS: Final = 4  # of dropping and putting back
MARGIN: Final = 0.2  # share of a stretch next to a knee that may be rounded by it
# A model describes a window when its mean squared residual is at most this many times the scatter about
# the finest partition (our choice: twice its standard deviation).
ADEQUATE: Final = 4.0
# A stretch shorter than this share of both neighbours, its slope between theirs, is a rounding.
SHORT: Final = 0.25


def propose(x: FloatArray, y: FloatArray, count: int = PROPOSALS) -> NDArray[np.int64]:
    """Node indices where the slope changes, by kernel change-point detection (`ruptures`).

    The signal is asinh of the slope between neighbouring nodes, both axes divided by their range: near
    zero it is the slope, far from zero its logarithm, so that a step of the modulus by a given factor
    weighs the same in a soft and in a stiff film. Nodes are evenly spaced along the curve.
    """
    import ruptures

    span_x = max(float(np.ptp(x)), 1e-12)
    span_y = max(float(np.ptp(y)), 1e-12)
    dx = np.maximum(np.diff(x) / span_x, 1e-9)
    slope = np.arcsinh(np.diff(y) / span_y / dx)
    n = slope.size
    count = min(count, n // FEWEST_NODES - 1)
    if count < 1:
        return np.empty(0, dtype=np.int64)
    algorithm = ruptures.KernelCPD(kernel="linear", min_size=FEWEST_NODES)
    found = algorithm.fit(slope[:, None]).predict(n_bkps=count)
    return np.asarray(found[:-1], dtype=np.int64)


def search(x: FloatArray, y: FloatArray, sigma: FloatArray) -> list[Candidate]:
    """Knees of a branch, in order of x: proposals, best subset, then each against a smooth curve."""
    n = x.size
    edges = np.concatenate([[0], propose(x, y), [n]]).astype(np.int64)
    cost = StretchCosts(x, y, sigma)
    i, j = np.triu_indices(edges.size, 1)
    costs = np.zeros((edges.size, edges.size))
    costs[i, j] = cost(edges[i], edges[j])
    finest = float(np.trace(costs, offset=1))
    scale = max(1.0, finest / max(n - 3 * (edges.size - 1), 1))
    knots = best_subset(costs, edges, PENALTY * float(np.log(n)) * scale, FEWEST_NODES)
    return _Pruning(x, y, sigma, cost, scale).run(knots)


class _Pruning:
    """Merge pairs that are one rounded knee, then drop what does not beat a smooth curve."""

    def __init__(
        self, x: FloatArray, y: FloatArray, sigma: FloatArray, cost: StretchCosts, scale: float
    ) -> None:
        self.x, self.y, self.sigma, self.cost, self.scale = x, y, sigma, cost, scale
        self.weights = np.concatenate([[0.0], np.cumsum(sigma**-2.0)])
        self.cache: dict[tuple[int, int], Verdict | None] = {}
        self.costs: dict[tuple[int, ...], float] = {}

    def judge(self, a: int, b: int) -> Verdict | None:
        if (a, b) not in self.cache:
            self.cache[(a, b)] = judge_knee(self.x[a:b], self.y[a:b], self.sigma[a:b])
        return self.cache[(a, b)]

    def window(self, stops: list[int], first: int, last: int) -> tuple[int, int]:
        """Nodes from stop `first` to stop `last`, less the rounding of a knee at either end."""
        a, b = stops[first], stops[last]
        if first > 0:
            a += int(MARGIN * (stops[first + 1] - a))
        if last < len(stops) - 1:
            b -= int(MARGIN * (b - stops[last - 1]))
        return a, b

    def near(self, stops: list[int], k: int) -> tuple[int, int]:
        """The widest window about knee k, halved up to thrice, that a single knee describes.

        A fluid branch from lift-off to a late transition bends more than the model's polynomial can;
        its knees are then judged on the part of it that is near.
        """
        a, b = self.window(stops, k, k + 2)
        at = stops[k + 1]
        for _ in range(HALVINGS):
            verdict = self.judge(a, b)
            if (
                b - a < SMALLEST_WINDOW
                or verdict is None
                or self._adequate(verdict.hinge.rss, a, b)
            ):
                break
            a, b = at - (at - a + 1) // 2, at + (b - at + 1) // 2
        return a, b

    def run(self, knots: list[int]) -> list[Candidate]:
        found = list(knots)
        for _ in range(ROUNDS):
            self._drop(found)
            if not self._add(found):
                break
        else:
            self._drop(found)
        return self._knees([0, *found, self.x.size])

    def _drop(self, found: list[int]) -> None:
        """Merge and drop until every knee left beats a smooth curve; `found` is changed in place."""
        while self._merge(found):
            pass
        while found:
            stops = [0, *found, self.x.size]
            windows = [self.near(stops, k) for k in range(len(found))]
            verdicts = [self.judge(a, b) for a, b in windows]
            scores = [v.evidence if v is not None else -np.inf for v in verdicts]
            # where neither model describes its window, the window holds more than one knee: keep it
            unclear = [
                v is not None
                and v.evidence > -EVIDENCE
                and not self._adequate(v.smooth_rss, *window)
                for v, window in zip(verdicts, windows, strict=True)
            ]
            scores = [np.inf if u else s for s, u in zip(scores, unclear, strict=True)]
            worst = int(np.argmin(scores))
            if scores[worst] >= EVIDENCE:
                return
            del found[worst]
            while self._merge(found):
                pass

    def _knees(self, stops: list[int]) -> list[Candidate]:
        """The knees found, with the moduli beside them."""
        out = []
        for k in range(len(stops) - 2):
            a, b = self.near(stops, k)
            verdict = self.judge(a, b)
            if verdict is not None:
                out.append(with_slopes(verdict, self.x[a:b], self.y[a:b], self.sigma[a:b]))
        return out

    def _adequate(self, rss: float, a: int, b: int) -> bool:
        """Whether a weighted residual sum over nodes a to b is about what the noise leaves."""
        floor = self._floor(a, b)
        return rss <= ADEQUATE * self.scale * (b - a) + floor

    def _apart(self, *edges: int) -> float:
        """Cost of the stretches between the edges, a parabola each."""
        if edges not in self.costs:
            self.costs[edges] = float(self.cost(np.array(edges[:-1]), np.array(edges[1:])).sum())
        return self.costs[edges]

    def _floor(self, a: int, b: int) -> float:
        return rounding_floor(self.y[a:b], float(self.weights[b] - self.weights[a]))

    def _add(self, found: list[int]) -> bool:
        """Put the best-supported knee inside a stretch back, if any is well supported."""
        stops = [0, *found, self.x.size]
        best: Verdict | None = None
        for k in range(len(stops) - 1):
            verdict = self.judge(*self.window(stops, k, k + 1))
            if verdict is None or verdict.evidence < EVIDENCE:
                continue
            if best is None or verdict.evidence > best.evidence:
                best = verdict
        if best is None:
            return False
        at = int(np.searchsorted(self.x, best.x))
        found.append(at)
        found.sort()
        return True

    def _merge(self, found: list[int]) -> bool:
        """Replace the neighbouring pair that gains most by one rounded knee, if any gains."""
        stops = [0, *found, self.x.size]
        best_gain, best_k, best_x = 0.0, -1, 0.0
        for k in range(len(found) - 1):
            a, b = self.window(stops, k, k + 3)
            one = self.judge(a, b)
            if one is None:
                continue
            p, q = stops[k + 1], stops[k + 2]
            if self._rounding(stops, k):
                apart = math.inf
            elif self._adequate(one.hinge.rss, a, b):
                apart = self._apart(a, p, q, b)
            else:
                continue
            m = b - a
            floor = self._floor(a, b)
            gain = m * np.log(min(apart, 1e300) + floor) + 11 * np.log(m) - one.hinge.bic
            if gain > best_gain:
                best_gain, best_k, best_x = gain, k, one.x
        if best_k < 0:
            return False
        at = int(np.searchsorted(self.x, best_x))
        found[best_k : best_k + 2] = [int(np.clip(at, stops[best_k] + 2, stops[best_k + 3] - 2))]
        return True

    def _rounding(self, stops: list[int], k: int) -> bool:
        """Whether the stretch between knees k and k + 1 is short with a slope between its neighbours'."""
        a, p, q, b = (min(i, self.x.size - 1) for i in stops[k : k + 4])
        x, y = self.x, self.y
        if x[q] - x[p] > SHORT * min(x[p] - x[a], x[b] - x[q]):
            return False
        c, d = (a + p) // 2, (q + b + 1) // 2
        before, within, after = (
            (y[j] - y[i]) / max(x[j] - x[i], 1e-12) for i, j in ((c, p), (p, q), (q, d))
        )
        return bool(min(before, after) <= within <= max(before, after))
