"""`upstroke check`: surface, probe and barriers before a film is spread."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from cli.options import (
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JsonOption,
    ReportOption,
    SheetOption,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def check(
    records: Annotated[
        list[Path] | None,
        typer.Argument(
            metavar="RECORD",
            help="Records of the bare subphase: compressed, and with the barriers still.",
        ),
    ] = None,
    sheet: SheetOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Clean surface, steady probe, true barriers, before a film.

    Judges each item against its limit with its uncertainty: pass, fail or undecided. The JSON can be
    given to other commands with --check, which then carry the zero and drift found here.

    \b
    Example:
      upstroke check bare.csv still.csv --sheet run.toml --json check.json
    """
    from cli.film import record_settings
    from cli.inputs import load_sheet
    from cli.outputs import OutputChoice, plan_outputs
    from cli.single import deliver_one

    given = list(records or [])
    if not given and sheet is None:
        raise typer.BadParameter("give a record of the bare subphase, or a sheet with [check]")
    inputs = [*given, *([sheet] if sheet else [])]
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force), inputs)

    from cli.check_text import check_rows, check_text
    from isotherm.check import read_check
    from isotherm.check_figure import figure_check

    result = read_check(given, load_sheet(sheet, column))
    deliver_one(
        plan,
        result.to_json(),
        record_settings("check", sheet, column),
        text=lambda width: check_text(result, width),
        rows=lambda: check_rows(result),
        figure=lambda: figure_check(result),
    )
