"""Draw the fluid branch with Volmer's fit, what is left of it, and the way to the gaseous limit."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import BOLTZMANN_MN_NM
from isotherm.figures_style import ACCENT, FAINT, INK, SECOND, style
from isotherm.fluid_result import FluidResult
from isotherm.quantity import format_quantity
from isotherm.series_figure import AREA_LABEL, PRESSURE_LABEL, blank_figure, note, tidy

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["figure_fluid"]

FloatArray = NDArray[np.float64]


def figure_fluid(result: FluidResult) -> Figure:
    """Upper left: the branch and the fit; below it the residuals; right: Π A / kT against Π."""
    with style():
        figure = blank_figure(9.0, 5.0)
        grid = figure.add_gridspec(2, 2, height_ratios=[2.4, 1.0])
        upper = figure.add_subplot(grid[0, 0])
        lower = figure.add_subplot(grid[1, 0], sharex=upper)
        right = figure.add_subplot(grid[:, 1])
        fit = result.best
        thermal = BOLTZMANN_MN_NM * result.kelvin
        omega, cohesion = fit.co_area.value, fit.cohesion.value
        model = thermal / (result.area - omega) - cohesion
        used = result.pressure <= fit.pressure[1]
        upper.plot(
            result.area, result.pressure, "o", color=FAINT, markersize=3, label="fluid branch"
        )
        upper.plot(
            result.area[used],
            model[used],
            color=ACCENT,
            linewidth=1.6,
            label=r"$kT/(A-\omega)-\Pi_\mathrm{coh}$",
        )
        if not used.all():
            upper.plot(
                result.area[~used],
                model[~used],
                color=ACCENT,
                linestyle=(0, (4, 2)),
                label="the same, beyond where it holds",
            )
        words = (
            rf"$\omega$ = {format_quantity(fit.co_area)} nm$^2$" + "\n"
            rf"$\Pi_\mathrm{{coh}}$ = {format_quantity(fit.cohesion)} mN m$^{{-1}}$"
            + "\n"
            + (f"holds to {fit.pressure[1]:.1f} mN/m" if fit.holds else "model does not hold")
        )
        upper.plot([], [], " ", label=words)
        tidy(upper, "", PRESSURE_LABEL, "Volmer's equation of state")
        upper.set_ylim(bottom=min(0.0, float(result.pressure.min())))
        upper.legend(frameon=False, fontsize=8)
        upper.tick_params(labelbottom=False)
        lower.axhline(0.0, color=ACCENT, linewidth=1)
        rest = result.pressure - model
        lower.plot(result.area[used], rest[used], "o", color=INK, markersize=2.5)
        lower.plot(
            result.area[~used],
            rest[~used],
            "o",
            color=FAINT,
            markersize=2.5,
            markerfacecolor="white",
        )
        if used.any():
            widest = max(4.0 * float(np.std(rest[used])), 1e-3)
            lower.set_ylim(-widest, widest)
        tidy(lower, AREA_LABEL, r"residual / mN m$^{-1}$")
        right.plot(
            result.pressure,
            result.pressure * result.area / thermal,
            "o",
            color=FAINT,
            markersize=3,
            label="fluid branch",
        )
        right.axhline(1.0, color=SECOND, linewidth=1, linestyle=(0, (4, 2)), label="ideal gas")
        fine = np.linspace(fit.pressure[0], fit.pressure[1], 201)
        curve = fine * (omega + thermal / (fine + cohesion)) / thermal
        right.plot(fine, curve, color=ACCENT, linewidth=1.6, label="fit")
        if result.gaseous is not None:
            ratio = result.gaseous.ratio
            right.errorbar(
                0.0,
                ratio.value,
                yerr=2.0 * (ratio.u or 0.0),
                fmt="s",
                color=INK,
                markersize=5,
                capsize=3,
                label=f"at zero pressure: {format_quantity(ratio)}",
            )
        tidy(right, PRESSURE_LABEL, r"$\Pi A\,/\,kT$", "Way to the gaseous limit")
        right.set_ylim(bottom=0)
        right.legend(frameon=False, fontsize=8)
        if result.gaseous is not None:
            note(right, result.gaseous.reading, x=0.75)
    return figure
