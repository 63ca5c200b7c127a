"""Draw a check: every record of the bare surface with its fit, and every item against its limit."""

from __future__ import annotations

from pathlib import PurePath
from typing import TYPE_CHECKING, Final

from isotherm.check_result import CheckCurve, CheckItem, CheckResult
from isotherm.figures_style import ACCENT, BAND_SHADED, FAINT, INK, SECOND, plain, style
from isotherm.series_figure import PRESSURE_LABEL, blank_figure, note, tidy

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["figure_check"]

_HOUR: Final = 3600.0
_MOST: Final = 4  # records drawn
_SCALE: Final = 2.0  # the items' axis ends at this many limits; beyond it an arrow
_LOOK: Final = {"pass": ("o", SECOND), "fail": ("X", ACCENT), "undecided": ("D", INK)}


def _record(curve: CheckCurve, axes: Axes) -> None:
    if curve.area is not None:
        x, label = curve.area, f"area $A$ / {curve.area_unit.replace('^2', '$^2$')}"
    elif curve.timed:
        x, label = curve.time / _HOUR, "time / h"
    else:
        x, label = curve.time, "row"
    axes.plot(x, curve.pressure, ".", color=FAINT, markersize=4, label="recorded (means)")
    axes.plot(x, curve.fitted, color=INK, label="fit")
    if curve.hinge is not None:
        u = 2.0 * (curve.hinge.u or 0.0)
        axes.axvspan(
            curve.hinge.value - u, curve.hinge.value + u, color=ACCENT, alpha=0.2, linewidth=0
        )
        axes.axvline(
            curve.hinge.value, color=ACCENT, linestyle=(0, (5, 2)), label="rise begins (± 2 u)"
        )
    tidy(axes, label, PRESSURE_LABEL, plain(PurePath(curve.record).name))
    low, high = axes.get_ylim()
    axes.set_ylim(low, high + 0.4 * (high - low))
    axes.legend(framealpha=0.9, edgecolor="none", fontsize=8, loc="upper right")


def _items(items: list[CheckItem], axes: Axes) -> None:
    """Every item as a share of its limit, with bars of 2 u; the band is what is allowed."""
    axes.axvspan(-1.0, 1.0, color=BAND_SHADED, linewidth=0)
    for edge in (-1.0, 1.0):
        axes.axvline(edge, color=INK, linewidth=0.8)
    axes.axvline(0.0, color=FAINT, linewidth=0.8)
    labels = []
    for row, item in enumerate(items):
        limit = item.limit or 1.0
        share, u = item.value.value / limit, 2.0 * (item.value.u or 0.0) / limit
        mark, colour = _LOOK.get(item.verdict, ("o", FAINT))
        if abs(share) > _SCALE:
            mark, share, u = (">" if share > 0 else "<"), _SCALE * (1 if share > 0 else -1), 0.0
        axes.errorbar(share, row, xerr=u or None, fmt=mark, color=colour, capsize=3, markersize=7)
        found = str(item.value).replace("-", "−")
        labels.append(f"{item.name}\n{found}: {item.verdict}")
    axes.set_yticks(range(len(items)), labels)
    axes.set_ylim(len(items) - 0.4, -0.6)
    axes.set_xlim(-1.15 * _SCALE, 1.15 * _SCALE)
    tidy(axes, "found / limit (bars ± 2 u)", "", "Items; shaded: allowed")
    axes.grid(False)


def figure_check(result: CheckResult) -> Figure:
    """Draw records of the bare surface above and the verdicts below."""
    curves = result.curves[:_MOST]
    items = [item for item in result.items if item.limit is not None]
    with style():
        height = 0.55 * max(len(items), 1) + 1.0
        figure = blank_figure(
            max(6.6, 3.6 * max(len(curves), 1)), height + (3.0 if curves else 0.0)
        )
        columns = max(len(curves), 1)
        ratios = [3.0, height] if curves else [height]
        grid = figure.add_gridspec(len(ratios), columns, height_ratios=ratios)
        for i, curve in enumerate(curves):
            _record(curve, figure.add_subplot(grid[0, i]))
        below = figure.add_subplot(grid[-1, :])
        _items(items, below)
        if not items:
            note(below, "no item has a limit")
        figure.suptitle(
            f"{plain(result.title) or 'Before the film'}: {result.verdict}",
            x=0.01,
            ha="left",
            fontsize=11,
        )
    return figure
