"""What the commands on one run share: from options to outputs."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import partial
from typing import TYPE_CHECKING, Any

from cli.outputs import OutputPlan, Renderers

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from cli.page_figure import Picture

__all__ = ["deliver_one"]


def deliver_one(
    plan: OutputPlan,
    payload: dict[str, Any],
    settings: dict[str, Any],
    *,
    text: Callable[[int], str],
    rows: Callable[[], Sequence[dict[str, Any]]],
    figure: Callable[[], Figure] | None = None,
    pictures: Callable[[], Sequence[Sequence[Picture]]] | None = None,
) -> None:
    """Write what was asked for.

    Parameters
    ----------
    plan : OutputPlan
        Checked outputs.
    payload : dict
        JSON form of the result.
    settings : dict
        What the JSON records of the options.
    text : callable
        Takes the width of the terminal and returns the printed form.
    rows : callable
        Returns the rows of the CSV.
    figure : callable, optional
        Returns the figure.
    pictures : callable, optional
        Returns the page's own pictures of the result; left out, those its JSON form allows.
    """
    from cli.serialise import json_bytes, rows_csv, with_provenance
    from cli.terminal import terminal_width

    def whole() -> dict[str, Any]:
        return with_provenance(payload, settings)

    def paged() -> bytes:
        from cli.page import one_page
        from cli.page_plots import result_pictures

        told = whole()
        drawn = [result_pictures(told)] if pictures is None else pictures()
        return one_page(told, figure, drawn)

    plan.deliver(
        Renderers(
            text=lambda: text(terminal_width()),
            json=lambda: json_bytes(whole()),
            csv=lambda: rows_csv(rows()),
            figure=None if figure is None else partial(_drawn, figure),
            report=paged,
        )
    )


def _drawn(figure: Callable[[], Figure], suffix: str) -> bytes:
    from isotherm.figures_style import figure_bytes

    return figure_bytes(figure(), suffix)
