"""Numbers read off a fitted branch: knees, limiting area, modulus, areas at pressures."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branch_view import BranchView
from isotherm.phases import phase_name
from isotherm.quantity import Quantity
from isotherm.result import AreaAt, Collapse, MaxModulus, Phase, Point, Transition

__all__ = [
    "area_at",
    "collapse",
    "gradual_lift_off",
    "highest_pressure",
    "knee_point",
    "modulus_max",
    "phases",
    "transitions",
]

FloatArray = NDArray[np.float64]

CORNER_SHARE: Final = 0.15  # standard uncertainty of a knee's pressure, of the corner cut off
PEAK_CUT: Final = 1.0  # mN/m that a probe's rounding may cut off a sharp peak, as an u (our choice)
LIFT_OFF_SIGMAS: Final = 3.0  # a gradual lift-off: pressure above zero by this many σ of one row


def knee_point(view: BranchView, knee: int) -> Point:
    """Area and pressure of a knee: where its two neighbours meet when extended."""
    model = view.model
    index = model.coefficients.size + knee
    u_x = math.sqrt(max(float(model.covariance[index, index]), 0.0))
    if model.knot_doubt is not None:
        u_x = math.hypot(u_x, float(model.knot_doubt[knee]))
    value, gradient = model.knee_pressure(knee)
    variance = float(gradient @ model.covariance @ gradient)
    # the corner that a rounding cuts off is about |step| × width high; so much of it is convention
    corner = CORNER_SHARE * abs(model.slope_step(knee)[0]) * float(model.widths[knee])
    return Point(
        view.area(float(model.knots[knee]), u_x),
        view.pressure(value, math.hypot(math.sqrt(max(variance, 0.0)), corner)),
    )


def transitions(view: BranchView) -> tuple[Transition, ...]:
    """Coexistences and kinks, in the order of compression."""
    reading = view.reading
    found: list[tuple[int, Transition]] = []
    for onset, end in reading.coexistences:
        found.append(
            (
                onset,
                Transition(
                    "coexistence",
                    onset=knee_point(view, onset),
                    end=None if end is None else knee_point(view, end),
                ),
            )
        )
    for kink in reading.kinks:
        found.append((kink, Transition("kink", at=knee_point(view, kink))))
    return tuple(transition for _, transition in sorted(found, key=lambda pair: pair[0]))


def collapse(view: BranchView) -> Collapse | None:
    """The collapse, or None where it was not reached."""
    knee = view.reading.collapse
    if knee is None:
        return None
    point = knee_point(view, knee)
    if not view.reading.falls:
        return Collapse("constant-pressure", point.area, point.pressure)
    return Collapse("constant-area", point.area, _peak(point.pressure, highest_pressure(view)))


def _peak(met: Quantity, seen: Quantity) -> Quantity:
    """Pressure of a peak: where its extended sides meet, and the highest seen, by their weights.

    A sharp peak is told by few rows, and its sides then extend anywhere; the highest pressure seen bounds it
    from below. Where the sides are well known they decide.
    """
    if not met.u_random or not math.isfinite(met.value + met.u_random):
        return met
    weight, other = met.u_random**-2.0, PEAK_CUT**-2.0
    value = (weight * met.value + other * seen.value) / (weight + other)
    return Quantity.combine(
        value, met.unit, u_random=(weight + other) ** -0.5, u_systematic=met.u_systematic
    )


def gradual_lift_off(view: BranchView) -> Quantity | None:
    """Area where the smoothed pressure first stays above zero by `LIFT_OFF_SIGMAS` of one row."""
    local, nodes = view.local, view.nodes
    level = view.offset + LIFT_OFF_SIGMAS * max(nodes.noise, 1e-9)
    above = local.pressure > level
    if above.all() or not above.any():
        return None
    below = np.flatnonzero(~above)
    peak = int(np.argmax(local.pressure))
    below = below[below < peak]
    if below.size == 0:
        return None
    i = int(below[-1])
    low, high = float(local.pressure[i]), float(local.pressure[i + 1])
    share = (level - low) / max(high - low, 1e-12)
    x = float(nodes.x[i] + share * (nodes.x[i + 1] - nodes.x[i]))
    slope = max(float(local.modulus[i : i + 2].mean()), 1e-6)
    u_x = math.hypot(float(local.u_pressure[i]), view.zero.u_random or 0.0) / slope
    step = float(nodes.x[i + 1] - nodes.x[i])
    return view.area(x, math.hypot(min(u_x, 1.0), step / math.sqrt(12.0)))


def phases(view: BranchView) -> tuple[Phase, ...]:
    """The stretches with their names, coexistences whole, in the order of compression."""
    reading, model = view.reading, view.model
    groups: list[tuple[int, int, str]] = []
    inside = {}
    for onset, end in reading.coexistences:
        stop = len(reading.stretches) - 1 if end is None else end
        for j in range(onset + 1, stop + 1):
            inside[j] = onset
    n = len(reading.stretches)
    j = 0
    while j < n:
        stop = j
        if j in inside:
            while stop + 1 < n and inside.get(stop + 1) == inside[j]:
                stop += 1
            name = "coexistence"
        elif reading.collapse is not None and j > reading.collapse:
            stop, name = n - 1, "collapsed"
        elif j == 0 and reading.baseline:
            name = "gaseous"
        else:
            name = ""
        groups.append((j, stop, name))
        j = stop + 1
    out = []
    for first, stop, name in groups:
        start_x, stop_x = reading.stretches[first].start, reading.stretches[stop].stop
        ends = []
        for knee, x in ((first - 1, start_x), (stop, stop_x)):
            if 0 <= knee < model.knots.size:
                value, gradient = model.knee_pressure(knee)
                ends.append(
                    (value, math.sqrt(max(float(gradient @ model.covariance @ gradient), 0.0)))
                )
            else:
                i = 0 if knee < 0 else -1
                value = float(model.pressure(np.array([x]))[0])
                ends.append((value, float(view.local.u_pressure[i])))
        modulus, u = _mean_modulus(view, start_x, stop_x, ends[1][0] - ends[0][0])
        out.append(
            Phase(
                name or phase_name(modulus),
                (math.exp(-start_x), math.exp(-stop_x)),
                (ends[0][0] - view.offset, ends[1][0] - view.offset),
                Quantity.combine(modulus, "mN/m", u_random=u, u_systematic=None),
            )
        )
    return tuple(out)


def _mean_modulus(view: BranchView, start: float, stop: float, rise: float) -> tuple[float, float]:
    """Slope of Π on x over the nodes from start to stop, mN/m, and its u; the end points' if too few."""
    nodes = view.nodes
    inside = (nodes.x >= start) & (nodes.x <= stop)
    count = int(inside.sum())
    if count < 3:
        length = max(stop - start, 1e-12)
        return rise / length, math.sqrt(2.0) * float(np.max(nodes.sigma)) / length
    x, y, w = nodes.x[inside], nodes.pressure[inside], 1.0 / nodes.sigma[inside] ** 2
    total = float(w.sum())
    centre = float((w * x).sum()) / total
    spread = float((w * (x - centre) ** 2).sum())
    if not spread > 0:  # areas too close to tell apart
        length = max(stop - start, 1e-12)
        return rise / length, math.sqrt(2.0) * float(np.max(nodes.sigma)) / length
    slope = float((w * (x - centre) * y).sum()) / spread
    residual = y - float((w * y).sum()) / total - slope * (x - centre)
    scale = max(1.0, float((w * residual**2).sum()) / (count - 2))
    return slope, math.sqrt(scale / spread)


def modulus_max(view: BranchView) -> MaxModulus | None:
    """The largest local modulus, judged at its lower one-u bound so that noise does not choose it."""
    local, nodes, reading = view.local, view.nodes, view.reading
    start = reading.stretches[1 if reading.baseline and len(reading.stretches) > 1 else 0].start
    stop = reading.stretches[reading.last].stop
    inside = (nodes.x >= start) & (nodes.x <= stop) & np.isfinite(local.u_modulus)
    if not inside.any():
        return None
    bound = np.where(inside, local.modulus - local.u_modulus, -np.inf)
    i = int(np.argmax(bound))
    if local.modulus[i] <= 0:
        return None
    modulus = Quantity.combine(
        float(local.modulus[i]), "mN/m", u_random=float(local.u_modulus[i]), u_systematic=None
    )
    return MaxModulus(
        modulus,
        view.pressure(float(local.pressure[i]), float(local.u_pressure[i])),
        view.area(float(nodes.x[i]), 0.0),
    )


def highest_pressure(view: BranchView) -> Quantity:
    """The largest smoothed pressure of the branch, its very end included."""
    local, nodes = view.local, view.nodes
    i = int(np.argmax(local.pressure))
    value, u = float(local.pressure[i]), float(local.u_pressure[i])
    if i == nodes.x.size - 1 and math.isfinite(float(local.u_modulus[i])):
        # a trace that stops while rising is highest at its last row, half a node further on
        rest = max(nodes.stop - float(nodes.x[i]), 0.0)
        value += max(float(local.modulus[i]), 0.0) * rest
        u = math.hypot(u, float(local.u_modulus[i]) * rest)
    return view.pressure(value, u)


def area_at(view: BranchView, pressure: float) -> AreaAt:
    """Area and modulus where the branch first reaches `pressure` (mN/m) for good, before collapse."""
    local, nodes, reading = view.local, view.nodes, view.reading
    stop = reading.stretches[reading.last].stop
    last = max(int(np.searchsorted(nodes.x, stop, side="right")), 2)
    level = local.pressure[:last] - view.offset
    peak = int(np.argmax(level))
    below = np.flatnonzero(level[: peak + 1] < pressure)
    if pressure > level[peak] or below.size == 0:
        return AreaAt(pressure, None, None)
    i = int(below[-1])
    share = (pressure - level[i]) / max(level[i + 1] - level[i], 1e-12)
    x = float(nodes.x[i] + share * (nodes.x[i + 1] - nodes.x[i]))
    near = slice(i, i + 2)
    modulus = float((1 - share) * local.modulus[i] + share * local.modulus[i + 1])
    u_modulus = float(np.max(local.u_modulus[near]))
    u_pressure = math.hypot(float(np.max(local.u_pressure[near])), view.zero.u_random or 0.0)
    systematic = math.hypot(view.zero.u_systematic or 0.0, view.pressure_u or 0.0)
    stiff = max(modulus, 1e-3)
    return AreaAt(
        pressure,
        view.area(x, u_pressure / stiff, systematic / stiff),
        Quantity.combine(
            modulus,
            "mN/m",
            u_random=u_modulus if math.isfinite(u_modulus) else None,
            u_systematic=None,
        ),
    )
