"""Draw every hold of a record: the drifting quantity, the law behind it, and what the law leaves over."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from isotherm.figures_style import ACCENT, BAND_SHADED, FAINT, INK, SECOND, plain, style
from isotherm.hold_average import level_curve
from isotherm.hold_result import Hold, HoldResult
from isotherm.quantity import Quantity
from isotherm.series_figure import blank_figure, note, tidy

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["figure_hold"]

_HOUR: Final = 3600.0
_MOST: Final = 6  # holds on one page; the table has them all
_COLUMNS: Final = 3
_RIVAL_DASH: Final = (0, (5, 2))


def percent(loss: Quantity) -> str:
    """Relative loss as text in per cent."""
    u = None if loss.u is None else 100.0 * loss.u
    return f"{Quantity(100.0 * loss.value, u, '1')} %"


def _title(hold: Hold) -> str:
    if hold.kind == "isobaric":
        return f"{hold.number}: at {hold.pressure.value:.1f} mN m$^{{-1}}$"
    return f"{hold.number}: at constant area, from {hold.pressure.value:.1f} mN m$^{{-1}}$"


def _draw(hold: Hold, area_unit: str, top: Axes, bottom: Axes) -> None:
    """One hold: level with laws above, residuals below."""
    hours = hold.blocks.time / _HOUR
    end = hold.duration_s / _HOUR
    fits = {fit.name: fit for fit in hold.fits}
    chosen = fits[hold.chosen]
    rival = next((law for law in hold.laws if law.name != hold.chosen), None)
    fine = np.linspace(0.0, hold.duration_s, 400)
    top.plot(hours, hold.blocks.level, ".", color=FAINT, markersize=4, label="recorded (means)")
    top.plot(fine / _HOUR, level_curve(chosen, fine), color=INK, label=hold.chosen)
    if rival is not None:
        more = f"{rival.delta - hold.chosen_law.delta:+.1f}".replace("-", "−")
        label = f"{rival.name}, ΔAICc = {more}"
        top.plot(
            fine / _HOUR,
            level_curve(fits[rival.name], fine),
            color=ACCENT,
            linestyle=_RIVAL_DASH,
            linewidth=1.2,
            label=label,
        )
    residual = hold.blocks.level - level_curve(chosen, hold.blocks.time)
    bottom.axhspan(-2.0 * hold.noise, 2.0 * hold.noise, color=BAND_SHADED, linewidth=0)
    bottom.axhline(0.0, color=INK, linewidth=0.8)
    bottom.plot(hours, residual, ".", color=SECOND, markersize=3)
    if hold.settling_s > 0:
        for panel in (top, bottom):
            panel.axvspan(
                0.0,
                hold.settling_s / _HOUR,
                facecolor="none",
                edgecolor=FAINT,
                hatch="////",
                linewidth=0,
            )
    isobaric = hold.kind == "isobaric"
    unit = area_unit.replace("^2", "$^2$") if isobaric else "mN m$^{-1}$"
    symbol = "area $A$" if isobaric else r"pressure $\Pi$"
    tidy(top, "", f"{symbol} / {unit}", _title(hold))
    reach = 1.15 * max(2.0 * hold.noise, float(np.abs(residual).max()))
    bottom.set_ylim(-reach, 1.9 * reach)  # room for the remark above the data
    note(bottom, "shaded: ± 2 standard deviations", top=True)
    tidy(bottom, "time since arrival / h", f"residual / {unit}")
    top.set_xlim(0.0, end)
    for panel in (top, bottom):
        panel.ticklabel_format(axis="y", useOffset=False)
    low, high = top.get_ylim()
    # room for the legend above the data and the remark below it
    top.set_ylim(low - 0.25 * (high - low), high + 0.42 * (high - low))
    top.legend(frameon=False, fontsize=8, loc="upper right")
    loss = hold.loss_planned if hold.loss_planned is not None else hold.loss_hold
    span = hold.planned_time if hold.planned_time is not None else hold.duration_s
    text = f"loss over {span / _HOUR:.3g} h: {percent(loss)}"
    if hold.settling_s > 0:
        text += f"\nhatched: settling, {hold.settling_s:.0f} s, left out"
    note(top, text)


def figure_hold(result: HoldResult) -> Figure:
    """Draw the holds of a record.

    Parameters
    ----------
    result : HoldResult
        From `analyse_hold`.

    Returns
    -------
    Figure
        A pair of panels for each hold (six at most): block means with the chosen law and its nearest rival,
        and the residuals about the chosen law with a band of two standard deviations.
    """
    shown = result.holds[:_MOST]
    count = max(len(shown), 1)
    columns = min(count, _COLUMNS)
    rows = -(-count // columns)
    with style():
        figure = blank_figure(max(5.6, 4.2 * columns), 5.0 * rows)
        panels = figure.subplots(
            2 * rows, columns, sharex="none", squeeze=False, height_ratios=[3.0, 1.3] * rows
        )
        for i in range(rows * columns):
            top, bottom = (
                panels[2 * (i // columns)][i % columns],
                panels[2 * (i // columns) + 1][i % columns],
            )
            if i < len(shown):
                _draw(shown[i], result.area_unit, top, bottom)
                bottom.sharex(top)
                top.tick_params(labelbottom=False)
            else:
                top.set_axis_off()
                bottom.set_axis_off()
        title = plain(result.title) or "Film stability"
        if len(result.holds) > _MOST:
            title += f" (first {_MOST} of {len(result.holds)} holds)"
        figure.suptitle(title, x=0.01, ha="left", fontsize=11)
    return figure
