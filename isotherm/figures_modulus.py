"""The lower panel of an isotherm figure: compression modulus against area."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from isotherm.figures_rail import RailLabel, side_rail
from isotherm.figures_style import ACCENT, FAINT, INK, RUN_DASHES, SECOND
from isotherm.quantity import COVERAGE_FACTOR, format_quantity
from isotherm.result import IsothermResult

if TYPE_CHECKING:
    from matplotlib.axes import Axes

__all__ = ["draw_modulus", "scale_modulus"]

FloatArray = NDArray[np.float64]

# Customary bounds between kinds of film, mN/m (Davies & Rideal, Interfacial Phenomena, 2nd ed.,
# Academic Press 1963, as widely quoted), drawn as guides only.
CUSTOMARY_BOUNDS = (12.5, 50.0, 100.0, 250.0)
# Decades below the largest modulus that are worth drawing.
DECADES = 2.7


def draw_modulus(result: IsothermResult, axes: Axes) -> None:
    """Draw the modulus of every branch, that of the headline with its uncertainty, and the phases.

    Parameters
    ----------
    result : IsothermResult
        Moduli in mN/m.
    axes : Axes
        Shares its horizontal axis with the isotherm.
    """
    head = result.headline
    high = float(np.nanmax(head.curve.modulus)) if head.curve.modulus.size else 1.0
    high = max([high, *(p.modulus.value for p in head.phases)])
    floor = scale_modulus(axes, high)
    for bound in CUSTOMARY_BOUNDS:
        if floor < bound < 2.2 * high:
            axes.axhline(bound, color=FAINT, linewidth=0.5, linestyle=(0, (1, 3)), zorder=1)
    for branch in result.branches:
        if branch is not head:
            dash = RUN_DASHES[2] if branch.direction == "compression" else RUN_DASHES[1]
            axes.plot(
                branch.curve.area, _floored(branch.curve.modulus, floor), color=SECOND,
                linestyle=dash, linewidth=0.9, zorder=2,
            )  # fmt: skip
    curve = head.curve
    spread = COVERAGE_FACTOR * curve.u_modulus
    axes.fill_between(
        curve.area,
        np.maximum(curve.modulus - spread, 0.1 * floor),
        np.maximum(curve.modulus + spread, 0.1 * floor),
        color=SECOND,
        alpha=0.25,
        linewidth=0,
        zorder=2.2,
    )
    axes.plot(curve.area, _floored(curve.modulus, floor), color=INK, linewidth=1.4, zorder=3)
    labels = []
    for phase in head.phases:
        if phase.modulus.value > floor:
            axes.plot(
                phase.area, [phase.modulus.value] * 2, color=ACCENT, linewidth=2.2, zorder=3.5,
                solid_capstyle="butt",
            )  # fmt: skip
        labels.append(
            RailLabel(
                min(phase.area),
                max(phase.modulus.value, floor),
                (phase.name, f"{format_quantity(phase.modulus)} mN/m"),
            )
        )
    side_rail(axes, labels)


def scale_modulus(axes: Axes, high: float) -> float:
    """Give `axes` a logarithmic scale that ends above `high` (mN/m); return its lower end."""
    from matplotlib.ticker import FuncFormatter, NullFormatter

    floor: float = high / 10.0**DECADES
    axes.set_yscale("log")
    axes.set_ylim(floor, 2.2 * high)
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    axes.yaxis.set_minor_formatter(NullFormatter())
    return floor


def _floored(modulus: FloatArray, floor: float) -> FloatArray:
    """Leave a gap where the modulus is too small for the axis."""
    return np.where(modulus > 0.1 * floor, modulus, np.nan)
