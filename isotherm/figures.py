"""The isotherm drawn: pressure above, modulus below, every number tied to its mark."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from isotherm.figures_modulus import draw_modulus, scale_modulus
from isotherm.figures_rail import RailLabel, foot_rail, side_rail
from isotherm.figures_style import (
    ACCENT,
    BAND_LIGHT,
    BAND_SHADED,
    FAINT,
    INK,
    RUN_COLOURS,
    RUN_DASHES,
    SECOND,
    plain,
    style,
)
from isotherm.quantity import COVERAGE_FACTOR, Quantity, format_quantity
from isotherm.result import Branch, IsothermResult, Point

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["isotherm_figure"]

PAPER = (7.6, 7.2)  # inches: the width of a text block on A4
MOST_LABELS = 24  # names of runs that can be read beside the axes
PLOT_WIDTH = 0.625  # of the paper; the rest holds axis labels and the side rail


def isotherm_figure(*results: IsothermResult) -> Figure:
    """Draw one isotherm with everything found on it, or several side by side without the details.

    Parameters
    ----------
    results : IsothermResult
        One or more; areas nm^2, pressures and moduli mN/m.

    Returns
    -------
    Figure
        Axes 0 holds the isotherm, axes 1 the modulus against the same areas.
    """
    with style():
        from matplotlib.figure import Figure as NewFigure

        figure = NewFigure(figsize=PAPER)
        upper = figure.add_axes((0.08, 0.445, PLOT_WIDTH, 0.465))
        lower = figure.add_axes((0.08, 0.125, PLOT_WIDTH, 0.255), sharex=upper)
        if len(results) == 1:
            _draw_one(results[0], upper, lower)
        else:
            _draw_several(results, upper, lower)
        upper.set_ylabel("surface pressure Π (mN/m)")
        upper.tick_params(labelbottom=False)
        lower.set_xlabel("area per molecule A (nm²)")
        lower.set_ylabel("modulus −A dΠ/dA (mN/m)")
        return figure


def _set_limits(axes: Axes, results: tuple[IsothermResult, ...]) -> None:
    """Frame the branches; a long gas tail is cut so that the knees have room."""
    areas = np.concatenate([b.curve.area for r in results for b in r.branches])
    tops = np.concatenate([b.curve.pressure for r in results for b in r.branches])
    left, right = float(areas.min()), float(areas.max())
    rises = [b.lift_off.value for r in results for b in r.branches if b.lift_off is not None]
    if rises:
        right = min(right, max(rises) + 0.6 * (max(rises) - left))
    room = 0.03 * (right - left)
    axes.set_xlim(left - room, right + room)
    high, low = float(tops.max()), float(tops.min())
    axes.set_ylim(min(0.0, low) - 0.02 * (high - low), high + 0.06 * (high - low))


def _draw_one(result: IsothermResult, upper: Axes, lower: Axes) -> None:
    branch = result.headline
    _set_limits(upper, (result,))
    _shade_phases(branch, upper, lower)
    _draw_branches(result, upper)
    _draw_tangent(branch, upper)
    labels = _mark_transitions(branch, upper) + _mark_end(branch, upper)
    side_rail(upper, labels)
    foot_rail(upper, _mark_baseline(branch, upper), drop=18.0)
    draw_modulus(result, lower)
    upper.set_title(plain(result.title or result.source.path), pad=22)
    upper.legend(
        loc="lower left", bbox_to_anchor=(-0.02, 1.0), ncols=3, frameon=False, fontsize=7.5,
        handlelength=2.6, columnspacing=1.4, borderpad=0.2,
    )  # fmt: skip
    lower.text(
        0.0, -0.265,
        "Bars show U = 2u (k = 2, about 95 %): thick the random part, thin with the part common to "
        "the run.\nBands alternate from phase to phase, a hatched one is a coexistence; dotted lines are "
        "customary bounds of the modulus.",
        transform=lower.transAxes, fontsize=7, va="top", color=INK,
    )  # fmt: skip


def _shade_phases(branch: Branch, upper: Axes, lower: Axes) -> None:
    spans = {(t.onset.area.value, t.end.area.value) for t in branch.transitions
             if t.onset is not None and t.end is not None}  # fmt: skip
    for number, phase in enumerate(branch.phases):
        ends = (min(phase.area), max(phase.area))
        middle = (ends[0] + ends[1]) / 2
        mixed = any(min(s) < middle < max(s) for s in spans)
        for axes in (upper, lower):
            axes.axvspan(
                *ends,
                facecolor="white" if mixed else (BAND_LIGHT, BAND_SHADED)[number % 2],
                edgecolor=FAINT if mixed else "none",
                hatch="////" if mixed else None,
                alpha=0.55 if mixed else 1.0,
                linewidth=0.0,
                zorder=0.5,
            )


def _draw_branches(result: IsothermResult, axes: Axes) -> None:
    """Draw all branches; only the first of each kind gets a line in the legend."""
    head = result.headline
    told: set[str] = set()
    for branch in result.branches:
        squeeze = branch.direction == "compression"
        kind = (
            f"{head.direction} {head.cycle}, analysed here"
            if branch is head
            else ("other compressions" if squeeze else "expansions")
        )
        axes.plot(
            branch.curve.area,
            branch.curve.pressure,
            color=INK if branch is head else SECOND,
            linestyle="-" if branch is head else (RUN_DASHES[2] if squeeze else RUN_DASHES[1]),
            linewidth=1.7 if branch is head else 1.1,
            label="_" if kind in told else kind,
            zorder=3 if branch is head else 2.5,
        )
        told.add(kind)


def _draw_tangent(branch: Branch, axes: Axes) -> None:
    if branch.tangent is None or branch.limiting_area is None:
        return
    foot = branch.limiting_area.value
    top = 0.93 * axes.get_ylim()[1]
    reach = (top - branch.tangent.intercept) / branch.tangent.slope
    axes.plot(
        [foot, reach], [0.0, top], color=ACCENT, linestyle=(0, (5, 2)), linewidth=1.0,
        label="tangent to the stiffest phase", zorder=2.8,
    )  # fmt: skip


def _bars(axes: Axes, point: Point, *, marker: str) -> None:
    """Mark a point with its two uncertainties, each split into random and whole."""
    x, y = point.area.value, point.pressure.value
    for part, width in ((None, 0.9), ("random", 2.6)):
        axes.errorbar(
            x, y, xerr=_reach(point.area, part), yerr=_reach(point.pressure, part),
            fmt="none", ecolor=ACCENT, elinewidth=width, capsize=0, zorder=4,
        )  # fmt: skip
    axes.plot(
        [x], [y], marker=marker, markersize=6.0, markerfacecolor="white", markeredgecolor=ACCENT,
        markeredgewidth=1.3, linestyle="none", zorder=4.5,
    )  # fmt: skip


def _reach(quantity: Quantity, part: str | None) -> float:
    u = quantity.u if part is None else quantity.u_random
    return 0.0 if u is None or not np.isfinite(u) else COVERAGE_FACTOR * u


def _point_label(name: str, point: Point) -> RailLabel:
    return RailLabel(
        point.area.value,
        point.pressure.value,
        (
            name,
            f"A {format_quantity(point.area)} nm²",
            f"Π {format_quantity(point.pressure)} mN/m",
        ),
    )


def _mark_transitions(branch: Branch, axes: Axes) -> list[RailLabel]:
    labels = []
    for transition in branch.transitions:
        for name, point, marker in (
            ("kink", transition.at, "D"),
            ("coexistence onset", transition.onset, "o"),
            ("coexistence end", transition.end, "s"),
        ):
            if point is not None:
                _bars(axes, point, marker=marker)
                labels.append(_point_label(name, point))
    return labels


def _mark_end(branch: Branch, axes: Axes) -> list[RailLabel]:
    if branch.collapse is not None:
        point = Point(branch.collapse.area, branch.collapse.pressure)
        _bars(axes, point, marker="X")
        return [_point_label(f"collapse, {branch.collapse.kind}", point)]
    if branch.direction != "compression":
        return []
    top = int(np.argmax(branch.curve.pressure))
    x, y = float(branch.curve.area[top]), branch.highest_pressure.value
    axes.plot([x], [y], marker="^", markersize=6, color=ACCENT, linestyle="none", zorder=4.5)
    text = f"Π ≥ {format_quantity(branch.highest_pressure)} mN/m"
    return [RailLabel(x, y, ("collapse not reached", text))]


def _mark_baseline(branch: Branch, axes: Axes) -> list[RailLabel]:
    """Mark lift-off and limiting area on the line of zero pressure."""
    labels = []
    for name, area, marker in (
        ("limiting area", branch.limiting_area, "v"),
        ("lift-off area", branch.lift_off, "P"),
    ):
        if area is not None:
            zero = Point(area, Quantity(0.0, None, "mN/m"))
            _bars(axes, zero, marker=marker)
            labels.append(RailLabel(area.value, 0.0, (name, f"{format_quantity(area)} nm²")))
    return labels


def _draw_several(results: tuple[IsothermResult, ...], upper: Axes, lower: Axes) -> None:
    _set_limits(upper, results)
    labels = []
    for number, result in enumerate(results):
        curve = result.headline.curve
        colour = RUN_COLOURS[number % len(RUN_COLOURS)]
        dash = RUN_DASHES[number % len(RUN_DASHES)]
        upper.plot(curve.area, curve.pressure, color=colour, linestyle=dash, zorder=3)
        lower.plot(curve.area, curve.modulus, color=colour, linestyle=dash, zorder=3)
        top = int(np.argmax(curve.pressure))
        name = f"{number + 1}  {result.title or result.source.path}"
        labels.append(
            RailLabel(
                float(curve.area[top]),
                float(curve.pressure[top]),
                (plain(name[:34]),),
                colour,
                dash,
            )
        )
        upper.plot(
            [curve.area[top]], [curve.pressure[top]], marker="o", markersize=4, color=colour,
            zorder=4,
        )  # fmt: skip
    if len(labels) <= MOST_LABELS:
        side_rail(upper, labels)
    scale_modulus(lower, max(float(np.nanmax(r.headline.curve.modulus)) for r in results))
    upper.set_title(f"{len(results)} isotherms, first compression of each", pad=10)
