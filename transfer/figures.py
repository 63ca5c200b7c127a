"""One sheet for a build: the log with its strokes, the ratios, the profile along the substrate, the stack."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from isotherm.figures_style import ACCENT, BAND_SHADED, FAINT, INK, SECOND, plain, style
from isotherm.quantity import COVERAGE_FACTOR
from transfer.figures_stack import draw_stack

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from transfer.result import Stroke, TransferResult

__all__ = ["transfer_figure"]

_HOUR: Final = 3600.0  # s
# Up and down are told apart by the way the mark points, by its filling and by colour.
_MARKS: Final = {"down": ("v", INK, INK), "up": ("^", "white", ACCENT)}
_MANY: Final = 12  # strokes from which single profiles give way to their median and range


def transfer_figure(result: TransferResult) -> Figure:
    """Draw a dipping log's result on one sheet.

    Parameters
    ----------
    result : TransferResult

    Returns
    -------
    Figure
        Four parts: area and immersion against time with every stroke marked; ratio of every stroke with
        its expanded uncertainty and limits; ratio along the substrate; the stack to scale.
    """
    from matplotlib.figure import Figure

    with style():
        figure = Figure(figsize=(8.2, 10.4))
        grid = figure.add_gridspec(
            3,
            2,
            height_ratios=[1.75, 1.35, 1.5],
            left=0.095,
            right=0.965,
            top=0.94,
            bottom=0.085,
            hspace=0.36,
            wspace=0.28,
        )
        log = grid[0, :].subgridspec(2, 1, height_ratios=[1.4, 1.0], hspace=0.12)
        area = figure.add_subplot(log[0])
        dipper = figure.add_subplot(log[1], sharex=area)
        ratios = figure.add_subplot(grid[1, :])
        along = figure.add_subplot(grid[2, 0])
        stack = figure.add_subplot(grid[2, 1])
        figure.suptitle(plain(result.title) or "Dipping log", x=0.095, ha="left", fontsize=11)
        _draw_log(area, dipper, result)
        _draw_ratios(ratios, result)
        _draw_profile(along, result)
        draw_stack(stack, result)
        figure.text(
            0.095,
            0.018,
            "Bars and bands: U = 2u (k = 2, about 95 %). Down: filled, pointing down, or shaded; "
            "up: open, pointing up, or unshaded.\nGrey: no held film (renewal, set-point change, lost "
            "control), nothing there is a stroke.",
            fontsize=7.5,
        )
    return figure


def _draw_log(area: Axes, dipper: Axes, result: TransferResult) -> None:
    trace = result.trace
    unit, name = (_HOUR, "h") if np.ptp(trace.time) > 2 * _HOUR else (60.0, "min")
    origin = float(trace.time[0])
    time = (trace.time - origin) / unit
    area.plot(time, trace.area, color=INK, lw=1.0)
    area.set_ylabel("film area $A_t$ (cm²)")
    area.tick_params(labelbottom=False)
    depth = _immersion(result)
    dipper.plot(time, depth, color=SECOND, lw=1.0)
    dipper.axhline(0.0, color=FAINT, lw=0.8)
    dipper.set_ylabel("immersion (mm)")
    dipper.invert_yaxis()
    dipper.set_xlabel(f"time ({name})")
    for axes in (area, dipper):
        axes.margins(x=0.01)
        for item in result.interruptions:
            axes.axvspan(
                (item.from_s - origin) / unit,
                (item.to_s - origin) / unit,
                color=FAINT,
                alpha=0.35,
                lw=0,
            )
        for stroke in result.strokes:
            axes.axvspan(
                (stroke.start_s - origin) / unit,
                (stroke.end_s - origin) / unit,
                facecolor=BAND_SHADED if stroke.direction == "down" else "white",
                edgecolor=FAINT,
                lw=0.4,
                zorder=0,
            )
    every = max(1, -(-len(result.strokes) // 24))
    for stroke in result.strokes[::every]:
        middle = (0.5 * (stroke.start_s + stroke.end_s) - origin) / unit
        area.annotate(
            str(stroke.number),
            (middle, 1.0),
            xycoords=("data", "axes fraction"),
            xytext=(0, 2),
            textcoords="offset points",
            ha="center",
            fontsize=7,
        )


def _immersion(result: TransferResult) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    """Depth of the lower edge under the surface, mm, from the dipper's reading."""
    sign = 1.0 if result.contact.reads == "depth" else -1.0
    at = result.contact.at.value if result.contact.at is not None else 0.0
    return sign * (result.trace.position - at)


def _draw_ratios(axes: Axes, result: TransferResult) -> None:
    from matplotlib.ticker import MaxNLocator

    low, high = result.limits
    axes.axhspan(low, high, color=BAND_SHADED, lw=0, zorder=0)
    for edge in (low, high):
        axes.axhline(edge, color=FAINT, lw=0.8, ls="--")
    judged = [s for s in result.strokes if s.ratio is not None]
    for direction, (mark, face, edge_colour) in _MARKS.items():
        own = [s for s in judged if s.direction == direction]
        if not own:
            continue
        axes.errorbar(
            [s.number for s in own],
            [s.ratio.value for s in own if s.ratio is not None],
            yerr=[COVERAGE_FACTOR * (s.ratio.u or 0.0) for s in own if s.ratio is not None],
            fmt=mark,
            ms=6,
            mfc=face,
            mec=edge_colour,
            ecolor=edge_colour,
            elinewidth=1.0,
            lw=0,
            label=f"{direction}-stroke",
        )
    for change in result.drift.changes:
        axes.axvline(change + 0.5, color=ACCENT, lw=1.2, ls=":")
        axes.annotate(
            f"changes after stroke {change}",
            (change + 0.5, 0.03),
            xycoords=("data", "axes fraction"),
            xytext=(4, 0),
            textcoords="offset points",
            fontsize=8,
            color=ACCENT,
        )
    unjudged = [s for s in result.strokes if s.ratio is None]
    if unjudged:
        axes.plot(
            [s.number for s in unjudged],
            [0.04] * len(unjudged),
            "x",
            color=FAINT,
            transform=axes.get_xaxis_transform(),
            label="not judged",
        )
    values = [s.ratio.value for s in judged if s.ratio is not None]
    if values:
        bottom, top = min([*values, low]), max([*values, high])
        room = max(0.12 * (top - bottom), 0.02)
        axes.set_ylim(bottom - 2 * room, top + 2.6 * room)
    axes.set_xlim(0.4, max((s.number for s in result.strokes), default=1) + 0.6)
    axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    axes.set_xlabel("stroke")
    axes.set_ylabel("transfer ratio")
    axes.annotate(
        f"limits {low:g} to {high:g}",
        (1.0, high),
        xycoords=("axes fraction", "data"),
        xytext=(-3, 3),
        textcoords="offset points",
        ha="right",
        fontsize=8,
        color=INK,
    )
    if judged or unjudged:
        axes.legend(loc="upper left", ncols=3, fontsize=8, frameon=False)


def _draw_profile(axes: Axes, result: TransferResult) -> None:
    axes.set_xlabel("local transfer ratio (line: median, band: range)")
    axes.set_ylabel("height above the lower edge (mm)")
    strokes = [s for s in result.strokes if s.profile and s.counted]
    axes.axvline(1.0, color=FAINT, lw=0.8)
    if len(strokes) <= _MANY:
        axes.set_xlabel("local transfer ratio, a line a stroke")
    if not strokes:
        axes.text(0.5, 0.5, "no profile", transform=axes.transAxes, ha="center")
        return
    for direction in ("down", "up"):
        own = [s for s in strokes if s.direction == direction]
        if len(strokes) > _MANY:
            _draw_range(axes, own, direction)
        else:
            for stroke in own:
                _draw_steps(axes, stroke, direction)
    worst = min(strokes, key=lambda s: min(w.ratio.value for w in s.profile))
    _draw_steps(axes, worst, worst.direction, label=f"lowest, {worst.number}")
    low = min(w.ratio.value - 2 * (w.ratio.u or 0.0) for w in worst.profile)
    axes.set_xlim(min(low, 0.85) - 0.03, 1.2)
    axes.legend(
        loc="upper center", bbox_to_anchor=(0.5, 1.14), ncols=3, fontsize=7.5, frameon=False
    )


def _draw_steps(axes: Axes, stroke: Stroke, direction: str, label: str = "") -> None:
    heights = [h for w in stroke.profile for h in (w.from_mm, w.to_mm)]
    values = [w.ratio.value for w in stroke.profile for _ in range(2)]
    axes.plot(
        values,
        heights,
        color=ACCENT if label else (INK if direction == "down" else SECOND),
        lw=1.6 if label else 0.8,
        ls=":" if label else ("-" if direction == "down" else "--"),
        label=label or None,
    )
    if label:
        axes.errorbar(
            [w.ratio.value for w in stroke.profile],
            [0.5 * (w.from_mm + w.to_mm) for w in stroke.profile],
            xerr=[COVERAGE_FACTOR * (w.ratio.u or 0.0) for w in stroke.profile],
            fmt="none",
            ecolor=ACCENT,
            elinewidth=1.0,
        )


def _draw_range(axes: Axes, strokes: list[Stroke], direction: str) -> None:
    if not strokes:
        return
    top = max(w.to_mm for s in strokes for w in s.profile)
    heights = (np.arange(60) + 0.5) * top / 60
    table = np.full((len(strokes), heights.size), np.nan)
    for row, stroke in zip(table, strokes, strict=True):
        for window in stroke.profile:
            row[(heights >= window.from_mm) & (heights <= window.to_mm)] = window.ratio.value
    known = np.isfinite(table).any(axis=0)
    heights, table = heights[known], table[:, known]
    colour = INK if direction == "down" else SECOND
    axes.fill_betweenx(
        heights, np.nanmin(table, axis=0), np.nanmax(table, axis=0), color=colour, alpha=0.15, lw=0
    )
    axes.plot(
        np.nanmedian(table, axis=0),
        heights,
        color=colour,
        ls="-" if direction == "down" else "--",
        label=f"{direction}-strokes",
    )
