"""Repeated compression and expansion: work, hysteresis, and how far the isotherm has moved."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import BranchRows, find_branches, robust_noise
from isotherm.cycles_result import (
    ENERGY_UNIT,
    AreaShift,
    BranchCurve,
    BranchWork,
    Cycle,
    CyclesResult,
)
from isotherm.cycles_shift import area_shifts
from isotherm.errors import UpstrokeError
from isotherm.hold_blocks import spikes
from isotherm.quantity import Quantity
from isotherm.straight_line import straight_line
from isotherm.trace import Trace

if TYPE_CHECKING:
    from isotherm.check_result import CheckResult

__all__ = ["CyclesResult", "analyse_cycles"]

FloatArray = NDArray[np.float64]

_BLOCKS = 512
_FEWEST_ROWS = 12
# The largest areas of the first compression, if flat, read the zero (methods as for an isotherm).
_ZERO_PART = 0.05
_LARGEST_ZERO = 1.0  # mN/m; more is a probe that was not zeroed, or film already compressed
_SIGMAS = 3.0
_HOUR = 3600.0


def _curve(trace: Trace, branch: BranchRows, zero: float) -> BranchCurve:
    """Condense a branch to block means, largest area first."""
    area, pressure = trace.area[branch.rows], trace.pressure[branch.rows] - zero
    good = ~spikes(pressure)
    area, pressure = area[good], pressure[good]
    if branch.direction == "expansion":
        area, pressure = area[::-1], pressure[::-1]
    edges = np.unique(np.linspace(0, area.size, min(area.size, _BLOCKS) + 1).astype(np.int64))
    counts = np.diff(edges)
    means = [np.add.reduceat(values, edges[:-1]) / counts for values in (area, pressure)]
    order = np.argsort(-means[0], kind="stable")  # the area's own jitter may swap neighbours
    # white noise averages down within a block; what the blocks still show is what is correlated
    noise = max(robust_noise(pressure) / np.sqrt(float(counts.mean())), robust_noise(means[1]))
    return BranchCurve(means[0][order], means[1][order], noise)


def _integral(curve: BranchCurve, low: float, high: float) -> Quantity:
    """Integral of pressure over area between two areas, mN/m nm^2, with its random u.

    Trapezoids over the block means; beyond the outermost block's middle the pressure is that block's.
    u: independent noise of the blocks, each weighted by the area it stands for.
    """
    area, pressure = curve.area[::-1], curve.pressure[::-1]
    inside = (area > low) & (area < high)
    ends = np.interp([low, high], area, pressure)
    x = np.concatenate([[low], area[inside], [high]])
    y = np.concatenate([[ends[0]], pressure[inside], [ends[1]]])
    weight = np.zeros_like(x)
    steps = np.diff(x)
    weight[:-1] += 0.5 * steps
    weight[1:] += 0.5 * steps
    u = curve.noise * float(np.sqrt((weight**2).sum()))
    return Quantity(float(weight @ y), u, ENERGY_UNIT)


def _work(trace: Trace, branch: BranchRows, curve: BranchCurve, zero_u: float) -> BranchWork:
    area = trace.area[branch.rows]
    low, high = float(area.min()), float(area.max())
    found = _integral(curve, low, high)
    scale = (trace.area_relative_u or 0.0) * abs(found.value)
    offset = float(np.hypot(zero_u, trace.pressure_u or 0.0)) * (high - low)
    work = Quantity.combine(
        found.value, ENERGY_UNIT, u_random=found.u, u_systematic=float(np.hypot(scale, offset))
    )
    return BranchWork(
        branch.direction,
        branch.cycle,
        work,
        (high, low) if branch.direction == "compression" else (low, high),
        float(curve.pressure.max()),
        curve,
    )


def _cycle(
    trace: Trace, number: int, down: BranchWork, up: BranchWork | None, lag: float, drift_u: float
) -> Cycle:
    """Pair a compression with its expansion; an offset of the probe cancels, its drift does not."""
    if up is None:
        return Cycle(number, down, None, None, None, None)
    low, high = max(min(down.area), min(up.area)), min(max(down.area), max(up.area))
    if high <= low:
        return Cycle(number, down, up, None, None, None)
    first, second = _integral(down.curve, low, high), _integral(up.curve, low, high)
    difference = first.value - second.value
    random = float(np.hypot(first.u or 0.0, second.u or 0.0))
    relative = trace.area_relative_u or 0.0
    drift = drift_u * lag / _HOUR * (high - low)
    systematic = float(np.hypot(relative * abs(difference), drift))
    hysteresis = Quantity.combine(difference, ENERGY_UNIT, u_random=random, u_systematic=systematic)
    part = None
    if first.value > 0:
        # both works share their areas' scale, which cancels in the ratio
        ratio = difference / first.value
        u = float(np.hypot((1.0 - ratio) * (first.u or 0.0), second.u or 0.0)) / first.value
        part = Quantity.combine(ratio, "1", u_random=u, u_systematic=drift / first.value)
    return Cycle(number, down, up, hysteresis, part, (high, low))


def _zero(trace: Trace, first: BranchRows, warnings: list[str]) -> Quantity:
    """Zero of pressure from the largest areas of the first compression, where they are flat."""
    rows = first.rows if first.direction == "compression" else first.rows[::-1]
    area = trace.area[rows]
    reach = float(area.max()) - _ZERO_PART * float(np.ptp(area))
    pressure = trace.pressure[rows[area >= reach]]
    none = Quantity(0.0, None, "mN/m")
    if pressure.size < _FEWEST_ROWS:
        warnings.append("zero not subtracted: too few rows at the largest areas")
        return none
    x = np.linspace(-0.5, 0.5, pressure.size)
    slope, level = straight_line(x, pressure)
    parts = np.array([part.mean() for part in np.array_split(pressure - slope * x, 6)])
    # block means hold the noise that is correlated from row to row
    u = max(
        float(parts.std(ddof=2)) / np.sqrt(6.0), robust_noise(pressure) / np.sqrt(pressure.size)
    )
    if abs(slope) > _SIGMAS * u * np.sqrt(12.0) or abs(level) > _LARGEST_ZERO:
        warnings.append(
            f"zero not subtracted: the largest areas read {level:.2f} mN/m and are not a flat zero"
        )
        return none
    return Quantity(float(level), u, "mN/m")


def _paired(
    trace: Trace, branches: list[tuple[BranchRows, BranchWork]], drift_u: float
) -> list[Cycle]:
    """Every compression with the expansion that follows it."""
    cycles: list[Cycle] = []
    for i, (rows, work) in enumerate(branches):
        if work.direction != "compression":
            continue
        following = branches[i + 1] if i + 1 < len(branches) else None
        up = following if following and following[1].direction == "expansion" else None
        lag = 0.0
        if up is not None and trace.time is not None:
            lag = abs(float(np.mean(trace.time[up[0].rows]) - np.mean(trace.time[rows.rows])))
        cycles.append(_cycle(trace, len(cycles) + 1, work, up[1] if up else None, lag, drift_u))
    return cycles


def analyse_cycles(
    trace: Trace,
    *,
    at: tuple[float, ...] = (10.0, 20.0, 30.0),
    check: CheckResult | None = None,
) -> CyclesResult:
    """Work, hysteresis and area shift of every cycle of a run.

    Parameters
    ----------
    trace : Trace
        Compressions and expansions of one film.
    at : tuple of float
        Pressures at which the area is followed from cycle to cycle, mN/m.
    check : CheckResult, optional
        Zero and drift of the probe: the zero is subtracted, the drift's u carried into the hysteresis.

    Returns
    -------
    CyclesResult

    Raises
    ------
    UpstrokeError
        When the run has no compression.

    Notes
    -----
    Work done on the film by a compression is the integral of Pi dA over the areas it passes, per molecule;
    the loop's integral is the energy the film does not give back (Gaines, Insoluble Monolayers at
    Liquid-Gas Interfaces, Interscience 1966, ch. 4; chapter from memory).
    """
    warnings = list(trace.warnings)
    found = [branch for branch in find_branches(trace) if branch.rows.size >= _FEWEST_ROWS]
    compressions = [branch for branch in found if branch.direction == "compression"]
    if not compressions:
        raise UpstrokeError(
            "no compression found",
            where=trace.source.path,
            remedy="give a run in which the film is compressed and expanded",
        )
    if check is not None and check.zero_offset is not None:
        zero = check.zero_offset
    else:
        zero = _zero(trace, compressions[0], warnings)
    drift_u = 0.0
    if check is not None and check.drift_rate is not None:
        drift_u = float(np.hypot(check.drift_rate.value, check.drift_rate.u or 0.0))
    branches = [
        (branch, _work(trace, branch, _curve(trace, branch, zero.value), zero.u or 0.0))
        for branch in found
    ]
    cycles = _paired(trace, branches, drift_u)
    shifts: list[AreaShift] = []
    for direction in ("compression", "expansion"):
        works = [
            (cycle.number, work)
            for cycle in cycles
            for work in (cycle.compression if direction == "compression" else cycle.expansion,)
            if work is not None
        ]
        for pressure in at:
            shifts += area_shifts(
                works,
                pressure,
                trace.area_relative_u,
                float(np.hypot(zero.u or 0, trace.pressure_u or 0)),
            )
    if all(cycle.expansion is None for cycle in cycles):
        warnings.append("no expansion follows a compression: work only, no hysteresis")
    missing = [p for p in at if not any(shift.pressure == p for shift in shifts)]
    if missing:
        listed = ", ".join(f"{p:g}" for p in missing)
        warnings.append(f"no branch passes {listed} mN/m")
    return CyclesResult(
        source=trace.source,
        cycles=tuple(cycles),
        shifts=tuple(shifts),
        zero_offset=zero,
        title=trace.title,
        settings={"at": list(at), "check": check.path if check is not None else None},
        warnings=tuple(warnings),
    )
