"""The stack to scale: one slab a stroke, as high as its layer is thick and as wide as it covers."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from isotherm.figures_style import ACCENT, BAND_SHADED, FAINT, INK, plain

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from transfer.result import Layer, TransferResult

__all__ = ["draw_stack"]

_SUBSTRATE: Final = 0.05  # height drawn for the substrate, share of the stack


def draw_stack(axes: Axes, result: TransferResult) -> None:
    """Draw the ledger from the substrate up.

    Each slab is one stroke's layer: its height the layer's thickness (one layer where that is unknown),
    its width the part of the substrate it covers, as the ratio says; down-strokes shaded, up-strokes
    white. A stroke that gave film back is drawn as a bar below the surface it left.
    """
    from matplotlib.patches import Rectangle

    ledger = result.stack.ledger
    directions = {s.number: s.direction for s in result.strokes}
    known = bool(ledger) and all(layer.thickness is not None for layer in ledger)
    heights = [_height(layer, known) for layer in ledger]
    total = sum(h for h in heights if h > 0) or 1.0
    substrate = _SUBSTRATE * total
    axes.add_patch(
        Rectangle(
            (0.0, -substrate), 1.0, substrate, facecolor=FAINT, edgecolor=INK, hatch="///", lw=0.6
        )
    )
    base = 0.0
    for layer, height in zip(ledger, heights, strict=True):
        cover = layer.layers.value
        if height <= 0:
            continue
        down = directions.get(layer.stroke) == "down"
        axes.add_patch(
            Rectangle(
                (0.0, base),
                max(min(cover, 1.3), 0.01),
                height,
                facecolor=BAND_SHADED if down else "white",
                edgecolor=INK if cover > 0 else ACCENT,
                lw=0.6,
            )
        )
        base += height
    axes.set_xlim(0.0, 1.42)
    axes.set_ylim(-substrate, 1.1 * max(base, 0.1))
    axes.axvline(1.0, color=FAINT, lw=0.8, ls="--")
    axes.set_xlabel("part of the substrate covered")
    axes.set_ylabel("height (nm), layers full" if known else "layers")
    every = max(1, -(-len(ledger) // 12))
    several = len({layer.film for layer in ledger}) > 1
    level = 0.0
    for k, (layer, height) in enumerate(zip(ledger, heights, strict=True)):
        if height <= 0:
            continue
        if k % every == 0:
            words = f"{layer.stroke} {layer.film}" if several else f"stroke {layer.stroke}"
            axes.text(1.06, level + 0.5 * height, plain(words), fontsize=7, va="center")
        level += height
    said = f"{result.stack.layers} layers"
    if result.stack.thickness is not None:
        said += f", {result.stack.thickness}"
    axes.set_title(f"stack: {said}", fontsize=8.5)


def _height(layer: Layer, known: bool) -> float:
    """Height of one whole layer: the thickness it added over the part it covers."""
    covered = layer.layers.value
    if abs(covered) < 0.05:
        return 0.0
    if known and layer.thickness is not None:
        return abs(layer.thickness.value / covered) if covered > 0 else 0.0
    return 1.0 if covered > 0 else 0.0
