"""The evidence as a picture: one panel per kind, and what all of them say together."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from isotherm.figures_style import ACCENT, BAND_SHADED, FAINT, INK, SECOND, plain, style
from isotherm.quantity import COVERAGE_FACTOR, format_quantity
from transfer.evidence_result import EvidenceResult, KindResult

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["draw_evidence"]

_PER_ROW = 3
_PANEL_WIDTH = 3.5
_PANEL_HEIGHT = 2.9
# Units a reader of the axis expects, and the factor from the result's unit to it.
_SHOWN = {
    "mol/cm^2": (1e12, "pmol/cm²"),
    "cm^2/µF": (1.0, "cm²/µF"),
    "1": (1.0, ""),
    "Hz": (1.0, "Hz"),
}
_NANOMOLES = 2e-9  # mol/cm^2; above, pmol/cm^2 would need five digits
_AXES = {
    "absorbance": "absorbance",
    "frequency": "frequency change Δf",
    "thickness": "thickness",
    "thickness of a layer": "thickness of a layer d",
    "coverage": "electroactive coverage Γ",
    "1/C": "inverse capacitance 1/C",
}


def draw_evidence(result: EvidenceResult) -> Figure:
    """Draw every kind's points, line, bend and expectation, and the layers implied by all.

    Parameters
    ----------
    result : EvidenceResult

    Returns
    -------
    Figure
        For `isotherm.figures_style.figure_bytes`.
    """
    import matplotlib

    with style(), matplotlib.rc_context({"figure.constrained_layout.use": True}):
        from matplotlib.figure import Figure as NewFigure

        panels = len(result.kinds) + 1
        columns = 2 if panels <= 4 else _PER_ROW
        rows = math.ceil(panels / columns)
        figure = NewFigure(figsize=(_PANEL_WIDTH * columns, _PANEL_HEIGHT * rows + 0.5))
        grid = figure.add_gridspec(rows, columns)
        axes = [figure.add_subplot(grid[n // columns, n % columns]) for n in range(panels - 1)]
        # the joint panel takes what is left of its row
        axes.append(figure.add_subplot(grid[rows - 1, (panels - 1) % columns :]))
        for axis, kind in zip(axes, result.kinds, strict=False):
            _draw_kind(axis, kind)
        _draw_layers(axes[-1], result)
        figure.suptitle(
            _wrapped(plain(result.joint.statement), 36 * columns), fontsize=10.0, x=0.01, ha="left"
        )
        return figure


def _wrapped(text: str, width: int) -> str:
    import textwrap

    return "\n".join(textwrap.wrap(text, max(width, 40)))


def _scale(unit: str, largest: float) -> tuple[float, str]:
    """Factor and unit for an axis whose largest value is `largest` (in the result's unit)."""
    if unit == "mol/cm^2" and largest > _NANOMOLES:
        return 1e9, "nmol/cm²"
    return _SHOWN.get(unit, (1.0, unit))


def _draw_kind(axis: Axes, kind: KindResult) -> None:
    factor, unit = _scale(kind.unit, float(np.max(np.abs(kind.y))))
    name = _AXES.get(kind.symbol, kind.symbol)
    axis.set_xlabel("layers by transfer ratio N")
    axis.set_ylabel(f"{name} ({unit})" if unit else name)
    colour = INK if kind.consistent else ACCENT
    if kind.expected is not None:
        axis.plot(
            kind.expected[:, 0],
            kind.expected[:, 1] * factor,
            color=FAINT,
            linestyle=(0, (4, 2)),
            linewidth=1.4,
            label="expected",
            zorder=1,
        )
    elif kind.expected_increment is not None and kind.drawn is None:
        value = kind.expected_increment.value * factor
        axis.axhline(value, color=FAINT, linestyle=(0, (4, 2)), linewidth=1.4, label="run sheet")
        if kind.expected_increment.u:
            half = COVERAGE_FACTOR * kind.expected_increment.u * factor
            axis.axhspan(value - half, value + half, color=BAND_SHADED, zorder=0)
    if kind.drawn is not None:
        axis.plot(
            kind.drawn[:, 0], kind.drawn[:, 1] * factor, color=colour, label="fitted", zorder=2
        )
    error: Any = None if kind.u is None else COVERAGE_FACTOR * kind.u * factor
    axis.errorbar(
        kind.x,
        kind.y * factor,
        xerr=COVERAGE_FACTOR * kind.u_x,
        yerr=error,
        fmt="o" if kind.consistent else "s",
        color=colour,
        markersize=4.5,
        markerfacecolor="white",
        elinewidth=1.0,
        capsize=2.0,
        linestyle="none",
        zorder=3,
    )
    if kind.bend is not None:
        axis.axvline(kind.bend.layers, color=ACCENT, linewidth=0.9, linestyle=(0, (1, 1.5)))
        axis.text(
            kind.bend.layers,
            1.0,
            f" bends after stroke {kind.bend.after_stroke} ",
            transform=axis.get_xaxis_transform(),
            color=ACCENT,
            fontsize=7.5,
            va="bottom",
            ha="center",
        )
    verdict = "agrees" if kind.consistent else "disagrees"
    title = plain(f"{kind.label}: {verdict}")
    axis.set_title(title, color=colour, fontsize=9.5, pad=14.0 if kind.bend is not None else 6.0)
    _room(axis, kind, factor)
    if kind.drawn is not None:
        falls = kind.drawn[-1, 1] < kind.drawn[0, 1]
        axis.legend(
            frameon=False,
            fontsize=7.5,
            loc="lower left" if falls else "upper left",
            borderaxespad=0.2,
            handlelength=1.8,
        )
        if kind.ratio is not None:
            axis.text(
                0.98,
                0.97 if falls else 0.04,
                f"found/expected {format_quantity(kind.ratio)}",
                transform=axis.transAxes,
                fontsize=7.5,
                ha="right",
                va="top" if falls else "bottom",
            )


def _room(axis: Axes, kind: KindResult, factor: float) -> None:
    """Leave room above (or below) for the legend, and start the layers at zero."""
    reach = float(np.max(kind.x))
    axis.set_xlim(-0.04 * max(reach, 1.0), 1.08 * max(reach, 1.0))
    if kind.drawn is None:
        low, high = axis.get_ylim()
        span = high - low
        axis.set_ylim(low - 0.5 * span, high + 0.5 * span)


def _draw_layers(axis: Axes, result: EvidenceResult) -> None:
    """Layers implied by each kind, with the ledger's and the best estimate."""
    joint = result.joint
    rows = [k for k in result.kinds if k.layers is not None]
    names = ["transfer ratios"] + [k.label for k in rows]
    values = [joint.ledger_layers] + [k.layers for k in rows if k.layers is not None]
    named = set(joint.disagrees)
    for place, (name, quantity) in enumerate(zip(names, values, strict=True)):
        wrong = name in named or any(k.label == name and not k.consistent for k in rows)
        axis.errorbar(
            [quantity.value],
            [-place],
            xerr=None if quantity.u is None else [COVERAGE_FACTOR * quantity.u],
            fmt="s" if wrong else "o",
            color=ACCENT if wrong else INK,
            markersize=4.5,
            markerfacecolor="white",
            capsize=2.0,
            elinewidth=1.0,
        )
    if joint.layers is not None and joint.layers.u is not None:
        best, half = joint.layers.value, COVERAGE_FACTOR * joint.layers.u
        axis.axvspan(best - half, best + half, color=BAND_SHADED, zorder=0)
        axis.axvline(best, color=SECOND, linewidth=1.2, zorder=1)
        axis.text(
            best,
            1.0,
            f"best {format_quantity(joint.layers)}",
            transform=axis.get_xaxis_transform(),
            color=SECOND,
            fontsize=7.5,
            ha="center",
            va="bottom",
        )
    axis.set_yticks([-float(n) for n in range(len(names))], [plain(name) for name in names])
    axis.set_ylim(-len(names) + 0.4, 0.6)
    axis.set_xlabel("layers implied at the end (bars: ± 2 u)")
    axis.set_title("Together", fontsize=9.5, pad=14.0)
    axis.tick_params(axis="y", length=0)
