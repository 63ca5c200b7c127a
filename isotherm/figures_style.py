"""How the project's figures look, and their bytes: the same bytes for the same result."""

from __future__ import annotations

import io
from contextlib import AbstractContextManager
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = [
    "ACCENT",
    "BAND_LIGHT",
    "BAND_SHADED",
    "FAINT",
    "INK",
    "RUN_COLOURS",
    "RUN_DASHES",
    "SECOND",
    "figure_bytes",
    "plain",
    "style",
]

# Dark to light in steps of lightness, so that they stay apart in print without colour; blue and
# orange stay apart for every common kind of colour blindness.
INK = "#14213d"
ACCENT = "#b5520b"
SECOND = "#2f6f9f"
FAINT = "#8d99a6"
BAND_LIGHT = "#f4f5f7"
BAND_SHADED = "#e3e7ec"

# Several runs on one axis are told apart by colour and by dash, never by colour alone.
RUN_COLOURS = ("#14213d", "#b5520b", "#2f6f9f", "#7a5195", "#5f6b3a", "#4d4d4d")
RUN_DASHES: tuple[Any, ...] = (
    "-",
    (0, (6, 1.5)),
    (0, (4, 1.5, 1, 1.5)),
    (0, (1, 1)),
    (0, (8, 1.5, 1, 1.5, 1, 1.5)),
    (0, (3, 3)),
)

_STYLE: dict[str, Any] = {
    "font.family": ["DejaVu Sans"],  # ships with matplotlib: the same on every machine
    "font.size": 9.0,
    "axes.labelsize": 9.0,
    "xtick.labelsize": 8.0,
    "ytick.labelsize": 8.0,
    "axes.titlesize": 10.5,
    "axes.titlelocation": "left",
    "axes.edgecolor": INK,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.8,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.unicode_minus": True,
    "xtick.color": INK,
    "ytick.color": INK,
    "xtick.direction": "out",
    "ytick.direction": "out",
    "text.color": INK,
    "lines.linewidth": 1.5,
    "lines.solid_capstyle": "round",
    "hatch.linewidth": 0.5,
    "hatch.color": FAINT,
    # hinted glyphs change width with resolution, and labels are placed by measured widths
    "text.hinting": "no_hinting",
    "figure.dpi": 160.0,
    "figure.facecolor": "white",
    "savefig.facecolor": "white",
    "path.simplify": True,
    "svg.fonttype": "path",  # labels were placed by measured widths: keep the glyphs measured
    "svg.hashsalt": "upstroke",  # element names that do not change from run to run
    "pdf.fonttype": 42,
}


def style() -> AbstractContextManager[None]:
    """Return the context in which every figure is built and saved."""
    import matplotlib

    # a user's own matplotlib settings must not change what a result looks like
    settings: Any = {
        key: value
        for key, value in matplotlib.rcParamsDefault.items()
        if not str(key).startswith(("backend", "interactive", "toolbar", "webagg", "keymap"))
    }
    settings.update(_STYLE)
    context: AbstractContextManager[None] = matplotlib.rc_context(settings)
    return context


def plain(text: str) -> str:
    r"""Return words from an input as a figure shows them: no mathematics, no control characters.

    >>> plain("100 $ of $x_1$")
    '100 \\$ of \\$x_1\\$'
    >>> plain("_run1\n")
    ' _run1\\n'
    """
    shown = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in text)
    # matplotlib leaves labels that begin with an underscore out of legends
    return (" " if shown.startswith("_") else "") + shown.replace("$", r"\$")


def figure_bytes(figure: Figure, suffix: str) -> bytes:
    """Return a figure as a file's bytes, without dates or names of the day.

    Parameters
    ----------
    figure : Figure
        Drawn under `style()`.
    suffix : str
        "svg", "png" or "pdf".
    """
    metadata: dict[str, dict[str, Any]] = {
        "svg": {"Date": None, "Creator": None},
        "png": {"Software": None},
        "pdf": {"CreationDate": None, "Creator": None, "Producer": None},
    }
    buffer = io.BytesIO()
    with style():
        figure.savefig(buffer, format=suffix, metadata=metadata[suffix])
    return buffer.getvalue()
