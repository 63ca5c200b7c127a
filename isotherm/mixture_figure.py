"""Draw mixtures against composition: areas, excess, Gibbs energy, collapse and transition."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from isotherm.figures_style import FAINT, RUN_COLOURS, RUN_DASHES, plain, style
from isotherm.mixture_result import MixtureResult, MixturesAt, SurfacePhaseRule
from isotherm.series_figure import MARKS, PRESSURE_LABEL, blank_figure, tidy

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["figure_mixture"]

FloatArray = NDArray[np.float64]

_PRESSURES_DRAWN: Final = 4  # more lines cannot be told apart in one panel
_EXPANDED: Final = 2.0  # bars are ± 2 u


def figure_mixture(result: MixtureResult) -> Figure:
    """Four panels: area with the ideal line, excess area, Gibbs energy of mixing, phase rule."""
    with style():
        figure = blank_figure(9.0, 7.2)
        panels = figure.subplots(2, 2)
        groups = _spread_out(result.at)
        _areas(panels[0, 0], result, groups)
        _excess(panels[0, 1], result, groups)
        _gibbs(panels[1, 0], result, groups)
        _phase_rule(panels[1, 1], result)
        label = _axis_label(result)
        for axes in panels.flat:
            axes.set_xlabel(label)
            _ticks(axes, result)
    return figure


def _spread_out(groups: tuple[MixturesAt, ...]) -> list[MixturesAt]:
    """At most `_PRESSURES_DRAWN` of the pressures, the first and last among them."""
    if len(groups) <= _PRESSURES_DRAWN:
        return list(groups)
    picked = np.linspace(0, len(groups) - 1, _PRESSURES_DRAWN).round().astype(int)
    return [groups[i] for i in picked]


def _axis_label(result: MixtureResult) -> str:
    if len(result.components) == 2:
        return f"mole fraction of {plain(result.components[1])}"
    return f"composition: fractions of {plain(', '.join(result.components))}"


def _places(result: MixtureResult, fractions: list[tuple[float, ...]]) -> FloatArray:
    """Where each composition stands: its mole fraction for two components, else its place in a row."""
    if len(result.components) == 2:
        return np.array([f[1] for f in fractions])
    order = [s.fractions for s in result.at[0].states]
    return np.array([float(order.index(f)) for f in fractions])


def _ticks(axes: Axes, result: MixtureResult) -> None:
    if len(result.components) > 2:
        order = [s.fractions for s in result.at[0].states]
        axes.set_xticks(
            range(len(order)), ["/".join(f"{x:.2g}" for x in f) for f in order], fontsize=7
        )


def _areas(axes: Axes, result: MixtureResult, groups: list[MixturesAt]) -> None:
    for i, group in enumerate(groups):
        x = _places(result, [s.fractions for s in group.states])
        order = np.argsort(x)
        area = np.array([s.area.value for s in group.states])
        u = np.array([s.area.u or 0.0 for s in group.states])
        ideal = np.array([(s.ideal or s.area).value for s in group.states])
        axes.plot(
            x[order], ideal[order], color=RUN_COLOURS[i], linestyle=RUN_DASHES[i], linewidth=1
        )
        axes.errorbar(
            x,
            area,
            yerr=_EXPANDED * u,
            fmt=MARKS[i],
            color=RUN_COLOURS[i],
            markersize=5,
            capsize=3,
            label=f"{group.pressure:g} mN/m",
        )
    tidy(axes, "", "mean area per molecule / nm$^2$", "Mean area (lines: additive)")
    axes.legend(fontsize=8, frameon=False)


def _excess(axes: Axes, result: MixtureResult, groups: list[MixturesAt]) -> None:
    """Excess in per cent of the ideal area, marks of neighbouring pressures set side by side."""
    axes.axhline(0.0, color=FAINT, linewidth=1)
    shift = 0.008 if len(result.components) == 2 else 0.1
    for i, group in enumerate(groups):
        mixed = [s for s in group.states if s.excess_relative is not None]
        x = _places(result, [s.fractions for s in mixed]) + shift * (i - (len(groups) - 1) / 2)
        value = np.array([100 * s.excess_relative.value for s in mixed if s.excess_relative])
        u = np.array([100 * (s.excess_relative.u or 0.0) for s in mixed if s.excess_relative])
        axes.errorbar(
            x,
            value,
            yerr=_EXPANDED * u,
            fmt=MARKS[i],
            color=RUN_COLOURS[i],
            markersize=5,
            capsize=3,
        )
    title = "Excess area (bars: ± 2 u)"
    tidy(axes, "", r"$A_\mathrm{ex}\,/\,A_\mathrm{ideal}$ / %", title)
    if len(result.components) == 2:
        axes.set_xlim(-0.04, 1.04)


def _gibbs(axes: Axes, result: MixtureResult, groups: list[MixturesAt]) -> None:
    axes.axhline(0.0, color=FAINT, linewidth=1)
    shift = 0.008 if len(result.components) == 2 else 0.1
    for i, group in enumerate(groups):
        mixed = [s for s in group.states if s.gibbs_excess is not None]
        x = _places(result, [s.fractions for s in mixed]) + shift * (i - (len(groups) - 1) / 2)
        value = np.array([s.gibbs_excess.value / 1e3 for s in mixed if s.gibbs_excess])
        u = np.array([(s.gibbs_excess.u or 0.0) / 1e3 for s in mixed if s.gibbs_excess])
        axes.errorbar(
            x,
            value,
            yerr=_EXPANDED * u,
            fmt=MARKS[i],
            color=RUN_COLOURS[i],
            markersize=5,
            capsize=3,
        )
        if group.interaction is not None:
            fine = np.linspace(0.0, 1.0, 101)
            curve = group.interaction.value * fine * (1.0 - fine) / 1e3
            axes.plot(fine, curve, color=RUN_COLOURS[i], linestyle=RUN_DASHES[i], linewidth=1)
    last = groups[-1]
    total = [s for s in last.states if s.gibbs_mixing is not None]
    if total:
        x = _places(result, [s.fractions for s in total])
        axes.plot(
            x,
            [s.gibbs_mixing.value / 1e3 for s in total if s.gibbs_mixing],
            "*",
            markersize=8,
            markerfacecolor="white",
            color="black",
            label=rf"with $RT\,\Sigma x \ln x$, {last.pressure:g} mN/m",
        )
        axes.legend(fontsize=8, frameon=False)
    fitted = last.interaction is not None
    title = "Excess Gibbs energy" + (r" (lines: $\omega\,x(1-x)$)" if fitted else "")
    tidy(axes, "", r"$\Delta G$ / kJ mol$^{-1}$", title)
    if len(result.components) == 2:
        axes.set_xlim(-0.04, 1.04)


def _phase_rule(axes: Axes, result: MixtureResult) -> None:
    for i, rule in enumerate(result.phase_rule):
        shown = [p for p in rule.points if p.pressure is not None]
        x = _places(result, [p.fractions for p in shown])
        value = np.array([p.pressure.value for p in shown if p.pressure])
        u = np.array([p.pressure.u or 0.0 for p in shown if p.pressure])
        axes.errorbar(
            x,
            value,
            yerr=_EXPANDED * u,
            fmt=MARKS[i],
            color=RUN_COLOURS[i],
            markersize=5,
            capsize=3,
            label=f"{rule.kind}: {rule.reading}",
        )
        _straight(axes, result, rule, i)
    tidy(axes, "", PRESSURE_LABEL, "Collapse and transition (surface phase rule)")
    axes.set_ylim(bottom=0)
    if len(result.components) == 2:
        axes.set_xlim(-0.04, 1.04)
    if result.phase_rule:
        axes.legend(fontsize=8, frameon=False)
    else:
        axes.text(0.5, 0.5, "none found", transform=axes.transAxes, ha="center", color=FAINT)


def _straight(axes: Axes, result: MixtureResult, rule: SurfacePhaseRule, colour: int) -> None:
    """The line from one component to the other, where both have the pressure."""
    pures = [p.pressure for p in rule.points[: len(result.components)]]
    if len(pures) == 2 and pures[0] is not None and pures[1] is not None:
        axes.plot(
            [0.0, 1.0],
            [pures[0].value, pures[1].value],
            color=RUN_COLOURS[colour],
            linestyle=RUN_DASHES[1],
            linewidth=1,
        )
