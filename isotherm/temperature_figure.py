"""Draw a series of temperatures: isotherms, transition pressure, ΔA to its end, heat."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from isotherm.constants import ZERO_CELSIUS
from isotherm.figures_style import ACCENT, FAINT, INK, SECOND, style
from isotherm.quantity import Quantity, format_quantity
from isotherm.result import IsothermResult
from isotherm.series_figure import AREA_LABEL, MARKS, PRESSURE_LABEL, blank_figure, note, tidy
from isotherm.temperature_line import StraightLine
from isotherm.temperature_result import TemperatureResult

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["figure_temperature"]

_EXPANDED: Final = 2.0  # bars are ± 2 u
_CELSIUS: Final = "temperature / °C"


def figure_temperature(
    result: TemperatureResult, isotherms: Sequence[IsothermResult] = ()
) -> Figure:
    """Four panels; the first shows the isotherms themselves when they are given.

    Parameters
    ----------
    result : TemperatureResult
    isotherms : sequence of IsothermResult, optional
        The runs behind it, in any order.
    """
    with style():
        figure = blank_figure(9.0, 7.2)
        panels = figure.subplots(2, 2)
        if isotherms:
            _isotherms(panels[0, 0], result, isotherms)
        else:
            _trend(panels[0, 0], result)
        _pressure(panels[0, 1], result)
        _delta_area(panels[1, 0], result)
        _heat(panels[1, 1], result)
    return figure


def _isotherms(axes: Axes, result: TemperatureResult, isotherms: Sequence[IsothermResult]) -> None:
    """Cold to warm as dark to light, each named at its line; ends of the coexistence marked."""
    from matplotlib import colormaps

    by_path = {r.source.path: r.headline.curve for r in isotherms}
    shades = colormaps["cividis"](np.linspace(0.0, 0.85, max(len(result.runs), 2)))
    for i, run in enumerate(result.runs):
        curve = by_path.get(run.path)
        if curve is None:
            continue
        celsius = run.kelvin.value - ZERO_CELSIUS
        axes.plot(
            curve.area, curve.pressure, color=shades[i], linewidth=1.2, label=f"{celsius:.1f} °C"
        )
        for place in (run.onset_area, run.end_area):
            if place is not None:
                height = float(np.interp(-place.value, -curve.area, curve.pressure))
                axes.plot(
                    place.value, height, "o", color=shades[i], markersize=4, markerfacecolor="white"
                )
    tidy(axes, AREA_LABEL, PRESSURE_LABEL, "Isotherms (rings: ends of the coexistence)")
    axes.set_ylim(bottom=0)
    axes.legend(frameon=False, fontsize=8)


def _trend(axes: Axes, result: TemperatureResult) -> None:
    named = [(r.kelvin, r.values.get("modulus_max")) for r in result.runs]
    points = [(k, q) for k, q in named if q is not None]
    _bars(axes, [k for k, _ in points], [q for _, q in points], INK, MARKS[0], None)
    tidy(axes, _CELSIUS, r"largest modulus / mN m$^{-1}$", "Largest modulus")


def _bars(
    axes: Axes,
    kelvin: Sequence[Quantity],
    values: Sequence[Quantity],
    colour: str,
    mark: str,
    label: str | None,
    *,
    divide: float = 1.0,
    **looks: Any,
) -> None:
    axes.errorbar(
        [k.value - ZERO_CELSIUS for k in kelvin],
        [q.value / divide for q in values],
        xerr=[_EXPANDED * (k.u or 0.0) for k in kelvin],
        yerr=[_EXPANDED * (q.u or 0.0) / divide for q in values],
        fmt=mark,
        color=colour,
        markersize=5,
        capsize=3,
        label=label,
        **looks,
    )


def _line(axes: Axes, line: StraightLine, low: float, high: float, colour: str) -> None:
    """The fitted line and its 95 % band between two temperatures, K."""
    x = np.linspace(low, high, 101)
    y = line.level + line.slope * (x - line.pivot)
    axes.plot(x - ZERO_CELSIUS, y, color=colour, linewidth=1.2)
    if np.isfinite(line.u_slope):
        half = line.band(x)
        axes.fill_between(
            x - ZERO_CELSIUS, y - half, y + half, color=colour, alpha=0.15, linewidth=0
        )


def _pressure(axes: Axes, result: TemperatureResult) -> None:
    points = [(r.kelvin, r.pressure) for r in result.runs if r.pressure is not None]
    _bars(axes, [k for k, _ in points], [q for _, q in points], INK, MARKS[0], None)
    line = result.pressure_line
    if line is not None and result.slope is not None:
        span = [k.value for k, _ in points]
        low, high = min(span), max(span)
        _line(axes, line, low - 1.0, high + 1.0, ACCENT)
        text = rf"$d\Pi_t/dT$ = {format_quantity(result.slope)} mN m$^{{-1}}$ K$^{{-1}}$"
        if result.begins_at is not None:
            text += f"\nzero at {result.begins_at.value - ZERO_CELSIUS:.1f} °C"
        note(axes, text, top=True)
    tidy(axes, _CELSIUS, r"transition pressure $\Pi_t$ / mN m$^{-1}$", "Transition pressure")
    axes.set_ylim(bottom=0)


def _delta_area(axes: Axes, result: TemperatureResult) -> None:
    points = [(r.kelvin, r.delta_area) for r in result.runs if r.delta_area is not None]
    _bars(axes, [k for k, _ in points], [q for _, q in points], INK, MARKS[0], None)
    line = result.delta_area_line
    axes.axhline(0.0, color=FAINT, linewidth=1)
    if line is not None:
        span = [k.value for k, _ in points]
        critical = next((c for c in result.critical if c.law == "linear"), None)
        end = max(span)
        if critical is not None:
            end = max(end, critical.kelvin.value)
            low, high = critical.interval
            if low is not None and high is not None:
                axes.plot(
                    [low - ZERO_CELSIUS, high - ZERO_CELSIUS],
                    [0.0, 0.0],
                    color=ACCENT,
                    linewidth=5,
                    alpha=0.6,
                    solid_capstyle="butt",
                )
                end = min(max(end, high), end + 1.5 * (end - min(span)))
            celsius = critical.kelvin.value - ZERO_CELSIUS
            text = f"linear: closes at {celsius:.1f} °C"
            if low is not None and high is not None:
                text += f"\n95 %: {low - ZERO_CELSIUS:.1f} to {high - ZERO_CELSIUS:.1f} °C"
            note(axes, text, x=0.97 - 0.42, top=True)
        _line(axes, line, min(span), end, ACCENT)
    tidy(
        axes,
        _CELSIUS,
        r"$\Delta A$ of the coexistence / nm$^2$",
        "Width, extended to where it closes",
    )


def _heat(axes: Axes, result: TemperatureResult) -> None:
    with_heat = [(r.kelvin, r.heat) for r in result.runs if r.heat is not None]
    kelvin = [k for k, _ in with_heat]
    simple = r"$T\,\Delta A\,d\Pi_t/dT$"
    _bars(axes, kelvin, [h.enthalpy for _, h in with_heat], INK, MARKS[0], simple, divide=1e3)
    full = [(k, h.enthalpy_full) for k, h in with_heat if h.enthalpy_full is not None]
    label = r"$T\,\Delta A\,(d\Pi_t/dT - d\gamma_0/dT)$"
    _bars(
        axes,
        [k for k, _ in full],
        [q for _, q in full],
        SECOND,
        MARKS[1],
        label,
        divide=1e3,
        markerfacecolor="white",
    )
    tidy(axes, _CELSIUS, r"$\Delta H$ / kJ mol$^{-1}$", "Heat taken up, condensed to expanded")
    if with_heat:
        axes.legend(frameon=False, fontsize=8)
        axes.set_ylim(bottom=0)
