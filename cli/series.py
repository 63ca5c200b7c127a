"""What the commands on series of runs share: options to results, results to outputs."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

import typer

from cli.outputs import OutputChoice, OutputPlan, Renderers, plan_outputs
from cli.runs import Run, analyse_runs, find_runs, run_inputs, run_settings, run_sheet

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from isotherm.result import IsothermResult
    from isotherm.sheet import RunSheet

__all__ = ["Series", "SeriesResult", "deliver", "gather"]

USUAL_AT = (10.0, 20.0, 30.0, 40.0)  # mN/m


class SeriesResult(Protocol):
    """What a series' analysis returns, as far as the outputs need it."""

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        ...

    def rows(self) -> Sequence[dict[str, Any]]:
        """Return the rows of the CSV."""
        ...


@dataclass(frozen=True)
class Series:
    """The runs of a series, analysed, and where the outputs go."""

    command: str
    plan: OutputPlan
    runs: list[Run]
    results: list[IsothermResult]
    settings: dict[str, Any]
    failed: int

    def sheets(self) -> list[RunSheet]:
        """Return the sheet of each run."""
        return [run_sheet(run) for run in self.runs]


def gather(
    command: str,
    traces: Sequence[Path],
    sheet: Path | None,
    columns: Sequence[str] | None,
    choice: OutputChoice,
    *,
    keep_going: bool,
    jobs: int,
    at: tuple[float, ...] = USUAL_AT,
    **settings: Any,
) -> Series:
    """Check the outputs, then read and analyse every run, each with its own sheet or the common one.

    Raises
    ------
    UpstrokeError
        An output cannot be written, or a run cannot be analysed.
    """
    runs = find_runs(traces, sheet, columns, at, own_sheets=True)
    plan = plan_outputs(choice, run_inputs(runs))
    found = analyse_runs(runs, keep_going=keep_going, jobs=jobs)
    return Series(
        command,
        plan,
        found.done,
        found.results,
        run_settings(command, found.done, **settings),
        found.failed,
    )


def deliver(
    series: Series,
    result: SeriesResult,
    *,
    text: Callable[[int], str],
    figure: Callable[[], Figure],
) -> None:
    """Write what was asked for; a run left out makes the exit status 1.

    Parameters
    ----------
    series : Series
        As gathered.
    result : SeriesResult
        What the analysis found.
    text : callable
        Takes the width of the terminal and returns the printed form.
    figure : callable
        Returns the figure.
    """
    from cli.serialise import json_bytes, rows_csv, with_provenance
    from cli.terminal import terminal_width

    def drawn(suffix: str) -> bytes:
        from isotherm.figures_style import figure_bytes

        return figure_bytes(figure(), suffix)

    def paged() -> bytes:
        from cli.page import one_page

        return one_page(with_provenance(result.to_json(), series.settings), figure)

    series.plan.deliver(
        Renderers(
            text=lambda: text(terminal_width()),
            json=lambda: json_bytes(with_provenance(result.to_json(), series.settings)),
            csv=lambda: rows_csv(result.rows()),
            figure=drawn,
            report=paged,
        )
    )
    if series.failed:
        raise typer.Exit(1)
