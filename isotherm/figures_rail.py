"""Labels beside a plot that never overlap: each as near its mark as its neighbours allow."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Any

from isotherm.figures_style import FAINT, INK

if TYPE_CHECKING:
    from matplotlib.axes import Axes

__all__ = ["RailLabel", "foot_rail", "side_rail", "spread"]

LINE_POINTS = 8.4  # height of a line of label text, font size 7.5
FONT = 7.5


@dataclass(frozen=True)
class RailLabel:
    """A label for the mark at (x, y) in data units; the first line is its name.

    colour and dash are those of the line that ties the label to its mark.
    """

    x: float
    y: float
    lines: tuple[str, ...]
    colour: str = FAINT
    dash: Any = "-"


def spread(wanted: Sequence[float], sizes: Sequence[float], low: float, high: float) -> list[float]:
    """Move centres apart so that intervals of the given sizes do not overlap, and as little as may be.

    Parameters
    ----------
    wanted : sequence of float, ascending
        Where each centre would be.
    sizes : sequence of float
        Length of each interval, same unit.
    low, high : float
        All intervals stay within, where they fit at all.

    Returns
    -------
    list of float
        Centres, in the same order: the least-squares answer by pooling neighbours that collide
        (isotonic regression; Ayer et al., Ann. Math. Stat. 1955, 26, 641).
    """
    if not wanted:
        return []
    offsets = [0.0]
    for before, after in pairwise(sizes):
        offsets.append(offsets[-1] + (before + after) / 2)
    pools: list[tuple[float, int]] = []  # mean of wanted - offset, members
    for centre, offset in zip(wanted, offsets, strict=True):
        mean, members = centre - offset, 1
        while pools and pools[-1][0] > mean:
            other, count = pools.pop()
            mean = (mean * members + other * count) / (members + count)
            members += count
        pools.append((mean, members))
    lowest = low + sizes[0] / 2
    highest = high - sizes[-1] / 2 - offsets[-1]
    starts = [max(lowest, min(mean, highest)) for mean, members in pools for _ in range(members)]
    return [start + offset for start, offset in zip(starts, offsets, strict=True)]


def _size_points(axes: Axes) -> tuple[float, float]:
    """Return width and height of the axes in points."""
    box = axes.get_window_extent()
    figure: Any = axes.get_figure()
    return box.width * 72.0 / figure.dpi, box.height * 72.0 / figure.dpi


def side_rail(axes: Axes, labels: Sequence[RailLabel], *, gap: float = 0.035) -> None:
    """Write labels in a column right of `axes`, each tied to its mark by a thin line.

    The line runs level from the mark to the edge: right of a compression's knee the curve is lower,
    so it crosses nothing.

    Parameters
    ----------
    axes : Axes
        Limits must be set already.
    labels : sequence of RailLabel
        In any order.
    gap : float
        Distance from the axes' edge to the text, in axes widths.
    """
    if not labels:
        return
    height = _size_points(axes)[1]
    to_axes = axes.transData + axes.transAxes.inverted()
    placed = sorted(labels, key=lambda label: (label.y, -label.x))
    points = [to_axes.transform((label.x, label.y)) for label in placed]
    sizes = [(len(label.lines) * LINE_POINTS + 4.0) / height for label in placed]
    crowding = max(1.0, sum(sizes) / 1.08)
    centres = spread([p[1] for p in points], [s / crowding for s in sizes], -0.04, 1.04)
    for label, point, centre in zip(placed, points, centres, strict=True):
        axes.plot(
            [point[0], 1.0, 1.0 + 0.6 * gap, 1.0 + gap * 0.9],
            [point[1], point[1], centre, centre],
            transform=axes.transAxes,
            color=label.colour,
            linestyle=label.dash,
            linewidth=0.5 if label.colour == FAINT else 1.0,
            zorder=1.5,
            clip_on=False,
        )
        axes.text(
            1.0 + gap,
            centre,
            "\n".join(label.lines),
            transform=axes.transAxes,
            fontsize=FONT / crowding**0.5,
            linespacing=1.05,
            color=INK,
            va="center",
            ha="left",
        )


def foot_rail(axes: Axes, labels: Sequence[RailLabel], *, drop: float) -> None:
    """Write labels in a row under `axes`, each tied to its place on the horizontal axis.

    Parameters
    ----------
    axes : Axes
        Limits must be set already.
    labels : sequence of RailLabel
        In any order; y is not used.
    drop : float
        Distance from the axis down to the middle of the text, in points.
    """
    figure = axes.get_figure()
    if figure is None or not labels:
        return
    from matplotlib.backends.backend_agg import FigureCanvasAgg

    canvas: Any = FigureCanvasAgg(figure.figure)
    renderer = canvas.get_renderer()
    width, height = _size_points(axes)
    placed = sorted(labels, key=lambda label: label.x)
    to_axes = axes.transData + axes.transAxes.inverted()
    wanted = [to_axes.transform((label.x, 0.0))[0] for label in placed]
    texts = [
        axes.text(
            0.0, -drop / height, "\n".join(label.lines), transform=axes.transAxes,
            fontsize=FONT, linespacing=1.05, va="center", ha="center", color=INK,
        )
        for label in placed
    ]  # fmt: skip
    sizes = [
        (text.get_window_extent(renderer).width * 72.0 / figure.dpi + 8.0) / width for text in texts
    ]
    centres = spread(wanted, sizes, -0.12, 1.0)
    for label, text, at, centre in zip(placed, texts, wanted, centres, strict=True):
        text.set_x(centre)
        half = len(label.lines) * LINE_POINTS / 2 + 1.0
        axes.plot(
            [at, at, centre],
            [0.0, -4.0 / height, (half - drop) / height],
            transform=axes.transAxes,
            color=FAINT,
            linewidth=0.5,
            clip_on=False,
            zorder=1.5,
        )
