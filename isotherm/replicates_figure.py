"""Draw repeated runs: every isotherm, their mean and band, and how each feature scatters."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from isotherm.figures_style import FAINT, RUN_COLOURS, RUN_DASHES, SECOND, plain, style
from isotherm.replicates_result import FeatureSpread, ReplicatesResult
from isotherm.series import spoken
from isotherm.series_figure import AREA_LABEL, PRESSURE_LABEL, blank_figure, tidy

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["figure_replicates"]

_LONGEST_LIST = 12  # features drawn; more do not fit a page


def figure_replicates(result: ReplicatesResult) -> Figure:
    """Left: isotherms, mean curve and its band. Right: each feature's runs about their mean."""
    with style():
        figure = blank_figure(9.0, 4.6)
        left, right = figure.subplots(1, 2, width_ratios=[1.25, 1.0])
        _curves(left, result)
        _features(right, result)
    return figure


def _curves(axes: Axes, result: ReplicatesResult) -> None:
    curve = result.curve
    usual_named = False
    marked = 0
    for run, area in zip(result.runs, result.curves, strict=True):
        if run.kept and not run.outlying:
            label = None if usual_named else "single runs"
            usual_named = True
            axes.plot(area, curve.pressure, color=FAINT, linewidth=0.7, label=label)
            continue
        state = "outlying, kept" if run.kept else "left out"
        axes.plot(
            area,
            curve.pressure,
            color=RUN_COLOURS[1] if run.kept else RUN_COLOURS[3],
            linestyle=RUN_DASHES[1 + marked % (len(RUN_DASHES) - 1)],
            linewidth=1.3,
            label=plain(f"{run.name}: {state}"),
        )
        marked += 1
    axes.fill_betweenx(
        curve.pressure,
        curve.low,
        curve.high,
        color=SECOND,
        alpha=0.3,
        linewidth=0,
        label="95 % interval of the mean (scatter)",
    )
    axes.plot(
        curve.mean,
        curve.pressure,
        color=RUN_COLOURS[0],
        linewidth=2,
        label=f"mean of {curve.n} runs",
    )
    tidy(axes, AREA_LABEL, PRESSURE_LABEL, "Area averaged at each pressure")
    axes.set_ylim(bottom=0)
    axes.legend(fontsize=8, frameon=False, loc="upper right")


def _drawn(result: ReplicatesResult) -> list[FeatureSpread]:
    """Features with a scatter; the redundant ends are left to the table."""
    enough = [f for f in result.features if f.n >= 2 and f.mean.value != 0]
    return [f for f in enough if f.name not in ("highest_pressure", "modulus_max_pressure")][
        :_LONGEST_LIST
    ]


def _features(axes: Axes, result: ReplicatesResult) -> None:
    features = _drawn(result)
    for place, spread in enumerate(features):
        mean = spread.mean.value
        usual: list[float] = []
        odd: list[float] = []
        for run in result.runs:
            if run.kept and spread.name in run.values:
                offset = 100.0 * (run.values[spread.name].value / mean - 1.0)
                (odd if run.outlying else usual).append(offset)
        axes.plot(usual, np.full(len(usual), place), "o", color=FAINT, markersize=4, alpha=0.8)
        axes.plot(odd, np.full(len(odd), place), "X", color=RUN_COLOURS[1], markersize=7)
        if spread.interval is not None:
            half = 100.0 * (spread.interval[1] - mean) / abs(mean)
            axes.errorbar(
                0.0, place, xerr=half, color=RUN_COLOURS[0], capsize=4, linewidth=2, marker="|"
            )
    names = [f"{spoken(f.name)} (n = {f.n})" for f in features]
    axes.set_yticks(range(len(features)), names, fontsize=8)
    axes.invert_yaxis()
    tidy(axes, "run minus mean, % of the mean", "", "Spread of the features")
    axes.plot([], [], "o", color=FAINT, markersize=4, label="run")
    if any(r.outlying and r.kept for r in result.runs):
        axes.plot([], [], "X", color=RUN_COLOURS[1], label="outlying run")
    axes.errorbar(
        [], [], xerr=[], color=RUN_COLOURS[0], capsize=4, linewidth=2, label="95 % of mean"
    )
    axes.legend(fontsize=8, frameon=False, ncols=3, loc="upper center", bbox_to_anchor=(0.5, -0.13))
