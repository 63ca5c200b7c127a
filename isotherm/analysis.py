"""The one way from a trace to its result."""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm import features
from isotherm.branch_view import BranchView
from isotherm.branches import BranchRows, find_branches, steady_area
from isotherm.condense import DENSE, Nodes, condense, despike, row_noise
from isotherm.errors import UpstrokeError
from isotherm.knee_model import KneeModel
from isotherm.knees import find_knees, refine_knees
from isotherm.modulus import LocalFit, local_regression
from isotherm.molecular_area import NM2_PER_CM2
from isotherm.phases import Reading, read_stretches
from isotherm.result import Branch, Curve, IsothermResult
from isotherm.sparse_fit import read_sparse
from isotherm.tangent import limiting_area
from isotherm.trace import Trace
from isotherm.zero import Zero, find_zero

__all__ = ["DEFAULT_PRESSURES", "FEWEST_ROWS", "analyse"]

FloatArray = NDArray[np.float64]

DEFAULT_PRESSURES: Final = (10.0, 20.0, 30.0, 40.0)  # mN/m
FEWEST_ROWS: Final = 8  # rows a branch needs
FLAT_SIGMAS: Final = 2.0  # a start counts as flat while its modulus is within this many u of FLAT
FLAT: Final = 0.5  # mN/m
LEAST_FALL: Final = (
    1.0  # mN/m; a smaller fall is a level pressure (a probe may drift by a third of it)
)
FALL_SIGMAS: Final = 4.0
COLLAPSED_NODES: Final = 6  # nodes it goes beyond it at least
COLLAPSED_WIDTHS: Final = 8.0  # widths of the collapse's rounding that the final fit goes beyond it


def analyse(trace: Trace, *, at: tuple[float, ...] = DEFAULT_PRESSURES) -> IsothermResult:
    """Analyse every branch of a run.

    Parameters
    ----------
    trace : Trace
        Area per molecule nm^2 and pressure mN/m, (n,) each.
    at : pressures, mN/m, to report area and modulus at.

    Returns
    -------
    IsothermResult

    Raises
    ------
    UpstrokeError
        Where no branch has enough rows, or area or pressure never changes.
    """
    path = trace.source.path
    if trace.area.size < FEWEST_ROWS:
        raise UpstrokeError(
            f"{trace.area.size} usable rows; an isotherm needs at least {FEWEST_ROWS}",
            where=path,
            remedy="export the whole run",
        )
    for values, name in ((trace.area, "area"), (trace.pressure, "pressure")):
        if float(np.ptp(values)) <= 0:
            raise UpstrokeError(
                f"the {name} never changes ({values[0]:g})",
                where=path,
                remedy="check which column is which, or export a run with moving barriers",
            )
    warnings = list(trace.warnings)
    branches = []
    for rows in find_branches(trace):
        if rows.rows.size < FEWEST_ROWS:
            warnings.append(
                f"a {rows.direction} of only {rows.rows.size} rows was left out "
                f"(at least {FEWEST_ROWS} are needed)"
            )
            continue
        branches.append(_branch(trace, rows, at))
    if not branches:
        raise UpstrokeError(
            "no compression or expansion with enough rows",
            where=path,
            remedy=f"a branch needs at least {FEWEST_ROWS} rows with a moving barrier",
        )
    molecules = None
    if trace.trough_area is not None:
        molecules = float(np.median(trace.trough_area / trace.area)) * NM2_PER_CM2
    return IsothermResult(
        trace.source,
        tuple(branches),
        tuple(warnings),
        trace.title,
        {"at": list(at)},
        trace.area_relative_u,
        trace.pressure_u,
        molecules,
        trace.kelvin,
    )


def _branch(trace: Trace, rows: BranchRows, at: tuple[float, ...]) -> Branch:
    order = rows.rows if rows.direction == "compression" else rows.rows[::-1]
    area, pressure = steady_area(trace.area[order]), trace.pressure[order]
    warnings: list[str] = []
    noise = row_noise(area, pressure)
    spikes = despike(area, pressure, noise)
    n_spikes = int(spikes.sum())
    if n_spikes:
        warnings.append(f"{n_spikes} isolated spike(s) in pressure left out")
        order, area, pressure = order[~spikes], area[~spikes], pressure[~spikes]
    if rows.paused:
        warnings.append(f"{rows.paused} rows left out while the barrier stood still")
    nodes = condense(area, pressure, noise)
    read = read_sparse(nodes) if nodes.x.size < DENSE else None
    if read is not None:
        nodes = replace(nodes, sigma=read.sigma)
    model = find_knees(nodes, read)
    reading = read_stretches(model)
    stop = _fit_until(model, reading, nodes)
    model = refine_knees(model, nodes, area, pressure, stop)
    reading = read_stretches(model)
    warnings.extend(reading.notes)
    local = local_regression(nodes.x, nodes.pressure, nodes.sigma, _stretch_bounds(nodes, model))
    if reading.collapse is not None:
        reading = replace(reading, falls=_falls(nodes, local, float(model.knots[reading.collapse])))
    zero = _zero(nodes, model, reading, local, rows.direction)
    warnings.extend(zero.warnings)
    view = BranchView(
        nodes, model, reading, local, zero.offset, trace.area_relative_u, trace.pressure_u
    )
    limiting = limiting_area(view)
    lift_off = None
    if reading.lift_off is not None:
        lift_off = features.knee_point(view, reading.lift_off).area
    elif zero.offset.u_random is not None:
        lift_off = features.gradual_lift_off(view)
    collapse = features.collapse(view) if rows.direction == "compression" else None
    trough = None
    if trace.trough_area is not None:
        trough = nodes.area * float(np.median(trace.trough_area / trace.area))
    time = None
    if trace.time is not None:
        time = (float(trace.time[rows.rows[0]]), float(trace.time[rows.rows[-1]]))
    return Branch(
        rows.direction,
        rows.cycle,
        int(order.size),
        zero.offset,
        noise,
        lift_off,
        features.phases(view),
        features.transitions(view),
        collapse,
        features.highest_pressure(view),
        limiting[0] if limiting else None,
        features.modulus_max(view),
        tuple(features.area_at(view, p) for p in at),
        Curve(
            nodes.area,
            local.pressure - zero.offset.value,
            local.u_pressure,
            local.modulus,
            local.u_modulus,
            trough,
            _potential(trace, order, nodes),
        ),
        limiting[1] if limiting else None,
        time,
        tuple(warnings),
    )


def _fit_until(model: KneeModel, reading: Reading, nodes: Nodes) -> float:
    """x up to which the final fit goes: collapsed film has no shape worth fitting beyond its first."""
    if reading.collapse is None:
        return model.stop
    knee = reading.collapse
    before = float(model.knots[knee]) - (float(model.knots[knee - 1]) if knee else model.start)
    stop = float(model.knots[knee]) + max(
        COLLAPSED_WIDTHS * float(model.widths[knee]), 0.3 * before
    )
    after = int(np.searchsorted(nodes.x, float(model.knots[knee]))) + COLLAPSED_NODES
    stop = max(stop, float(nodes.x[min(after, nodes.x.size - 1)]))
    for k in range(knee + 1, model.knots.size):
        start, knot = float(model.knots[k - 1]), float(model.knots[k])
        edge = knot - min(2.0 * float(model.widths[k]), 0.5 * (knot - start))
        begin, end, at = (int(np.searchsorted(nodes.x, value)) for value in (start, edge, knot))
        if end - begin >= COLLAPSED_NODES:
            return min(stop, edge)
        # too near to be cut off (a peak that falls at once): it is fitted too, with what follows it
        stop = max(stop, float(nodes.x[min(at + COLLAPSED_NODES, nodes.x.size - 1)]))
    return stop


def _falls(nodes: Nodes, local: LocalFit, knee: float) -> bool:
    """Whether the smoothed pressure falls after the collapse: beyond noise, and beyond what drifts."""
    at = int(np.clip(np.searchsorted(nodes.x, knee), 1, nodes.x.size - 1))
    peak = float(np.max(local.pressure[:at]))
    after = int(np.argmin(local.pressure[at:])) + at
    fall = peak - float(local.pressure[after])
    return fall > max(LEAST_FALL, FALL_SIGMAS * float(local.u_pressure[after]))


def _stretch_bounds(nodes: Nodes, model: KneeModel) -> NDArray[np.int64]:
    cuts = np.searchsorted(nodes.x, model.knots)
    return np.unique(np.concatenate([[0], cuts, [nodes.x.size]])).astype(np.int64)


def _zero(
    nodes: Nodes, model: KneeModel, reading: Reading, local: LocalFit, direction: str
) -> Zero:
    end: float | None = None
    if reading.baseline:
        if model.knots.size:
            end = float(model.knots[0] - 3.0 * model.widths[0])
            end = max(end, float(0.5 * (model.start + model.knots[0])))
        else:
            end = model.stop
    else:
        flat = local.modulus <= FLAT + FLAT_SIGMAS * local.u_modulus
        run = nodes.x.size if flat.all() else int(np.argmin(flat))
        if run >= 5 and np.ptp(local.pressure[:run]) < 0.5 + 2.0 * nodes.noise:
            end = float(nodes.x[run - 1])
    zero = find_zero(nodes, end)
    if direction == "expansion":
        return replace(zero, warnings=())
    return zero


def _potential(trace: Trace, order: NDArray[np.int64], nodes: Nodes) -> FloatArray | None:
    if trace.potential is None:
        return None
    values = trace.potential[order]
    known = np.isfinite(values)  # a row without it still has area and pressure
    totals = np.concatenate([[0.0], np.cumsum(np.where(known, values, 0.0))])
    counts = np.concatenate([[0], np.cumsum(known)])
    stops = nodes.first + nodes.count.astype(np.int64)
    count = counts[stops] - counts[nodes.first]
    total = totals[stops] - totals[nodes.first]
    return np.where(count > 0, total / np.maximum(count, 1), np.nan)
