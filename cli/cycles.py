"""`upstroke cycles`: repeated compression and expansion of one film."""

from __future__ import annotations

import typer

from cli.options import (
    AtOption,
    CheckOption,
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JsonOption,
    ReportOption,
    SheetOption,
    TraceArgument,
    parse_numbers,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def cycles(
    trace: TraceArgument,
    sheet: SheetOption = None,
    at: AtOption = "10,20,30",
    check: CheckOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Work, hysteresis and area shift from cycle to cycle.

    For a run that compresses and expands one film again and again: the work of each branch, what each
    loop does not give back, and how the area at fixed pressures moves.

    \b
    Example:
      upstroke cycles run.txt --sheet run.toml --at 10,30 --figure loops.svg
    """
    from cli.film import record_settings
    from cli.inputs import load_sheet
    from cli.outputs import OutputChoice, plan_outputs
    from cli.serialise import input_stamp
    from cli.single import deliver_one

    pressures = parse_numbers(at, option="--at")
    inputs = [path for path in (trace, sheet, check) if path is not None]
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force=force), inputs)

    from cli.cycles_text import cycles_text, shift_rows
    from isotherm.check_result import load_check
    from isotherm.cycles import analyse_cycles
    from isotherm.cycles_figure import figure_cycles
    from isotherm.trace_read import read_trace

    before = None if check is None else load_check(check)
    read = read_trace(trace, load_sheet(sheet, column))
    result = analyse_cycles(read, at=pressures, check=before)
    deliver_one(
        plan,
        result.to_json(),
        record_settings(
            "cycles",
            sheet,
            column,
            at=list(pressures),
            check=None if check is None else input_stamp(check),
        ),
        text=lambda width: cycles_text(result, width),
        rows=lambda: shift_rows(result),
        figure=lambda: figure_cycles(result),
    )
