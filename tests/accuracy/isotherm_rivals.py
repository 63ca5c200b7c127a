"""Two yardsticks: the script people write first, and a fit told where every knee is.

`argmax_script` is the derivative-and-argmax reading of an isotherm. `told_fit` is local least squares
on the stretches either side of each true knee: roughly what noise, offset and drift allow.
Both return a `Branch`, so that they are marked by the same rules.
"""

from __future__ import annotations

import numpy as np
from isotherm_truth import FloatArray, Truth
from scipy.signal import savgol_filter

from isotherm.quantity import Quantity
from isotherm.result import AreaAt, Branch, Collapse, Curve, Point, Transition
from isotherm.trace import Trace

__all__ = ["argmax_script", "told_fit"]

WANTED = (10.0, 20.0, 30.0)


def _q(value: float, unit: str) -> Quantity:
    return Quantity(float(value), None, unit)


def _p(area: float, pressure: float) -> Point:
    return Point(_q(area, "nm^2"), _q(pressure, "mN/m"))


def _branch(
    offset: float,
    lift_off: float | None,
    transitions: list[Transition],
    collapse: Collapse | None,
    highest: float,
    limiting: float | None,
    areas: dict[float, float | None],
) -> Branch:
    nothing = np.zeros(0)
    return Branch(
        direction="compression",
        cycle=1,
        rows=0,
        zero_offset=_q(offset, "mN/m"),
        noise=0.0,
        lift_off=None if lift_off is None else _q(lift_off, "nm^2"),
        phases=(),
        transitions=tuple(transitions),
        collapse=collapse,
        highest_pressure=_q(highest, "mN/m"),
        limiting_area=None if limiting is None else _q(limiting, "nm^2"),
        modulus_max=None,
        area_at=tuple(
            AreaAt(p, None if a is None else _q(a, "nm^2"), None) for p, a in areas.items()
        ),
        curve=Curve(nothing, nothing, nothing, nothing, nothing),
    )


def _first_compression(trace: Trace) -> tuple[FloatArray, FloatArray]:
    """Rows from the largest area down to the first turn, largest area first."""
    area, pressure = trace.area, trace.pressure
    if trace.time is None and area[0] < area[-1]:
        area, pressure = area[::-1], pressure[::-1]
    turn = int(np.argmin(area)) + 1
    return area[:turn], pressure[:turn]


def argmax_script(trace: Trace) -> Branch:
    """Savitzky-Golay derivative, then argmax and argmin of what it gives."""
    area, pressure = _first_compression(trace)
    n = area.size
    grid = np.linspace(area.max(), area.min(), min(n, 2000))
    order = np.argsort(area, kind="stable")
    level = np.interp(grid, area[order], pressure[order])
    window = max(5, (grid.size // 40) | 1)
    smooth = savgol_filter(level, window, 2)
    step = grid[1] - grid[0]
    slope = savgol_filter(level, window, 2, deriv=1, delta=step)
    bend = savgol_filter(level, window, 2, deriv=2, delta=step)
    modulus = -grid * slope
    top = int(np.argmax(smooth))
    collapse = None
    if top < grid.size - window // 2 - 1:
        falls = smooth[top] - smooth[-1] > 1.0
        kind = "constant-area" if falls else "constant-pressure"
        collapse = Collapse(kind, _q(grid[top], "nm^2"), _q(smooth[top], "mN/m"))
    foot = int(np.argmax(smooth > 1.0))
    transitions = []
    inner = slice(foot, max(top - window, foot + 3))
    low = inner.start + int(np.argmin(modulus[inner]))
    if inner.start + 3 < low < inner.stop - 3 and modulus[low] < 12.5:
        onset = foot + int(np.argmin(bend[foot:low]))
        end = low + int(np.argmax(bend[low : inner.stop]))
        transitions.append(
            Transition(
                "coexistence",
                onset=_p(grid[onset], smooth[onset]),
                end=_p(grid[end], smooth[end]),
            )
        )
    stiff = int(np.argmax(modulus[: top + 1]))
    limiting = grid[stiff] - smooth[stiff] / slope[stiff]
    rising = np.maximum.accumulate(smooth[: top + 1])
    areas: dict[float, float | None] = {
        p: float(np.interp(p, rising, grid[: top + 1])) if rising[-1] >= p else None for p in WANTED
    }
    lift = float(grid[int(np.argmax(bend[: top + 1]))])
    return _branch(0.0, lift, transitions, collapse, float(smooth[top]), float(limiting), areas)


def _beside(
    area: FloatArray, pressure: FloatArray, knee: float, far: float
) -> np.polynomial.Polynomial | None:
    """A cubic (few rows: a parabola) beside `knee`, its rounding and the spikes left out."""
    reach = far - knee
    way = (area - knee) / reach
    for share in (0.45, 0.9):
        inside = (way > 0.07) & (way < share)
        if inside.sum() >= 12:
            break
    else:
        return None
    a, p = area[inside], pressure[inside]
    degree = 3 if a.size > 60 else 2
    fit = np.polynomial.Polynomial.fit(a, p, degree)
    for _ in range(2):
        rest = np.abs(p - fit(a))
        keep = rest < 4 * 1.4826 * np.median(rest) + 1e-9
        fit = np.polynomial.Polynomial.fit(a[keep], p[keep], degree)
    return fit


def told_fit(trace: Trace, truth: Truth) -> Branch:
    """Fit a quadratic to each true stretch and cross neighbours; areas from the nearest stretch."""
    area, pressure = _first_compression(trace)
    offset = 0.0
    if truth.knees and truth.foot < area[0]:
        base = pressure[area > truth.knees[0] + 0.2 * (area[0] - truth.knees[0])]
        offset = float(np.median(base)) if base.size else 0.0
    pressure = pressure - offset
    edges = [float(area[0]), *truth.knees, float(area[-1])]

    def cross(knee: float) -> Point:
        i = edges.index(knee)
        one = _beside(area, pressure, knee, edges[i - 1])
        two = _beside(area, pressure, knee, edges[i + 1])
        if i == 1 and truth.foot < area[0]:  # the gas side is the zero already taken off
            one = np.polynomial.Polynomial([0.0])
        if one is None or two is None:
            return _p(knee, float(np.interp(knee, area[::-1], pressure[::-1])))
        reach = 0.3 * min(edges[i - 1] - knee, knee - edges[i + 1])
        near = np.linspace(knee + reach, knee - reach, 4001)
        gap = one(near) - two(near)
        turns = np.flatnonzero(np.sign(gap[1:]) != np.sign(gap[:-1]))
        at = turns[np.argmin(np.abs(near[turns] - knee))] if turns.size else np.argmin(np.abs(gap))
        return _p(float(near[at]), float(one(near[at])))

    transitions = []
    for true in truth.transitions:
        if true.kind == "kink" and true.at is not None:
            transitions.append(Transition("kink", at=cross(true.at.area)))
        elif true.onset is not None and true.end is not None:
            transitions.append(
                Transition("coexistence", onset=cross(true.onset.area), end=cross(true.end.area))
            )
    collapse = None
    if truth.collapse is not None:
        point = cross(truth.collapse.area)
        collapse = Collapse(truth.collapse.kind, point.area, point.pressure)
    lift_off = None if truth.lift_off is None else cross(truth.lift_off).area.value
    limiting = None
    if truth.limiting_area is not None:
        last = len(edges) - (3 if truth.collapse is not None else 2)
        high, low = edges[last], edges[last + 1]
        inside = (area < high) & (area > low)
        line = np.polynomial.Polynomial.fit(area[inside], pressure[inside], 1)
        limiting = float(line.roots()[0])
    areas: dict[float, float | None] = {}
    for level, place in truth.area_at.items():
        reach = 0.02 * place
        near = np.abs(area - place) < reach
        fit = np.polynomial.Polynomial.fit(area[near], pressure[near] - level, 2)
        roots = np.asarray([r.real for r in fit.roots() if np.isreal(r)], dtype=np.float64)
        areas[level] = float(roots[np.argmin(np.abs(roots - place))]) if roots.size else None
    return _branch(offset, lift_off, transitions, collapse, float(pressure.max()), limiting, areas)
