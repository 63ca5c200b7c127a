"""What the figures of a series share: marks, axes' words, remarks."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from isotherm.figures_style import BAND_SHADED, INK

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = [
    "AREA_LABEL",
    "MARKS",
    "PRESSURE_LABEL",
    "blank_figure",
    "note",
    "tidy",
]

# marks repeat what colour says, for black-and-white print
MARKS: Final = ("o", "s", "^", "D", "v", "P", "X")
AREA_LABEL: Final = "area per molecule $A$ / nm$^2$"
PRESSURE_LABEL: Final = r"surface pressure $\Pi$ / mN m$^{-1}$"


def blank_figure(width: float, height: float) -> Figure:
    """An empty figure, inches, whose panels never overlap; needs no display. Call it under `style()`."""
    from matplotlib.figure import Figure

    return Figure(figsize=(width, height), layout="constrained")


def tidy(axes: Axes, x: str, y: str, title: str = "") -> None:
    """Label the axes and draw a pale grid behind the data."""
    axes.set_xlabel(x)
    axes.set_ylabel(y)
    if title:
        axes.set_title(title, loc="left")
    axes.grid(True, color=BAND_SHADED, linewidth=0.6)
    axes.set_axisbelow(True)


def note(axes: Axes, text: str, *, x: float = 0.03, y: float = 0.03, top: bool = False) -> None:
    """Write a remark in a corner of the panel, in axes coordinates."""
    axes.text(
        x,
        1.0 - y if top else y,
        text,
        transform=axes.transAxes,
        va="top" if top else "bottom",
        ha="left",
        fontsize=8,
        color=INK,
        bbox={"facecolor": "white", "alpha": 0.8, "edgecolor": "none", "pad": 1.5},
    )
