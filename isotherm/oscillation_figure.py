"""Draw barrier oscillations: the record, the loops, storage and loss against frequency."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from isotherm.figures_style import ACCENT, BAND_SHADED, FAINT, INK, RUN_COLOURS, SECOND, style
from isotherm.oscillation_result import OscillationResult
from isotherm.series_figure import AREA_LABEL, MARKS, PRESSURE_LABEL, blank_figure, tidy

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["figure_oscillation"]

_EXPANDED: Final = 2.0  # bars are ± 2 u
_LOOPS: Final = 6  # loops that can be told apart


def figure_oscillation(result: OscillationResult) -> Figure:
    """Above: area and pressure against time, stretches shaded. Below: loops, and the modulus."""
    with style():
        figure = blank_figure(9.0, 7.6)
        grid = figure.add_gridspec(3, 2, height_ratios=[1.0, 1.0, 2.1])
        area = figure.add_subplot(grid[0, :])
        pressure = figure.add_subplot(grid[1, :], sharex=area)
        _record(area, pressure, result)
        _loops(figure.add_subplot(grid[2, 0]), result)
        _moduli(figure.add_subplot(grid[2, 1]), result)
    return figure


def _record(area: Axes, pressure: Axes, result: OscillationResult) -> None:
    area.plot(result.time, result.area, color=INK, linewidth=0.8)
    pressure.plot(result.time, result.pressure, color=INK, linewidth=0.8)
    for segment in result.segments:
        for axes in (area, pressure):
            axes.axvspan(segment.start, segment.end, color=BAND_SHADED, zorder=0)
        area.annotate(
            str(segment.number),
            (0.5 * (segment.start + segment.end), 1.0),
            xycoords=("data", "axes fraction"),
            ha="center",
            va="bottom",
            fontsize=8,
            annotation_clip=False,
        )
    tidy(area, "", AREA_LABEL.replace("area per molecule ", ""))
    tidy(pressure, "time / s", PRESSURE_LABEL.replace("surface pressure ", ""))
    area.tick_params(labelbottom=False)


def _loops(axes: Axes, result: OscillationResult) -> None:
    """Pressure against strain: an ellipse for a linear film, tilted by storage, opened by loss."""
    shown = result.segments[:_LOOPS]
    for i, segment in enumerate(shown):
        colour = RUN_COLOURS[i % len(RUN_COLOURS)]
        axes.plot(
            100.0 * segment.strain,
            segment.pressure_wave,
            ".",
            markersize=1.2,
            color=colour,
            alpha=0.35,
        )
        turn = np.linspace(0.0, 2.0 * np.pi, 200)
        size = segment.amplitude.value
        modulus = segment.storage.value + 1j * segment.loss.value
        wave = np.exp(1j * turn)
        axes.plot(
            100.0 * size * wave.real,
            (-modulus * size * wave).real,
            color=colour,
            linewidth=1.3,
            label=f"{segment.number}: {1e3 * segment.frequency.value:.3g} mHz",
        )
    tidy(
        axes, r"strain $\ln(A/A_0)$ / %", r"$\Pi-\Pi_0$ / mN m$^{-1}$", "Loops and fitted ellipses"
    )
    axes.legend(frameon=False, fontsize=8)


def _moduli(axes: Axes, result: OscillationResult) -> None:
    for name, colour, mark, label in (
        ("storage", INK, MARKS[0], r"storage $E'$"),
        ("loss", ACCENT, MARKS[1], r"loss $E''$"),
    ):
        for linear in (True, False):
            shown = [s for s in result.segments if s.linear == linear]
            if not shown:
                continue
            axes.errorbar(
                [1e3 * s.frequency.value for s in shown],
                [getattr(s, name).value for s in shown],
                yerr=[_EXPANDED * (getattr(s, name).u or 0.0) for s in shown],
                fmt=mark,
                color=colour,
                markersize=5,
                capsize=3,
                markerfacecolor=colour if linear else "white",
                label=label if linear else f"{label}, not linear",
            )
    compared = [s for s in result.segments if s.quasi_static is not None]
    if compared:
        axes.errorbar(
            [1e3 * s.frequency.value for s in compared],
            [s.quasi_static.modulus.value for s in compared if s.quasi_static],
            yerr=[
                _EXPANDED * (s.quasi_static.modulus.u or 0.0) for s in compared if s.quasi_static
            ],
            fmt="_",
            color=SECOND,
            markersize=14,
            capsize=0,
            label="isotherm, same pressure",
        )
    axes.axhline(0.0, color=FAINT, linewidth=1)
    axes.set_xscale("log")
    tidy(
        axes,
        "frequency / mHz",
        r"dilational modulus / mN m$^{-1}$",
        "Complex modulus (bars: ± 2 u)",
    )
    axes.legend(frameon=False, fontsize=8)
