"""Draw repeated compression and expansion: the loops, their work, and the shift of area."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from isotherm.cycles_result import CyclesResult, molar
from isotherm.figures_style import ACCENT, INK, RUN_COLOURS, RUN_DASHES, SECOND, plain, style
from isotherm.quantity import Quantity
from isotherm.series_figure import AREA_LABEL, MARKS, PRESSURE_LABEL, blank_figure, note, tidy

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["figure_cycles"]

_MOST: Final = 6  # loops drawn apart; later ones are only in the work and shift panels


def _loops(result: CyclesResult, axes: Axes) -> None:
    for i, cycle in enumerate(result.cycles[:_MOST]):
        colour, dash = RUN_COLOURS[i % 6], RUN_DASHES[i % 6]
        curve = cycle.compression.curve
        axes.plot(
            curve.area, curve.pressure, color=colour, linestyle=dash, label=f"cycle {cycle.number}"
        )
        if cycle.expansion is not None:
            back = cycle.expansion.curve
            axes.plot(back.area, back.pressure, color=colour, linestyle=dash, linewidth=0.8)
    tidy(axes, AREA_LABEL, PRESSURE_LABEL, "Loops")
    axes.legend(frameon=False, fontsize=8)
    note(axes, "thick: compression\nthin: expansion")


def _works(result: CyclesResult, axes: Axes) -> None:
    """Work per cycle in kJ/mol, with error bars of 2 u."""
    groups: tuple[tuple[str, list[Quantity | None], str], ...] = (
        ("compression", [c.compression.work for c in result.cycles], INK),
        ("expansion", [c.expansion.work if c.expansion else None for c in result.cycles], SECOND),
        ("hysteresis", [c.hysteresis for c in result.cycles], ACCENT),
    )
    for mark, (label, energies, colour) in zip(MARKS, groups, strict=False):
        known = [
            (cycle.number, molar(energy))
            for cycle, energy in zip(result.cycles, energies, strict=True)
            if energy is not None
        ]
        if known:
            axes.errorbar(
                [number for number, _ in known],
                [energy.value for _, energy in known],
                [2.0 * (energy.u_random or 0.0) for _, energy in known],
                fmt=mark + "-",
                color=colour,
                capsize=3,
                markersize=5,
                linewidth=1.0,
                label=label,
            )
    tidy(axes, "", "work / kJ mol$^{-1}$", "Work (bars ± 2 u, scatter only)")
    axes.set_xticks([cycle.number for cycle in result.cycles])
    axes.margins(y=0.2)
    axes.legend(frameon=False, fontsize=8, ncols=3, loc="upper center")


def _shifts(result: CyclesResult, axes: Axes) -> None:
    """Area shift since the first compression, per cent, at each pressure."""
    seen = [s for s in result.shifts if s.direction == "compression"]
    pressures = sorted({s.pressure for s in seen})
    for i, pressure in enumerate(pressures):
        moved = [s for s in seen if s.pressure == pressure and s.part is not None]
        if not moved:
            continue
        axes.errorbar(
            [s.cycle for s in moved],
            [100.0 * s.part.value for s in moved if s.part],
            [200.0 * (s.part.u or 0.0) for s in moved if s.part],
            fmt=MARKS[i % len(MARKS)],
            color=RUN_COLOURS[i % 6],
            linestyle=RUN_DASHES[i % 6],
            capsize=3,
            markersize=5,
            linewidth=1.0,
            label=f"{pressure:g} mN m$^{{-1}}$",
        )
    axes.axhline(0.0, color=INK, linewidth=0.8)
    tidy(axes, "cycle", "shift of area / %", "Shift since the first compression (± 2 u)")
    axes.set_xticks([cycle.number for cycle in result.cycles])
    axes.margins(y=0.2)
    if axes.get_legend_handles_labels()[0]:
        axes.legend(frameon=False, fontsize=8)


def figure_cycles(result: CyclesResult) -> Figure:
    """Draw the loops, the work of every cycle and the shift of area since the first compression."""
    with style():
        figure = blank_figure(9.0, 5.2)
        grid = figure.add_gridspec(2, 2, width_ratios=[1.15, 1.0])
        _loops(result, figure.add_subplot(grid[:, 0]))
        work = figure.add_subplot(grid[0, 1])
        _works(result, work)
        shift = figure.add_subplot(grid[1, 1], sharex=work)
        _shifts(result, shift)
        figure.suptitle(plain(result.title) or "Cycles", x=0.01, ha="left", fontsize=11)
    return figure
