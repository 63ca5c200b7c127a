"""`upstroke mixture`: mixtures compared with their components."""

from __future__ import annotations

import typer

from cli.options import (
    ColumnOption,
    CommonSheetOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JobsOption,
    JsonOption,
    KeepGoingOption,
    PressuresOption,
    ReportOption,
    TracesArgument,
    parse_numbers,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def mixture(
    traces: TracesArgument,
    sheet: CommonSheetOption = None,
    at: PressuresOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
    keep_going: KeepGoingOption = False,
    jobs: JobsOption = 1,
) -> None:
    """Excess area and Gibbs energy of mixtures, miscibility.

    Isotherms of two or more components and of their mixtures, each with its own run sheet that gives
    the mole fractions. Condensation or expansion is stated with its significance, not by sign alone.

    \b
    Example:
      upstroke mixture pure-a.txt half.txt pure-b.txt --at 10,20,30 --figure mixing.svg
    """
    from cli.outputs import OutputChoice
    from cli.series import deliver, gather

    pressures = None if at is None else parse_numbers(at, option="--at")
    series = gather(
        "mixture",
        traces,
        sheet,
        column,
        OutputChoice(json, csv, figure, report, force=force),
        keep_going=keep_going,
        jobs=jobs,
        pressures=None if pressures is None else list(pressures),
    )

    from cli.mixture_text import mixture_text
    from isotherm.mixture import analyse_mixture
    from isotherm.mixture_figure import figure_mixture

    result = analyse_mixture(series.results, series.sheets(), pressures=pressures)
    deliver(
        series,
        result,
        text=lambda width: mixture_text(result, width),
        figure=lambda: figure_mixture(result),
    )
