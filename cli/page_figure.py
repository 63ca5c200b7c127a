"""A drawn figure as part of a page: vector, with its points beside it so that they can be read off."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from cli.page_mathtext import plain_label

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["Picture", "Series", "picture_of", "place"]

FloatArray = NDArray[np.float64]

MOST_POINTS = 240  # of one series: finer than a finger or an arrow key can choose
POINTS_PER_INCH = 72.0  # of the vector format


@dataclass(frozen=True)
class Series:
    """Points a reader can ask for: places in the picture, and what is said at each.

    x, y : (n,) points (1/72 inch) from the picture's left and upper edges. said : one text a point.
    """

    name: str
    x: FloatArray
    y: FloatArray
    said: tuple[str, ...]


@dataclass(frozen=True)
class Picture:
    """A figure ready for a page: SVG, its size in points, its series, what it shows."""

    svg: str
    width: float
    height: float
    series: tuple[Series, ...]
    caption: str
    narrow: bool = False  # drawn to be read at the width of a phone
    cursor: bool = False  # whether a line follows the reader along the horizontal axis

    def data(self) -> dict[str, Any]:
        """Return what the page's script needs."""
        return {
            "w": round(self.width, 1),
            "h": round(self.height, 1),
            "line": self.cursor,
            "series": [
                {
                    "name": s.name,
                    "x": [round(float(v), 1) for v in s.x],
                    "y": [round(float(v), 1) for v in s.y],
                    "said": list(s.said),
                }
                for s in self.series
            ],
        }


def picture_of(
    figure: Figure,
    caption: str,
    *,
    series: Sequence[Series] | None = None,
    narrow: bool = False,
    cursor: bool = False,
) -> Picture:
    """Turn a figure into a picture.

    Parameters
    ----------
    figure : Figure
        Drawn under the project's style.
    caption : str
        What it shows, in words.
    series : sequence of Series, optional
        What can be read off; left out, every drawn line with its axes' names.
    narrow, cursor : bool
        See `Picture`.
    """
    from isotherm.figures_style import figure_bytes

    svg = figure_bytes(figure, "svg").decode("utf-8")
    wide, high = (float(v) * POINTS_PER_INCH for v in figure.get_size_inches())
    found = _all_series(figure) if series is None else tuple(series)
    return Picture(_bare(svg), wide, high, found, caption, narrow, cursor)


def place(axes: Axes, x: FloatArray, y: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return where data points of some axes lie in the picture, points from left and top."""
    figure: Any = axes.figure
    pixels = axes.transData.transform(np.column_stack([x, y]))
    scale = POINTS_PER_INCH / float(figure.dpi)
    height = float(figure.get_size_inches()[1]) * POINTS_PER_INCH
    return pixels[:, 0] * scale, height - pixels[:, 1] * scale


def _bare(svg: str) -> str:
    """Keep the drawing alone: no prolog, metadata, comments, or size of its own."""
    body = svg[svg.index("<svg") :]
    body = re.sub(r"<!--.*?-->", "", body, flags=re.S)
    body = re.sub(r"<metadata>.*?</metadata>", "", body, flags=re.S)
    head, close, rest = body.partition(">")
    head = re.sub(r'\s(?:width|height|version|xmlns(?::\w+)?)="[^"]*"', "", head)
    return re.sub(r"\n\s*", "\n", f"{head}{close}{rest}".replace("xlink:href", "href")).strip()


def _all_series(figure: Figure) -> tuple[Series, ...]:
    found: list[Series] = []
    for axes in figure.get_axes():
        named: dict[Any, str] = {}
        for container in axes.containers:
            lines = getattr(container, "lines", None)
            if lines and lines[0] is not None:
                named[lines[0]] = str(container.get_label() or "")
        for line in axes.get_lines():
            if line.get_transform() != axes.transData or not line.get_visible():
                continue
            data = np.asarray(line.get_xydata(), dtype=np.float64)
            label = named.get(line, str(line.get_label()))
            one = _line_series(axes, "" if label.startswith("_") else label, data)
            if one is not None:
                found.append(one)
        for scattered in axes.collections:
            offsets = np.asarray(scattered.get_offsets(), dtype=np.float64)
            if offsets.ndim == 2 and scattered.get_offset_transform() == axes.transData:
                label = str(scattered.get_label())
                one = _line_series(axes, "" if label.startswith("_") else label, offsets)
                if one is not None:
                    found.append(one)
    return tuple(found)


def _line_series(axes: Axes, label: str, data: FloatArray) -> Series | None:
    """Points of one line within its axes; None for guides of two points and for nothing."""
    if data.ndim != 2 or data.shape[0] in (0, 2):
        return None
    (left, right), (low, high) = sorted(axes.get_xlim()), sorted(axes.get_ylim())
    with np.errstate(invalid="ignore"):
        across = (data[:, 0] >= left) & (data[:, 0] <= right)
        kept = data[across & (data[:, 1] >= low) & (data[:, 1] <= high)]
    if kept.shape[0] == 0:
        return None
    if kept.shape[0] > MOST_POINTS:
        kept = kept[np.linspace(0, kept.shape[0] - 1, MOST_POINTS).round().astype(np.int64)]
    x, y = place(axes, kept[:, 0], kept[:, 1])
    names = (_axis_name(axes.get_xlabel() or _shared_label(axes)), _axis_name(axes.get_ylabel()))
    ends = ((left, right), (low, high))
    said = tuple(
        ", ".join(
            f"{name} {value:.{_places(span)}f} {unit}".strip()
            for (name, unit), value, span in zip(names, row, ends, strict=True)
        )
        for row in kept
    )
    return Series(plain_label(label), x, y, said)


def _shared_label(axes: Axes) -> str:
    """The horizontal label of axes that share theirs with others below."""
    for other in axes.get_shared_x_axes().get_siblings(axes):
        if other.get_xlabel():
            return str(other.get_xlabel())
    return ""


def _axis_name(label: str) -> tuple[str, str]:
    """Split `area per molecule A (nm²)` or `area A / nm²` into its name and unit."""
    plain = plain_label(label)
    name, slash, unit = plain.rpartition(" / ")
    if slash:
        return name.strip(), unit.strip()
    name, bracket, rest = plain.rpartition("(")
    if bracket and rest.endswith(")"):
        return name.strip(), rest[:-1]
    return plain, ""


def _places(span: tuple[float, float]) -> int:
    """Decimals that tell a five-hundredth of an axis apart."""
    width = abs(span[1] - span[0])
    return max(0, min(9, 2 - math.floor(math.log10(width)))) if width > 0 else 3
