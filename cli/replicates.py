"""`upstroke replicates`: what repeated runs of one film say together."""

from __future__ import annotations

from typing import Annotated

import typer

from cli.options import (
    AtOption,
    ColumnOption,
    CommonSheetOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JobsOption,
    JsonOption,
    KeepGoingOption,
    ReportOption,
    TracesArgument,
    parse_numbers,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def replicates(
    traces: TracesArgument,
    sheet: CommonSheetOption = None,
    at: AtOption = "10,20,30,40",
    drop: Annotated[
        list[str] | None,
        typer.Option("--drop", metavar="RUN", help="Leave a run out of the averages. Repeat."),
    ] = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
    keep_going: KeepGoingOption = False,
    jobs: JobsOption = 1,
) -> None:
    """Mean curve, spread of every feature, outlying runs.

    Repeated runs of one film: each feature's mean, standard deviation and Student-t interval, and what
    is common to all runs kept apart. Outlying runs are named, with the reason, and kept unless dropped.

    \b
    Examples:
      upstroke replicates run1.txt run2.txt run3.txt --sheet film.toml
      upstroke replicates runs/ -s film.toml --csv runs.csv --figure runs.svg --jobs 2
    """
    from cli.outputs import OutputChoice
    from cli.series import deliver, gather

    pressures = parse_numbers(at, option="--at")
    series = gather(
        "replicates",
        traces,
        sheet,
        column,
        OutputChoice(json, csv, figure, report, force=force),
        keep_going=keep_going,
        jobs=jobs,
        at=pressures,
        drop=list(drop or []),
    )

    from cli.replicates_text import replicates_text
    from isotherm.replicates import analyse_replicates
    from isotherm.replicates_figure import figure_replicates

    result = analyse_replicates(series.results, drop=drop or ())
    deliver(
        series,
        result,
        text=lambda width: replicates_text(result, width),
        figure=lambda: figure_replicates(result),
    )
