"""`upstroke oscillation`: complex dilational modulus from oscillating barriers."""

from __future__ import annotations

from typing import Annotated

import typer

from cli.options import (
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    IsothermOption,
    IsothermSheetOption,
    JsonOption,
    ReportOption,
    SheetOption,
    TraceArgument,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def oscillation(
    trace: TraceArgument,
    sheet: SheetOption = None,
    delay: Annotated[
        str | None,
        typer.Option(
            "--delay",
            metavar="TIME",
            help="By which pressure readings lag area readings, such as '0.2 ± 0.05 s'.",
        ),
    ] = None,
    isotherm: IsothermOption = None,
    isotherm_sheet: IsothermSheetOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Storage and loss modulus per frequency, linearity.

    For records of oscillating barriers: fits the sinusoids of every stretch of constant frequency and
    amplitude, checks that the response is linear, and compares with the isotherm's own modulus.

    \b
    Example:
      upstroke oscillation waves.csv --sheet run.toml --isotherm run.txt --figure waves.svg
    """
    from cli.film import film_isotherm, film_settings
    from cli.inputs import load_sheet, read_quantity
    from cli.outputs import OutputChoice, plan_outputs
    from cli.single import deliver_one

    inputs = [path for path in (trace, sheet, isotherm, isotherm_sheet) if path is not None]
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force=force), inputs)
    lag = None if delay is None else read_quantity(delay, "time", option="--delay")

    from cli.oscillation_text import oscillation_text
    from isotherm.oscillation import analyse_oscillation
    from isotherm.oscillation_figure import figure_oscillation
    from isotherm.trace_read import read_trace

    run_sheet = load_sheet(sheet, column)
    film = film_isotherm(isotherm, isotherm_sheet, run_sheet)
    result = analyse_oscillation(read_trace(trace, run_sheet), isotherm=film, delay=lag)
    told = None if lag is None else lag.to_json()
    deliver_one(
        plan,
        result.to_json(),
        film_settings("oscillation", sheet, column, film, isotherm_sheet, delay=told),
        text=lambda width: oscillation_text(result, width),
        rows=result.rows,
        figure=lambda: figure_oscillation(result),
    )
