"""What the figures of a series share: colours, marks, axes' words."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = [
    "AREA_LABEL",
    "COLOURS",
    "DASHES",
    "GREY",
    "MARKS",
    "PRESSURE_LABEL",
    "blank_figure",
    "note",
    "tidy",
]

# Okabe & Ito, Color Universal Design, 2008: told apart with every common colour vision. The yellow is
# left out: too pale on white paper.
COLOURS: Final = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#000000")
GREY: Final = "#777777"
# marks and dashes repeat what colour says, for black-and-white print
MARKS: Final = ("o", "s", "^", "D", "v", "P", "X")
DASHES: Final = ("-", "--", "-.", ":", (0, (5, 1, 1, 1, 1, 1)), (0, (7, 2)), (0, (1, 1)))
AREA_LABEL: Final = "area per molecule $A$ / nm$^2$"
PRESSURE_LABEL: Final = r"surface pressure $\Pi$ / mN m$^{-1}$"


def blank_figure(width: float, height: float) -> Figure:
    """An empty figure, inches, whose panels never overlap; drawn without a display."""
    from matplotlib.figure import Figure

    return Figure(figsize=(width, height), layout="constrained", dpi=120)


def tidy(axes: Axes, x: str, y: str, title: str = "") -> None:
    """Label the axes, drop the frame's upper and right lines, draw a pale grid behind the data."""
    axes.set_xlabel(x)
    axes.set_ylabel(y)
    if title:
        axes.set_title(title, loc="left", fontsize=10)
    axes.spines[["top", "right"]].set_visible(False)
    axes.grid(True, color="#e4e4e4", linewidth=0.6)
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
        color="#333333",
        bbox={"facecolor": "white", "alpha": 0.8, "edgecolor": "none", "pad": 1.5},
    )
