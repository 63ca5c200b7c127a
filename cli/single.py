"""What the commands on one run share: from options to outputs."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

from cli.outputs import OutputPlan, Renderers

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from cli.page_figure import Picture

__all__ = ["deliver_one"]


def deliver_one(
    plan: OutputPlan,
    payload: dict[str, Any] | list[dict[str, Any]],
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
    payload : dict or list of dict
        JSON forms of the result or results.
    settings : dict
        What the JSON records of the options.
    text : callable
        Takes the width of the terminal and returns the printed form.
    rows : callable
        Returns the rows of the CSV.
    figure : callable, optional
        Returns the figure.
    pictures : callable, optional
        Returns the page's own pictures of each result; left out, those its JSON form allows.
    """
    from cli.serialise import json_bytes, rows_csv, with_provenance
    from cli.terminal import terminal_width

    def whole() -> dict[str, Any] | list[dict[str, Any]]:
        if isinstance(payload, list):
            return [with_provenance(one, settings) for one in payload]
        return with_provenance(payload, settings)

    def paged() -> bytes:
        from cli.page import one_page
        from cli.page_plots import result_pictures

        told = whole()
        results = told if isinstance(told, list) else [told]
        drawn = [result_pictures(one) for one in results] if pictures is None else pictures()
        return one_page(told, figure, drawn)

    def drawn(suffix: str) -> bytes:
        from isotherm.figures_style import figure_bytes

        if figure is None:
            raise TypeError("this command draws no figure")
        return figure_bytes(figure(), suffix)

    plan.deliver(
        Renderers(
            text=lambda: text(terminal_width()),
            json=lambda: json_bytes(whole()),
            csv=lambda: rows_csv(rows()),
            figure=drawn,
            report=paged,
        )
    )
