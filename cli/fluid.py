"""`upstroke fluid`: Volmer's equation on the fluid branch of an isotherm."""

from __future__ import annotations

import typer

from cli.options import (
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JsonOption,
    ReportOption,
    SheetOption,
    TraceArgument,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def fluid(
    trace: TraceArgument,
    sheet: SheetOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Co-area and cohesion of the fluid branch, gaseous limit.

    Fits Volmer's equation from lift-off to the first transition, tests whether it holds, and extends
    the product of pressure and area to zero pressure.

    \b
    Example:
      upstroke fluid run.txt --sheet run.toml --figure fluid.svg
    """
    from cli.film import record_settings
    from cli.inputs import load_sheet
    from cli.outputs import OutputChoice, plan_outputs
    from cli.single import deliver_one

    inputs = [path for path in (trace, sheet) if path is not None]
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force=force), inputs)

    from cli.fluid_text import fluid_text
    from isotherm.analysis import analyse
    from isotherm.fluid import analyse_fluid
    from isotherm.fluid_figure import figure_fluid
    from isotherm.trace_read import read_trace

    read = read_trace(trace, load_sheet(sheet, column))
    result = analyse_fluid(read, analyse(read))
    deliver_one(
        plan,
        result.to_json(),
        record_settings("fluid", sheet, column),
        text=lambda width: fluid_text(result, width),
        rows=result.rows,
        figure=lambda: figure_fluid(result),
    )
