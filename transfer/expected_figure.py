"""Layers, thickness and mass along the substrate as a picture."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from isotherm.figures_style import ACCENT, BAND_SHADED, FAINT, INK, style
from isotherm.quantity import COVERAGE_FACTOR
from transfer.expected_along import AlongSubstrate

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["draw_along"]


def draw_along(along: AlongSubstrate, *, designed_layers: int | None = None) -> Figure:
    """Draw what lies where: one panel each for layers, thickness and mass where they are known.

    Parameters
    ----------
    along : AlongSubstrate
    designed_layers : int or None
        Drawn as a broken line beside the layers found.
    """
    import matplotlib

    with style(), matplotlib.rc_context({"figure.constrained_layout.use": True}):
        from matplotlib.figure import Figure as NewFigure

        panels = [
            ("layers N", along.layers, along.u_layers),
            ("thickness (nm)", along.thickness, along.u_thickness),
            ("mass per area, one face (ng/cm²)", along.mass, along.u_mass),
        ]
        known = [(name, v, u) for name, v, u in panels if v is not None and u is not None]
        figure = NewFigure(figsize=(2.9 * len(known) + 0.6, 3.6))
        axes = figure.subplots(1, len(known), sharey=True, squeeze=False)[0]
        for axis, (name, value, u) in zip(axes, known, strict=True):
            half = COVERAGE_FACTOR * u
            axis.fill_betweenx(along.height, value - half, value + half, color=BAND_SHADED, lw=0)
            axis.plot(value, along.height, color=INK)
            axis.set_xlabel(name)
            axis.set_xlim(min(0.0, float(np.min(value - half))), 1.12 * float(np.max(value + half)))
        if designed_layers is not None:
            axes[0].axvline(designed_layers, color=ACCENT, linestyle=(0, (4, 2)), linewidth=1.2)
            axes[0].text(
                designed_layers,
                1.0,
                f"designed {designed_layers}",
                transform=axes[0].get_xaxis_transform(),
                color=ACCENT,
                fontsize=7.5,
                ha="center",
                va="bottom",
            )
            axes[0].set_xlim(right=max(axes[0].get_xlim()[1], 1.12 * designed_layers))
        axes[0].set_ylabel("height above the lower edge (mm)")
        axes[0].set_ylim(0.0, float(along.height[-1] + along.height[0]))
        axes[-1].text(
            0.03, 0.02, "band: ± 2 u", transform=axes[-1].transAxes, color=FAINT, fontsize=7.5,
            ha="left", va="bottom",
        )  # fmt: skip
        return figure
