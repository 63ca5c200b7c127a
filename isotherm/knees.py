"""From nodes to a fitted branch: search, joint fit, refinement on rows, and a last test of each knee."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.condense import DENSE, Nodes
from isotherm.dips import with_dips, with_yield
from isotherm.knee_evidence import Candidate
from isotherm.knee_fit import INDIFFERENT, WIDEST, choose_degrees, fit_knees
from isotherm.knee_model import KneeModel
from isotherm.knee_search import search
from isotherm.knee_uncertainty import with_model_doubt
from isotherm.phases import read_stretches
from isotherm.sparse_fit import SparseRead, read_sparse, refine_sparse, sparse_model

__all__ = ["find_knees", "refine_knees"]

FloatArray = NDArray[np.float64]

HIGHEST_DEGREE: Final = 5  # of a stretch; a fluid branch from lift-off to collapse needs about 4
MODEST_DEGREE: Final = 3  # of the first fit
CLOSEST: Final = 2e-3  # share of the branch's range of ln A that two knees are apart at least
# Two knees nearer in ln A that bend the same way are one that is rounded: no phase is so narrow, and a
# probe's lag or an uneven barrier makes such pairs (our choice, that of the narrowest plateau).
TWICE: Final = 0.01
OFF_CURVE: Final = (
    0.25  # of the pressure range; neighbours that meet further off are no tangents (our choice)
)
NARROW: Final = 0.04  # largest rounding, as WIDEST, where a wide one led astray
FEWEST_BEYOND: Final = 6  # rows beyond a knee
COARSE: Final = 10  # iterations of a fit that will be refined
ROUNDS: Final = 2  # of enriching shapes
NODES_PER_DEGREE: Final = 8  # nodes a stretch must have for each degree
STEP_SIGMAS: Final = 4.0  # a knee whose step of slope is not this many u above zero is dropped
ROWS_PER_KNEE: Final = 120  # rows, or means of neighbouring rows, a knee is refined on
NEIGHBOURHOOD: Final = 4  # nodes each side of a knee that are replaced by rows


def find_knees(nodes: Nodes, read: SparseRead | None = None) -> KneeModel:
    """Find and fit the knees of one branch on its nodes.

    Parameters
    ----------
    read : the nodes as a figure, where they are few and were read already.

    Returns
    -------
    KneeModel
        With no knots where the branch is one smooth curve.
    """
    if nodes.x.size < DENSE:
        return sparse_model(nodes, read_sparse(nodes) if read is None else read)
    x, y, sigma = nodes.x, nodes.pressure, nodes.sigma
    candidates = _in_order(search(x, y, sigma), x)
    model = _fit(x, y, sigma, candidates)
    scatter = sigma * np.sqrt(max(model.inflation, 1.0))
    dipped = with_dips(candidates, x, y, scatter, model.modulus(x))
    if dipped is not candidates:
        dipped = _in_order(dipped, x)
        candidates, model = dipped, _fit(x, y, sigma, dipped)
    if not _gives_way(model):
        ending = _in_order(with_yield(candidates, x, y, scatter), x)
        if ending != candidates:
            yielded = _fit(x, y, sigma, ending)
            if _gives_way(yielded):
                candidates, model = ending, yielded
    while (pair := _one_knee_twice(model)) is not None:
        candidates = [*candidates[:pair], _merged(model, pair), *candidates[pair + 2 :]]
        model = _fit(x, y, sigma, candidates)
    while (astray := _astray(model)) is not None:
        fewer = candidates[:astray] + candidates[astray + 1 :]
        ways = [(fewer, _fit(x, y, sigma, fewer))]
        narrow = _fit(x, y, sigma, candidates, widest=NARROW)
        if _astray(narrow) is None:
            ways.append((candidates, narrow))
        candidates, model = min(ways, key=lambda way: _bic(way[1], y, sigma))
    while True:
        weak = _weakest(model)
        if weak is None:
            return model
        fewer = candidates[:weak] + candidates[weak + 1 :]
        simpler = _fit(x, y, sigma, fewer)
        if _bic(simpler, y, sigma) > _bic(model, y, sigma):
            return model
        candidates, model = fewer, simpler


def _in_order(candidates: list[Candidate], x: FloatArray) -> list[Candidate]:
    """Candidates in order of x, inside the branch, none on top of another."""
    apart = CLOSEST * float(x[-1] - x[0])
    out: list[Candidate] = []
    for candidate in sorted(candidates, key=lambda c: c.x):
        last = out[-1].x if out else float(x[0])
        if candidate.x - last > apart and float(x[-1]) - candidate.x > apart:
            out.append(candidate)
    return out


def _fit(
    x: FloatArray,
    y: FloatArray,
    sigma: FloatArray,
    candidates: list[Candidate],
    *,
    widest: float = WIDEST,
) -> KneeModel:
    knots = np.array([c.x for c in candidates])
    widths = np.array([c.width for c in candidates])
    edges = np.concatenate([[x[0] - 1.0], knots, [x[-1] + 1.0]])
    inside = np.diff(np.searchsorted(x, edges))
    highest = tuple(int(np.clip(c // NODES_PER_DEGREE, 1, HIGHEST_DEGREE)) for c in inside)
    # modest shapes first: a rich polynomial would explain a rounding that the knee has yet to fit
    modest = tuple(min(h, MODEST_DEGREE) for h in highest)
    degrees = choose_degrees(x, y, sigma, knots, widths, modest)
    model = fit_knees(
        x, y, sigma, knots, widths, degrees, iterations=COARSE, widest=widest, converged=0.1
    )
    for _ in range(ROUNDS):
        degrees = choose_degrees(x, y, sigma, model.knots, model.widths, highest)
        if degrees == model.degrees:
            return model
        richer = fit_knees(
            x,
            y,
            sigma,
            model.knots,
            model.widths,
            degrees,
            iterations=COARSE,
            widest=widest,
            converged=0.1,
        )
        if _bic(richer, y, sigma) > _bic(model, y, sigma):
            return model
        model = richer
    return model


def _bic(model: KneeModel, y: FloatArray, sigma: FloatArray) -> float:
    floor = float(np.sum(sigma**-2.0)) * (INDIFFERENT * max(float(np.ptp(y)), 1e-9)) ** 2
    parameters = model.coefficients.size + 2 * model.knots.size
    return float(y.size * np.log(model.rss + floor) + parameters * np.log(y.size))


def _weakest(model: KneeModel) -> int | None:
    """The knee whose step of slope is least significant, when it is not significant at all."""
    if model.knots.size == 0:
        return None
    ratios = [
        abs(step) / max(u, 1e-12) for step, u in map(model.slope_step, range(model.knots.size))
    ]
    worst = int(np.argmin(ratios))
    return worst if ratios[worst] < STEP_SIGMAS else None


def _gives_way(model: KneeModel) -> bool:
    """Whether the branch ends collapsed, or inside a coexistence."""
    reading = read_stretches(model)
    return reading.collapse is not None or any(end is None for _, end in reading.coexistences)


def _one_knee_twice(model: KneeModel) -> int | None:
    """The first of two neighbouring knees that bend the same way within a hundredth of ln A, if any."""
    for k in range(model.knots.size - 1):
        near = float(model.knots[k + 1] - model.knots[k]) < TWICE
        if near and model.slope_step(k)[0] * model.slope_step(k + 1)[0] > 0:
            return k
    return None


def _astray(model: KneeModel) -> int | None:
    """The knee furthest off the curve, when it is further than any rounding cuts off a corner."""
    if not model.knots.size:
        return None
    met = np.array([model.knee_pressure(k)[0] for k in range(model.knots.size)])
    off = np.abs(met - model.pressure(model.knots))
    ends = model.pressure(np.array([model.start, model.stop]))
    worst = int(np.argmax(off))
    return (
        worst
        if off[worst] > OFF_CURVE * float(np.ptp([*ends, *model.pressure(model.knots)]))
        else None
    )


def _merged(model: KneeModel, k: int) -> Candidate:
    """One knee, rounded over both, in place of knees `k` and `k` + 1."""
    (first, _), (second, _) = model.slope_step(k), model.slope_step(k + 1)
    a, b = float(model.knots[k]), float(model.knots[k + 1])
    share = second / (first + second)
    width = max(0.5 * (b - a), float(model.widths[k]), float(model.widths[k + 1]))
    return Candidate(a + share * (b - a), width, np.nan, np.nan, np.inf)


def refine_knees(
    model: KneeModel, nodes: Nodes, area: FloatArray, pressure: FloatArray, stop: float
) -> KneeModel:
    """Fit again with rows instead of nodes near every knee, up to x = `stop`.

    Parameters
    ----------
    area, pressure : (n,) rows the nodes were made of, in their order, nm^2 and mN/m.
    """
    if nodes.x.size < DENSE:
        return refine_sparse(model, nodes, stop)
    keep = nodes.x <= stop
    # rows stand in for nodes near a knee: so many must follow it, for a knee at the very end to be told
    beyond = np.cumsum((nodes.count * keep)[::-1])[::-1]
    follow = beyond[np.minimum(np.searchsorted(nodes.x, model.knots), nodes.x.size - 1)]
    knots = model.knots[(model.knots < nodes.x[keep][-1]) & (follow >= FEWEST_BEYOND)]
    x, y, sigma = nodes.x[keep], nodes.pressure[keep], nodes.sigma[keep]
    if not np.all(nodes.count == 1):
        x, y, sigma = _with_rows(nodes, keep, knots, model.widths, area, pressure)
    k = knots.size
    degrees = model.degrees[: k + 1]
    if k and model.knots.size >= k:
        # rows tell more of the last stretch, which may fall from a peak in a curve, than its nodes did
        inside = int(np.sum(x > knots[-1])) // NODES_PER_DEGREE
        highest = (*degrees[:k], int(np.clip(inside, degrees[k], HIGHEST_DEGREE)))
        chosen = choose_degrees(x, y, sigma, knots, model.widths[:k], highest)
        degrees = (*degrees[:k], max(degrees[k], chosen[k]))
    fitted = fit_knees(x, y, sigma, knots, model.widths[:k], degrees)
    return with_model_doubt(fitted, x, y, sigma)


def _with_rows(
    nodes: Nodes,
    keep: NDArray[np.bool_],
    knots: FloatArray,
    widths: FloatArray,
    area: FloatArray,
    pressure: FloatArray,
) -> tuple[FloatArray, FloatArray, FloatArray]:
    m = nodes.x.size
    near = np.zeros(m, dtype=np.bool_)
    for knot, width in zip(knots, widths, strict=False):
        low = int(np.searchsorted(nodes.x, knot - 2.0 * width)) - NEIGHBOURHOOD
        high = int(np.searchsorted(nodes.x, knot + 2.0 * width)) + NEIGHBOURHOOD
        near[max(low, 0) : high] = True
    near &= keep & (nodes.count > 1)
    budget = ROWS_PER_KNEE * max(knots.size, 1)
    chosen = np.flatnonzero(near)
    if chosen.size == 0:
        return nodes.x[keep], nodes.pressure[keep], nodes.sigma[keep]
    parts = max(2, budget // chosen.size)
    pieces = np.minimum(nodes.count[chosen], parts).astype(np.int64)
    part = np.arange(int(pieces.sum())) - np.repeat(np.cumsum(pieces) - pieces, pieces)
    first, count = (
        np.repeat(v.astype(np.int64), pieces) for v in (nodes.first[chosen], nodes.count[chosen])
    )
    shares = np.repeat(pieces, pieces)
    a = first + part * count // shares
    b = first + (part + 1) * count // shares
    counts = (b - a).astype(np.float64)
    # sums of rows by running totals: a and b need not be contiguous between nodes
    low, high = int(a.min()), int(b.max())
    total_area = np.concatenate([[0.0], np.cumsum(area[low:high])])
    total_pressure = np.concatenate([[0.0], np.cumsum(pressure[low:high])])
    mean_area = (total_area[b - low] - total_area[a - low]) / counts
    mean_pressure = (total_pressure[b - low] - total_pressure[a - low]) / counts
    far = keep & ~near
    floor = np.sqrt(np.maximum(nodes.sigma**2 - nodes.noise**2 / nodes.count, 0.0))
    per_part = np.repeat(floor[chosen], pieces)
    x = np.concatenate([nodes.x[far], -np.log(mean_area)])
    y = np.concatenate([nodes.pressure[far], mean_pressure])
    s = np.concatenate([nodes.sigma[far], np.sqrt(nodes.noise**2 / counts + per_part**2)])
    order = np.argsort(x, kind="stable")
    return x[order], y[order], s[order]
