"""`upstroke temperature`: isotherms of one film at several temperatures."""

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
def temperature(
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
    """Slope and heat of the transition, critical point, trends.

    Isotherms of one film at several temperatures; the temperature comes from each run's own sheet or
    its temperature column. Heat by the two-dimensional Clapeyron relation, with and without the
    subphase's own entropy.

    \b
    Example:
      upstroke temperature t15.txt t20.txt t25.txt t30.txt --figure heat.svg
    """
    from cli.outputs import OutputChoice
    from cli.series import deliver, gather

    pressures = None if at is None else parse_numbers(at, option="--at")
    series = gather(
        "temperature",
        traces,
        sheet,
        column,
        OutputChoice(json, csv, figure, report, force=force),
        keep_going=keep_going,
        jobs=jobs,
        pressures=None if pressures is None else list(pressures),
    )

    from cli.temperature_text import temperature_text
    from isotherm.temperature import analyse_temperature
    from isotherm.temperature_figure import figure_temperature

    result = analyse_temperature(series.results, series.sheets(), pressures=pressures)
    deliver(
        series,
        result,
        text=lambda width: temperature_text(result, width),
        figure=lambda: figure_temperature(result, series.results),
    )
