"""Fit the knees of few points: their meaning told by the figure, their places by all points together."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import quantum
from isotherm.condense import Nodes
from isotherm.knee_fit import choose_degrees, fit_knees
from isotherm.knee_model import KneeModel
from isotherm.knee_uncertainty import with_model_doubt
from isotherm.sparse import SparseKnee, sparse_degrees, sparse_knees
from isotherm.sparse_pieces import Figure, Part, figure_of

__all__ = ["SparseRead", "read_sparse", "refine_sparse", "sparse_model"]

FloatArray = NDArray[np.float64]

WIDEST: Final = 0.12  # few points: a wide rounding and a curved stretch look the same
WIDTH: Final = 0.02  # first guess of a rounding, of the shorter neighbouring stretch
CLOSEST: Final = 1e-3  # share of the branch's range of ln A that two knees are apart at least
# How much a falling branch may bend between few points, of the pressure it covers (a standard uncertainty):
# a collapsing film falls steeply first, then ever less.
COLLAPSED_BEND: Final = 0.7
# An expanded branch bends into the onset between two points: known to this share of their distance.
ONSET_DOUBT: Final = 0.2
HELD: Final = 0.4
BOUND: Final = (
    10.0  # u: a point so far off is misread; nearer, a peak or a knee may rest on it alone
)
ROUNDS: Final = 2  # of choosing degrees


@dataclass(frozen=True)
class SparseRead:
    """Few points as a figure: with its reading errors, and cut into pieces."""

    figure: Figure
    parts: list[Part]

    @property
    def sigma(self) -> FloatArray:
        """(n,) uncertainty of the pressures, mN/m.

        An area misread by a hair is a pressure misread by much where the branch is steep.
        """
        return self.figure.s * self.figure.height


def read_sparse(nodes: Nodes) -> SparseRead:
    """Few points (`nodes`, one row each) as a person reads them off a figure."""
    floor = quantum(nodes.pressure) / float(np.sqrt(12.0))
    return SparseRead(*figure_of(nodes.area, nodes.pressure, floor))


def sparse_model(nodes: Nodes, read: SparseRead) -> KneeModel:
    """Knees of one branch of few points, fitted together, their roles told."""
    x, y, sigma = nodes.x, nodes.pressure, read.sigma
    figure, parts = read.figure, read.parts
    knees = _in_order(sparse_knees(figure, parts), x)
    knots = np.array([k.x for k in knees])
    knot_u = np.array([k.spread for k in knees])
    edges = np.diff(np.concatenate([[x[0]], knots, [x[-1]]]))
    widths = WIDTH * np.minimum(edges[:-1], edges[1:])
    highest = sparse_degrees(knees, x, y)
    degrees = choose_degrees(x, y, sigma, knots, widths, highest)
    model = fit_knees(
        x, y, sigma, knots, widths, degrees, widest=WIDEST, knot_u=knot_u, bound=BOUND
    )
    for _ in range(ROUNDS):
        again = choose_degrees(x, y, sigma, model.knots, model.widths, highest)
        if again == model.degrees:
            break
        model = fit_knees(
            x, y, sigma, knots, model.widths, again, widest=WIDEST, knot_u=knot_u, bound=BOUND
        )
    strayed = np.abs(model.knots - knots) > knot_u
    if strayed.any():
        # a knee belongs between the points that bound it: one that left them is held closer
        knot_u = np.where(strayed, HELD * knot_u, knot_u)
        model = fit_knees(
            x, y, sigma, knots, widths, model.degrees, widest=WIDEST, knot_u=knot_u, bound=BOUND
        )
    return replace(model, roles=tuple(k.role for k in knees))


def refine_sparse(model: KneeModel, nodes: Nodes, stop: float) -> KneeModel:
    """The model fitted again up to x = `stop`, with the uncertainty that its shapes leave open."""
    keep = nodes.x <= stop
    x, y, sigma = nodes.x[keep], nodes.pressure[keep], nodes.sigma[keep]
    k = int((model.knots < stop).sum())
    knots, degrees = model.knots[:k], model.degrees[: k + 1]
    precision = model.knot_precision
    knot_u = None if precision is None else precision[:k] ** -0.5
    fitted = fit_knees(
        x, y, sigma, knots, model.widths[:k], degrees, widest=WIDEST, knot_u=knot_u, bound=BOUND
    )
    roles = None if model.roles is None else model.roles[:k]
    bend = COLLAPSED_BEND if roles and roles[-1] == "collapse" else None
    told = with_model_doubt(fitted, x, y, sigma, last_bend=bend)
    doubt = told.knot_doubt
    if doubt is not None and roles and knot_u is not None:
        onsets = np.array([role == "onset" for role in roles])
        doubt = np.where(onsets, np.hypot(doubt, ONSET_DOUBT * knot_u), doubt)
    return replace(told, roles=roles, knot_doubt=doubt)


def _in_order(knees: list[SparseKnee], x: FloatArray) -> list[SparseKnee]:
    """Knees in order of x, inside the branch, none on top of another."""
    apart = CLOSEST * float(x[-1] - x[0])
    out: list[SparseKnee] = []
    for knee in sorted(knees, key=lambda k: k.x):
        last = out[-1].x if out else float(x[0])
        if knee.x - last > apart and float(x[-1]) - knee.x > apart:
            out.append(knee)
    return out
