"""Draw pressure, potential and effective dipole moment against area."""

from __future__ import annotations

from typing import TYPE_CHECKING

from isotherm.figures_style import ACCENT, INK, SECOND, style
from isotherm.potential_result import PotentialResult
from isotherm.series_figure import AREA_LABEL, blank_figure, tidy

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["figure_potential"]


def figure_potential(result: PotentialResult) -> Figure:
    """Three panels over one area axis; onset and lift-off drawn through all of them."""
    with style():
        figure = blank_figure(6.6, 7.4)
        top, middle, bottom = figure.subplots(3, 1, sharex=True)
        top.plot(result.area, result.pressure, color=INK)
        tidy(top, "", r"$\Pi$ / mN m$^{-1}$", "Pressure, potential and effective moment")
        middle.plot(result.area, result.potential, color=INK)
        tidy(middle, "", r"$\Delta V$ / mV")
        bottom.plot(result.area, result.moment, color=INK)
        bottom.fill_between(
            result.area,
            result.moment - 2.0 * result.u_moment,
            result.moment + 2.0 * result.u_moment,
            color=SECOND,
            alpha=0.3,
            linewidth=0,
            label="± 2 u of the noise",
        )
        for place in result.at:
            bottom.plot(place.area, place.moment.value, "o", color=SECOND, markersize=4)
        bottom.plot([], [], "o", color=SECOND, markersize=4, label="named places")
        tidy(bottom, AREA_LABEL, r"$\mu_\perp=\varepsilon_0 A\,\Delta V$ / mD")
        bottom.legend(frameon=False, fontsize=8)
        if result.onset is not None:
            area, u = result.onset.area.value, 2.0 * (result.onset.area.u_random or 0.0)
            for panel in (top, middle, bottom):
                panel.axvspan(area - u, area + u, color=ACCENT, alpha=0.2, linewidth=0)
                panel.axvline(area, color=ACCENT, linewidth=1)
            top.plot([], [], color=ACCENT, linewidth=1, label="onset of potential")
        if result.lift_off is not None:
            for panel in (top, middle, bottom):
                panel.axvline(
                    result.lift_off.value, color=SECOND, linewidth=1, linestyle=(0, (4, 2))
                )
            top.plot([], [], color=SECOND, linewidth=1, linestyle=(0, (4, 2)), label="lift-off")
        if result.onset is not None or result.lift_off is not None:
            top.legend(frameon=False, fontsize=8)
    return figure
