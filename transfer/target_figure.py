"""The choice drawn: isotherm, modulus and every rule's allowed band side by side on one pressure axis."""

from __future__ import annotations

import textwrap
from typing import TYPE_CHECKING

import numpy as np

from isotherm.figures_style import ACCENT, BAND_LIGHT, FAINT, INK, SECOND, plain, style
from isotherm.quantity import COVERAGE_FACTOR, format_quantity
from transfer.target_limits import GASEOUS_BELOW
from transfer.target_result import Limit, TargetResult

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["target_figure"]

_PAPER = (9.6, 6.6)  # inches; large type on it is read from a metre away
_BAR = 0.62  # width of a rule's bar, columns
_HEAD, _TEXT, _SMALL = 19.0, 10.5, 8.0
_NOTE_WIDTH = 78  # characters of a line of note: it stays left of the bars' names
_HELD = 0.02  # of the highest pressure: below it the zero's noise decides area and modulus
_WINDOW = "#fbe3cf"  # pale orange: told from the bars by lightness as well


def target_figure(result: TargetResult) -> Figure:
    """Draw what is allowed, what is not, and where to dip.

    Parameters
    ----------
    result : TargetResult

    Returns
    -------
    Figure
        Axes 0 the isotherm, axes 1 the modulus, axes 2 one bar for each rule; pressure (mN/m) runs up in all.
    """
    with style():
        from matplotlib.figure import Figure as NewFigure

        figure = NewFigure(figsize=_PAPER)
        left = figure.add_axes((0.075, 0.245, 0.275, 0.59))
        middle = figure.add_axes((0.385, 0.245, 0.14, 0.59), sharey=left)
        right = figure.add_axes((0.56, 0.245, 0.42, 0.59), sharey=left)
        top = float(result.drawing.pressure.max())
        left.set_ylim(min(0.0, -0.02 * top), 1.07 * top)
        for axes in (left, middle, right):
            _mark_choice(result, axes)
            axes.tick_params(labelsize=_TEXT - 1)
        _isotherm(result, left)
        _modulus(result, middle)
        _bars(result, right)
        _head(result, figure, left)
        _notes(result, figure)
        return figure


def _mark_choice(result: TargetResult, axes: Axes) -> None:
    for window in result.windows:
        chosen = window == result.window
        axes.axhspan(
            window.low, window.high, facecolor=_WINDOW if chosen else BAND_LIGHT, linewidth=0, zorder=0.5
        )  # fmt: skip
    if result.recommended is not None:
        axes.axhline(result.recommended.value, color=ACCENT, linewidth=2.6, zorder=4)


def _isotherm(result: TargetResult, axes: Axes) -> None:
    drawing = result.drawing
    axes.plot(drawing.area, drawing.pressure, color=INK, linewidth=2.2, zorder=3)
    axes.set_xlabel("area per molecule A (nm²)", fontsize=_TEXT)
    axes.set_ylabel("surface pressure Π (mN/m)", fontsize=_TEXT)
    held = drawing.pressure > _HELD * float(drawing.pressure.max())
    smallest = float(drawing.area.min())
    foot = float(drawing.area[held].max()) if held.any() else float(drawing.area.max())
    axes.set_xlim(smallest - 0.06 * (foot - smallest), foot + 0.25 * (foot - smallest))
    axes.axhline(drawing.end, color=INK, linewidth=0.9, linestyle=(0, (6, 2)), zorder=2)
    word = "collapse" if drawing.collapsed else "highest reached"
    axes.annotate(
        f"{word} {drawing.end:.1f}", (1.0, drawing.end), xycoords=("axes fraction", "data"),
        xytext=(-3, 3), textcoords="offset points", fontsize=_TEXT - 1, ha="right", va="bottom",
    )  # fmt: skip
    for limit in result.limits:
        if limit.rule in ("kink", "coexistence"):
            axes.axhspan(
                limit.at[0], limit.at[-1] if len(limit.at) > 1 else limit.at[0],
                facecolor=FAINT, alpha=0.45, edgecolor=INK, linewidth=1.4, zorder=1,
            )  # fmt: skip
            axes.annotate(
                _where(limit), (1.0, limit.at[-1]), xycoords=("axes fraction", "data"),
                xytext=(-3, 3), textcoords="offset points", fontsize=_TEXT - 1, ha="right",
                va="bottom",
            )  # fmt: skip


def _where(limit: Limit) -> str:
    """Kind and pressures of a transition, short."""
    return f"{limit.rule} {'–'.join(f'{value:.1f}' for value in limit.at)}"


def _modulus(result: TargetResult, axes: Axes) -> None:
    drawing = result.drawing
    pressure, value = drawing.axis_pressure, drawing.axis_modulus
    reach = COVERAGE_FACTOR * drawing.axis_u_modulus
    axes.fill_betweenx(
        pressure, value - reach, value + reach, facecolor=SECOND, alpha=0.3, linewidth=0, zorder=2
    )
    axes.plot(value, pressure, color=SECOND, linewidth=1.8, zorder=3)
    axes.axvline(GASEOUS_BELOW, color=INK, linewidth=0.8, linestyle=(0, (1, 1.5)), zorder=1)
    held = pressure > _HELD * float(pressure[-1])
    axes.set_xlim(0.0, 1.25 * float(np.max(value[held], initial=2.0 * GASEOUS_BELOW)))
    axes.set_xlabel("modulus\n−A dΠ/dA (mN/m)", fontsize=_TEXT)
    axes.tick_params(labelleft=False)


def _bars(result: TargetResult, axes: Axes) -> None:
    low, high = axes.get_ylim()
    chosen = None if result.recommended is None else result.recommended.value
    for column, limit in enumerate(result.limits):
        axes.bar(
            column, high - low, bottom=low, width=_BAR, facecolor="white", edgecolor=FAINT, hatch="////",
            linewidth=0.8, zorder=1.5,
        )  # fmt: skip
        for interval in limit.intervals:
            axes.bar(
                column, interval.high - interval.low, bottom=interval.low, width=_BAR,
                facecolor=INK if limit.binding else SECOND, linewidth=0, zorder=2,
            )  # fmt: skip
        if chosen is not None:
            _margin(axes, column, limit, chosen)
    axes.set_xlim(-0.6, len(result.limits) - 0.4)
    axes.set_xticks(
        range(len(result.limits)),
        [textwrap.fill(limit.label, 21) for limit in result.limits],
        rotation=90,
        fontsize=_TEXT - 1,
    )
    for text, limit in zip(axes.get_xticklabels(), result.limits, strict=True):
        text.set_fontweight("bold" if limit.binding else "normal")
    axes.tick_params(axis="x", length=0)
    axes.tick_params(axis="y", labelleft=False, left=False)
    axes.spines["left"].set_visible(False)


def _margin(axes: Axes, column: int, limit: Limit, chosen: float) -> None:
    """Arrow from the choice to the rule's nearest end, with its length."""
    if limit.margin is None or limit.margin.value <= 0 or limit.allowed is None:
        return
    margin = limit.margin.value
    up = abs(limit.allowed.high - chosen - margin) < abs(chosen - limit.allowed.low - margin)
    end = chosen + margin if up else chosen - margin
    axes.annotate(
        "", (column, end), xytext=(column, chosen), zorder=3,
        arrowprops={"arrowstyle": "-|>", "color": "white", "linewidth": 1.2, "shrinkA": 0, "shrinkB": 0},
    )  # fmt: skip
    axes.text(
        column, chosen + (1 if up else -1) * 0.42 * margin, f"{margin:.1f}", rotation=90,
        fontsize=_TEXT - 1, color="white", ha="center", va="center", zorder=3.5,
        bbox={"facecolor": INK if limit.binding else SECOND, "edgecolor": "none", "pad": 1.2},
    )  # fmt: skip


def _head(result: TargetResult, figure: Figure, axes: Axes) -> None:
    if result.recommended is None or result.window is None:
        words, colour = "No pressure obeys all limits", INK
    else:
        words = (
            f"Dip at {format_quantity(result.recommended)} mN/m"
            f"   (window {result.window.low:.1f} to {result.window.high:.1f})"
        )
        colour = ACCENT
        axes.annotate(
            f"{result.recommended.value:.1f}", (0.0, result.recommended.value),
            xycoords=("axes fraction", "data"), xytext=(5, 4), textcoords="offset points",
            fontsize=_HEAD - 3, fontweight="bold", color=ACCENT, zorder=5,
        )  # fmt: skip
    figure.text(0.02, 0.925, words, fontsize=_HEAD, fontweight="bold", color=colour)
    figure.text(0.02, 0.885, plain(result.title or result.source.path), fontsize=_TEXT)


def _notes(result: TargetResult, figure: Figure) -> None:
    if result.recommended is None and result.relaxations:
        first = f"Smallest relaxation: {result.relaxations[0].text}."
    else:
        first = f"Binding: {result.binding}."
    lines = [
        *textwrap.wrap(plain(first), _NOTE_WIDTH),
        *textwrap.wrap(
            "Bars: solid where a rule allows, hatched where it does not (its u, k\u00a0=\u00a02, already "
            "taken off); dark bars bind. Arrows: margin in mN/m to the rule's nearest end. ± is "
            "U\u00a0=\u00a02u.",
            _NOTE_WIDTH,
        ),
    ]
    figure.text(
        0.02, 0.02, "\n".join(lines), fontsize=_SMALL, va="bottom", color=INK, linespacing=1.3
    )
