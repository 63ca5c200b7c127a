"""Where a branch may bend: proposals by change-point detection, kept only if they beat a smooth curve."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = ["Candidate", "StretchCosts", "Verdict", "best_subset", "propose", "search", "test_knee"]

FloatArray = NDArray[np.float64]

PROPOSALS: Final = 16  # change points asked for: many more than a film has, so that none is missed
FEWEST_NODES: Final = 3  # nodes between two change points
# BIC difference from which a knee is believed: 10 is "very strong" (Kass & Raftery, J. Am. Stat. Assoc.
# 1995, 90, 773, for twice the log Bayes factor).
EVIDENCE: Final = 10.0
PENALTY: Final = 4.0  # of a stretch in the first cut, in ln n; lenient, the later tests decide
ROUNDS: Final = 4  # of dropping and putting back
MARGIN: Final = 0.2  # share of a stretch next to a knee that may be rounded by it
# No rounding shape is exact: misfits below this share of a window's range decide nothing (our choice).
INDIFFERENT: Final = 5e-4
# A model describes a window when its mean squared residual is at most this many times the scatter about
# the finest partition (our choice: twice its standard deviation).
ADEQUATE: Final = 4.0
# A stretch shorter than this share of both neighbours, its slope between theirs, is a rounding.
SHORT: Final = 0.25
SMOOTH_DEGREE: Final = 6  # a smooth rival gets as many parameters as the richest knee model
POSITIONS: Final = 28  # hinges tried along a window, before the best is refined
WIDTH_GRID: Final = (0.008, 0.035, 0.14)  # rounding widths tried, shares of half a window


@dataclass(frozen=True)
class Candidate:
    """A possible knee: x, width, slopes (moduli, mN/m) just left and right, and its evidence (ΔBIC)."""

    x: float
    width: float
    before: float
    after: float
    evidence: float


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


def test_knee(x: FloatArray, y: FloatArray, sigma: FloatArray) -> Verdict | None:
    """The best single rounded knee in a window against the best smooth polynomial.

    Parameters
    ----------
    x, y, sigma : (n,) window of nodes, x increasing.

    Returns
    -------
    Verdict or None
        None where the window has too few nodes to tell.
    """
    n = x.size
    if n < 6:
        return None
    centre, half = 0.5 * (x[0] + x[-1]), 0.5 * (x[-1] - x[0])
    if half <= 0:
        return None
    t = (x - centre) / half
    weight = 1.0 / sigma
    target = y * weight
    smooth_degree = min(SMOOTH_DEGREE, n // 3)
    powers = np.polynomial.chebyshev.chebvander(t, smooth_degree) * weight[:, None]
    q, _ = np.linalg.qr(powers)
    along = q.T @ target
    total = float(target @ target)
    rss_smooth = np.maximum(total - np.cumsum(along**2), 0.0)
    floor = _rounding_floor(y, weight)
    orders = np.arange(1, smooth_degree + 1)
    bics = n * np.log(rss_smooth[orders] + floor) + (orders + 1) * np.log(n)
    smoothest = int(np.argmin(bics))
    bic_smooth = float(bics[smoothest])
    fitter = _HingeFitter(t, weight, target, q, along, floor)
    edge = 2 if n < 30 else max(2, n // 20)
    positions = t[edge : n - edge]
    if positions.size > POSITIONS:
        positions = positions[:: positions.size // POSITIONS + 1]
    widths = np.array(WIDTH_GRID) if n >= 16 else np.array([WIDTH_GRID[0]])
    coarse = fitter.best(np.repeat(positions, widths.size), np.tile(widths, positions.size))
    if coarse is None:
        return None
    gap = float(np.max(np.diff(positions))) if positions.size > 1 else 0.1
    shifts = coarse.at + gap * np.array([-0.6, -0.3, 0.0, 0.3, 0.6])
    wider = coarse.width * (np.array([0.55, 1.0, 1.6]) if n >= 16 else np.array([1.0]))
    fine = fitter.best(np.repeat(shifts, wider.size), np.tile(wider, shifts.size))
    best = fine if fine is not None and fine.bic < coarse.bic else coarse
    before, after = fitter.slopes(best, powers)
    knee = Candidate(
        float(centre + half * best.at),
        float(half * best.width),
        before / half,
        after / half,
        float(bic_smooth - best.bic),
    )
    return Verdict(knee, best.bic, best.rss, float(rss_smooth[orders[smoothest]]))


@dataclass(frozen=True)
class _Hinge:
    """One rounded hinge on a window scaled to [-1, 1], and the polynomial degree beside it."""

    at: float
    width: float
    degree: int
    curved: bool
    bic: float
    rss: float


@dataclass(frozen=True)
class _HingeFitter:
    """Least squares of polynomial plus rounded hinge for many hinges at once.

    With an orthonormal polynomial basis q, one more column h lowers the residual sum of squares by
    (h⊥·r)²/(h⊥·h⊥), two by the 2 × 2 analogue, so a whole grid costs two matrix products.
    """

    t: FloatArray
    weight: FloatArray
    target: FloatArray
    q: FloatArray
    along: FloatArray
    floor: float

    def best(self, at: FloatArray, width: FloatArray) -> _Hinge | None:
        """The hinge of lowest BIC among (g,) positions and widths."""
        n = self.t.size
        z = (self.t[:, None] - at) / width
        hinge = width * (np.maximum(z, 0.0) + np.log1p(np.exp(-np.abs(z))))
        h1 = hinge * self.weight[:, None]
        h2 = hinge * h1
        k1, k2 = self.q[:, :4].T @ h1, self.q[:, :4].T @ h2
        n11, n22, n12 = (np.einsum("ij,ij->j", u, v) for u, v in ((h1, h1), (h2, h2), (h1, h2)))
        t1, t2 = h1.T @ self.target, h2.T @ self.target
        total = float(self.target @ self.target)
        best: _Hinge | None = None
        for degree in (1, 2, 3):
            if n < degree + 5:
                break
            a = self.along[: degree + 1]
            u1, u2 = k1[: degree + 1], k2[: degree + 1]
            rss0 = total - float(a @ a)
            s11 = n11 - np.einsum("ij,ij->j", u1, u1)
            r1 = t1 - a @ u1
            sound = s11 > 1e-9 * n11
            gain = np.where(sound, r1**2 / np.where(sound, s11, 1.0), 0.0)
            best = self._better(best, gain, rss0, at, width, degree, False)
            if n < degree + 8:
                continue
            s22 = n22 - np.einsum("ij,ij->j", u2, u2)
            s12 = n12 - np.einsum("ij,ij->j", u1, u2)
            r2 = t2 - a @ u2
            det = s11 * s22 - s12**2
            sound &= det > 1e-7 * s11 * s22
            both = (r1**2 * s22 - 2 * r1 * r2 * s12 + r2**2 * s11) / np.where(sound, det, 1.0)
            best = self._better(best, np.where(sound, both, 0.0), rss0, at, width, degree, True)
        return best

    def _better(
        self,
        best: _Hinge | None,
        gain: FloatArray,
        rss0: float,
        at: FloatArray,
        width: FloatArray,
        degree: int,
        curved: bool,
    ) -> _Hinge:
        n = self.t.size
        i = int(np.argmax(gain))
        left = max(rss0 - float(gain[i]), 0.0) + self.floor
        bic = float(n * np.log(left) + (degree + 4 + int(curved)) * np.log(n))
        if best is not None and best.bic <= bic:
            return best
        return _Hinge(float(at[i]), float(width[i]), degree, curved, bic, left - self.floor)

    def slopes(self, hinge: _Hinge, powers: FloatArray) -> tuple[float, float]:
        """Slopes just left and right of the hinge, per unit of t."""
        z = (self.t - hinge.at) / hinge.width
        h = hinge.width * (np.maximum(z, 0.0) + np.log1p(np.exp(-np.abs(z))))
        columns = [powers[:, : hinge.degree + 1], (h * self.weight)[:, None]]
        if hinge.curved:
            columns.append((h * h * self.weight)[:, None])
        c = np.linalg.lstsq(np.concatenate(columns, axis=1), self.target, rcond=None)[0]
        derivative = np.polynomial.chebyshev.chebder(c[: hinge.degree + 1])
        before = float(np.polynomial.chebyshev.chebval(hinge.at, derivative))
        return before, before + float(c[hinge.degree + 1])


def _rounding_floor(y: FloatArray, weight: FloatArray) -> float:
    """Weighted sum of squares below which two models are equally perfect."""
    return float(np.sum(weight**2)) * (INDIFFERENT * max(float(np.ptp(y)), 1e-9)) ** 2


class StretchCosts:
    """Weighted residual sums of squares of a parabola on any stretch of nodes, from running sums.

    Parameters
    ----------
    x, y, sigma : (n,) nodes.
    """

    def __init__(self, x: FloatArray, y: FloatArray, sigma: FloatArray) -> None:
        t = ((x - x[0]) / (x[-1] - x[0])).astype(np.longdouble)
        v = ((y - y.mean()) / max(float(np.ptp(y)), 1e-12)).astype(np.longdouble)
        w = 1.0 / sigma.astype(np.longdouble) ** 2
        powers = t[:, None] ** np.arange(5)
        self._unit = float(np.ptp(y)) ** 2
        self._sums = np.vstack([np.zeros(5), np.cumsum(w[:, None] * powers, axis=0)])
        cross = np.cumsum((w * v)[:, None] * powers[:, :3], axis=0)
        self._cross = np.vstack([np.zeros(3), cross])
        self._square = np.concatenate([[0.0], np.cumsum(w * v * v)])

    def __call__(self, a: NDArray[np.int64], b: NDArray[np.int64]) -> FloatArray:
        """Cost of the nodes a to b - 1, for index arrays a < b of one shape."""
        s = self._sums[b] - self._sums[a]
        r = self._cross[b] - self._cross[a]
        q = self._square[b] - self._square[a]
        # moments about the stretch's own centre keep the 3 x 3 systems well conditioned
        c = s[:, 1] / s[:, 0]
        m2 = s[:, 2] - c * s[:, 1]
        m3 = s[:, 3] - 3 * c * s[:, 2] + 3 * c**2 * s[:, 1] - c**3 * s[:, 0]
        m4 = s[:, 4] - 4 * c * s[:, 3] + 6 * c**2 * s[:, 2] - 4 * c**3 * s[:, 1] + c**4 * s[:, 0]
        r1 = r[:, 1] - c * r[:, 0]
        r2 = r[:, 2] - 2 * c * r[:, 1] + c**2 * r[:, 0]
        rss = q - r[:, 0] ** 2 / s[:, 0]
        sloped = m2 > 0
        slope = np.where(sloped, r1 / np.where(sloped, m2, 1.0), 0.0)
        rss = rss - slope * r1
        # the parabola's part orthogonal to constant and slope
        h = m4 - m2**2 / s[:, 0] - np.where(sloped, m3**2 / np.where(sloped, m2, 1.0), 0.0)
        g = r2 - m2 / s[:, 0] * r[:, 0] - slope * m3
        bent = h > 1e-15 * s[:, 0]
        rss = rss - np.where(bent, g**2 / np.where(bent, h, 1.0), 0.0)
        return np.asarray(np.maximum(rss, 0.0) * self._unit, dtype=np.float64)


def best_subset(
    costs: FloatArray, edges: NDArray[np.int64], penalty: float, shortest: int
) -> list[int]:
    """Inner edges of the cheapest partition: sum of costs plus `penalty` a stretch (exact)."""
    e = edges.size
    best = np.full(e, np.inf)
    best[0] = 0.0
    back = np.zeros(e, dtype=np.int64)
    for j in range(1, e):
        allowed = edges[j] - edges[:j] >= shortest
        total = np.where(allowed, best[:j] + costs[:j, j] + penalty, np.inf)
        back[j] = int(np.argmin(total))
        best[j] = total[back[j]]
    chosen = []
    j = e - 1
    while j > 0:
        j = int(back[j])
        if j > 0:
            chosen.append(int(edges[j]))
    return chosen[::-1]


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
        self.cache: dict[tuple[int, int], Verdict | None] = {}

    def judge(self, a: int, b: int) -> Verdict | None:
        if (a, b) not in self.cache:
            self.cache[(a, b)] = test_knee(self.x[a:b], self.y[a:b], self.sigma[a:b])
        return self.cache[(a, b)]

    def window(self, stops: list[int], first: int, last: int) -> tuple[int, int]:
        """Nodes from stop `first` to stop `last`, less the rounding of a knee at either end."""
        a, b = stops[first], stops[last]
        if first > 0:
            a += int(MARGIN * (stops[first + 1] - a))
        if last < len(stops) - 1:
            b -= int(MARGIN * (b - stops[last - 1]))
        return a, b

    def run(self, knots: list[int]) -> list[Candidate]:
        found = list(knots)
        for _ in range(ROUNDS):
            knees = self._drop(found)
            if not self._add(found):
                break
        else:
            knees = self._drop(found)
        return knees

    def _drop(self, found: list[int]) -> list[Candidate]:
        """Merge and drop until every knee left beats a smooth curve; `found` is changed in place."""
        while self._merge(found):
            pass
        while found:
            stops = [0, *found, self.x.size]
            verdicts = [self.judge(*self.window(stops, k, k + 2)) for k in range(len(found))]
            scores = [v.knee.evidence if v is not None else -np.inf for v in verdicts]
            # where neither model describes its window, the window holds more than one knee: keep it
            unclear = [
                v is not None
                and v.knee.evidence > -EVIDENCE
                and not self._adequate(v.smooth_rss, *self.window(stops, k, k + 2))
                for k, v in enumerate(verdicts)
            ]
            scores = [np.inf if u else s for s, u in zip(scores, unclear, strict=True)]
            worst = int(np.argmin(scores))
            if scores[worst] >= EVIDENCE:
                return [v.knee for v in verdicts if v is not None]
            del found[worst]
            while self._merge(found):
                pass
        return []

    def _adequate(self, rss: float, a: int, b: int) -> bool:
        """Whether a weighted residual sum over nodes a to b is about what the noise leaves."""
        floor = _rounding_floor(self.y[a:b], 1.0 / self.sigma[a:b])
        return rss <= ADEQUATE * self.scale * (b - a) + floor

    def _add(self, found: list[int]) -> bool:
        """Put the best-supported knee inside a stretch back, if any is well supported."""
        stops = [0, *found, self.x.size]
        best: Candidate | None = None
        for k in range(len(stops) - 1):
            verdict = self.judge(*self.window(stops, k, k + 1))
            if verdict is None or verdict.knee.evidence < EVIDENCE:
                continue
            if best is None or verdict.knee.evidence > best.evidence:
                best = verdict.knee
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
            apart = float(np.sum(self.cost(np.array([a, p, q]), np.array([p, q, b]))))
            if self._rounding(stops, k):
                apart = np.inf
            elif not self._adequate(one.knee_rss, a, b):
                continue
            m = b - a
            floor = _rounding_floor(self.y[a:b], 1.0 / self.sigma[a:b])
            gain = m * np.log(min(apart, 1e300) + floor) + 11 * np.log(m) - one.bic
            if gain > best_gain:
                best_gain, best_k, best_x = gain, k, one.knee.x
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


@dataclass(frozen=True)
class Verdict:
    """The best knee of a window: BIC and weighted residual sum of its model, and of the best polynomial's."""

    knee: Candidate
    bic: float
    knee_rss: float
    smooth_rss: float
