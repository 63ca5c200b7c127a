"""`upstroke target`: the surface pressure to dip at, and the film it takes."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from cli.options import (
    CheckOption,
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JsonOption,
    NeededSheetOption,
    ReportOption,
    TraceArgument,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def target(
    trace: TraceArgument,
    sheet: NeededSheetOption,
    holds: Annotated[
        list[Path] | None,
        typer.Option("--hold", metavar="RECORD", help="Record of the film held. Repeat."),
    ] = None,
    check: CheckOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Dipping pressure, what binds it, and the film budget.

    Which pressures each rule of the sheet's [target] allows, the one deepest inside all of them, how it
    moves with its inputs, and the plan to take to the trough: film, strokes, renewals, areas, time.

    \b
    Examples:
      upstroke target run.txt --sheet run.toml
      upstroke target run.txt -s run.toml --hold held30.csv --figure target.svg --csv plan.csv
    """
    from cli.film import record_settings
    from cli.inputs import load_sheet
    from cli.outputs import OutputChoice, plan_outputs
    from cli.serialise import input_stamp
    from cli.single import deliver_one

    inputs = [trace, sheet, *(holds or []), *([check] if check else [])]
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force=force), inputs)

    from dataclasses import replace

    from cli.target_csv import plan_rows
    from cli.target_text import target_text
    from isotherm.analysis import analyse
    from isotherm.check_result import load_check
    from isotherm.hold import analyse_hold
    from isotherm.hold_read import read_hold
    from isotherm.trace_read import read_trace
    from transfer.target import choose_target
    from transfer.target_figure import target_figure

    run_sheet = load_sheet(sheet, column)
    # what the sheet says of columns is about the isotherm
    hold_sheet = replace(run_sheet, columns=())
    before = None if check is None else load_check(check)
    held = tuple(
        analyse_hold(read_hold(path, hold_sheet), hold_sheet, check=before) for path in holds or []
    )
    found = analyse(read_trace(trace, run_sheet))
    result = choose_target(found, run_sheet, holds=held, check=before)
    deliver_one(
        plan,
        result.to_json(),
        record_settings("target", sheet, column, holds=[input_stamp(path) for path in holds or []]),
        text=lambda width: target_text(result, width),
        rows=lambda: plan_rows(result),
        figure=lambda: target_figure(result),
    )
