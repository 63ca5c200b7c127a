"""Creep of the floating film as a function of time: a decay after each renewal, and a slow wander."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.ratio_nodes import Nodes

__all__ = ["CreepModel", "choose_creep_model"]

FloatArray = NDArray[np.float64]

# Prior of the creep rate, 1/s: zero, give or take 18 % an hour. A film that creeps faster is still fitted,
# since a minute's dwell fixes its own slope far better than this.
_RATE = 5e-5
# Prior of the part that decays after a film is made (relaxation of a fresh film), 1/s.
_FRESH = 2e-5
# How much the rate may wander over one usual interval between dwells, 1/s; the data choose.
_WANDERS = (3e-9, 3e-8, 1e-7, 3e-7, 1e-6, 3e-6, 1e-5, 3e-5)
_WANDER_SCALE = 1e-6
# Time constants of the decay to choose from, s; 0 means none.
_DECAYS = (0.0, 300.0, 900.0, 2700.0, 8100.0, 24300.0)
# Odds against a decay before the data are seen, as a log-likelihood.
_DECAY_PRICE = 1.0
# A renewal makes another film: its rate may differ by this many usual wanders.
_RENEWAL_FACTOR = 3.0


@dataclass(frozen=True)
class CreepModel:
    """c(t) = r(t) + a_h exp(-(t - t_h) / decay) in hold h, r linear between dwells; 1/s.

    Parameters theta: (r_1 .. r_k, a_1 .. a_h), the latter only where decay > 0 (s). node_time, node_hold:
    (k,). hold_start : (h,) s. wander : 1/s for one usual interval.
    """

    node_time: FloatArray
    node_hold: NDArray[np.intp]
    hold_start: FloatArray
    decay: float
    wander: float

    @property
    def size(self) -> int:
        """Number of parameters."""
        return self.node_time.size + (self.hold_start.size if self.decay > 0 else 0)

    def rates(self) -> FloatArray:
        """Rate at every node's mean time as a linear map of theta, (k, size)."""
        k = self.node_time.size
        out = np.zeros((k, self.size))
        out[np.arange(k), np.arange(k)] = 1.0
        if self.decay > 0:
            out[np.arange(k), k + self.node_hold] = self._fresh(self.node_time, self.node_hold)
        return out

    def rate_changes(self) -> FloatArray:
        """Time derivative of the decaying part at every node, 1/s^2, as a linear map, (k, size)."""
        k = self.node_time.size
        out = np.zeros((k, self.size))
        if self.decay > 0:
            fresh = self._fresh(self.node_time, self.node_hold)
            out[np.arange(k), k + self.node_hold] = -fresh / self.decay
        return out

    def loss(self, node: int, time: FloatArray) -> list[tuple[int, FloatArray]]:
        """Integral of the rate from a node's mean time to other times (s), linear in theta.

        Returns
        -------
        list of (index into theta, (n,) coefficient)
        """
        time = np.atleast_1d(np.asarray(time, dtype=np.float64))
        start = float(self.node_time[node])
        passed = time - start
        mine = passed.copy()
        terms: list[tuple[int, FloatArray]] = []
        for other, side in ((node + 1, passed > 0), (node - 1, passed < 0)):
            if not 0 <= other < self.node_time.size or not side.any():
                continue
            gap = float(self.node_time[other]) - start
            if self.node_hold[other] != self.node_hold[node] or gap == 0.0:
                continue
            # r goes from r_node to r_other over the gap, and stays there beyond
            within = np.clip(passed / gap, 0.0, 1.0)
            shift = np.where(side, within * within * gap / 2.0 + (passed - within * gap), 0.0)
            terms.append((other, shift))
            mine -= shift
        terms.append((node, mine))
        if self.decay > 0:
            hold = int(self.node_hold[node])
            there = self._fresh(time, np.full(time.size, hold))
            here = float(self._fresh(np.asarray([start]), np.asarray([hold]))[0])
            terms.append((self.node_time.size + hold, self.decay * (here - there)))
        return terms

    def precision(self) -> FloatArray:
        """Inverse covariance of theta before the data, (size, size)."""
        k = self.node_time.size
        out = np.zeros((self.size, self.size))
        index = np.arange(k)
        out[index, index] += 1.0 / (_RATE**2 * k)
        weight = 1.0 / (self.wander**2 * _stretch(self.node_time, self.node_hold))
        steps = np.arange(k - 1)
        out[steps, steps] += weight
        out[steps + 1, steps + 1] += weight
        out[steps, steps + 1] -= weight
        out[steps + 1, steps] -= weight
        fresh = np.arange(k, self.size)
        out[fresh, fresh] = 1.0 / _FRESH**2
        return out

    def _fresh(self, time: FloatArray, hold: NDArray[np.intp]) -> FloatArray:
        age = np.maximum(time - self.hold_start[hold], 0.0)
        return np.asarray(np.exp(-age / self.decay))


def _stretch(time: FloatArray, hold: NDArray[np.intp]) -> FloatArray:
    """Variance of the wander over each interval between nodes, in units of the usual one's."""
    gap = np.diff(time)
    if gap.size == 0:
        return gap
    usual = max(float(np.median(gap)), 1e-9)
    across = np.where(np.diff(hold) != 0, _RENEWAL_FACTOR**2, 0.0)
    return np.asarray(np.maximum(gap / usual, 0.05) + across)


def choose_creep_model(
    nodes: Nodes, hold_start: FloatArray, compressibility: float, variance: float
) -> CreepModel:
    """Pick decay and wander most likely given the dwells' own slopes.

    Parameters
    ----------
    nodes : Nodes
    hold_start : (h,) s, start of each hold.
    compressibility : float
        C_s, m/mN, to correct the slopes with.
    variance : float
        Variance of ln(area) of one row, correlation allowed for.

    Returns
    -------
    CreepModel
        By marginal likelihood over a grid (MacKay, Neural Comput. 1992, 4, 415; Kalman 1960).
    """
    known = np.flatnonzero(nodes.tt > 0)
    fallback = CreepModel(nodes.time, nodes.hold, hold_start, 0.0, _WANDER_SCALE)
    if known.size < 2:
        return fallback
    slope = -(nodes.ty[known] + compressibility * nodes.tw[known]) / nodes.tt[known]
    noise = variance / nodes.tt[known]
    hold = nodes.hold[known]
    age = np.maximum(nodes.time[known] - hold_start[hold], 0.0)
    passed = np.concatenate([[0.0], np.cumsum(_stretch(nodes.time, nodes.hold))])[known]
    decays = _DECAYS if known.size > 2 else (0.0,)
    decay, wander = (v.ravel() for v in np.meshgrid(decays, _WANDERS, indexing="ij"))
    score = _log_likelihood(slope, noise, hold, age, np.diff(passed, prepend=0.0), decay, wander)
    score -= 0.5 * wander / _WANDER_SCALE + np.where(decay > 0, _DECAY_PRICE, 0.0)
    best = int(np.argmax(score))
    return CreepModel(nodes.time, nodes.hold, hold_start, float(decay[best]), float(wander[best]))


def _log_likelihood(
    slope: FloatArray,
    noise: FloatArray,
    hold: NDArray[np.intp],
    age: FloatArray,
    stretch: FloatArray,
    decay: FloatArray,
    wander: FloatArray,
) -> FloatArray:
    """Log-likelihood of the dwells' slopes (k,) for every decay and wander (g,), by Kalman's recursion.

    The state is (r, a): the wandering rate and the decaying part, the latter new in every hold.
    """
    rate, fresh = np.zeros(decay.size), np.zeros(decay.size)
    p_rr, p_ra = np.full(decay.size, _RATE**2), np.zeros(decay.size)
    p_aa = np.full(decay.size, _FRESH**2)
    total = np.zeros(decay.size)
    fades = decay > 0
    scale = np.where(fades, decay, 1.0)
    for k in range(slope.size):
        p_rr = p_rr + wander**2 * (stretch[k] if k else 0.0)
        if k and hold[k] != hold[k - 1]:
            fresh, p_ra, p_aa = 0.0 * fresh, 0.0 * p_ra, np.full(decay.size, _FRESH**2)
        f = np.where(fades, np.exp(-age[k] / scale), 0.0)
        gain_r, gain_a = p_rr + f * p_ra, p_ra + f * p_aa
        spread = gain_r + f * gain_a + noise[k]
        miss = slope[k] - rate - f * fresh
        total -= 0.5 * (miss**2 / spread + np.log(spread))
        rate, fresh = rate + gain_r / spread * miss, fresh + gain_a / spread * miss
        p_rr, p_ra, p_aa = (
            p_rr - gain_r**2 / spread,
            p_ra - gain_r * gain_a / spread,
            p_aa - gain_a**2 / spread,
        )
    return total
