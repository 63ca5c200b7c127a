"""`upstroke hold`: how fast a film is lost, and by which law."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from cli.options import (
    CheckOption,
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JsonOption,
    ReportOption,
    SheetOption,
)

if TYPE_CHECKING:
    from isotherm.hold_result import HoldResult

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def hold(
    records: Annotated[
        list[Path],
        typer.Argument(metavar="TRACE", help="Records of a film held at a pressure or an area."),
    ],
    sheet: SheetOption = None,
    planned: Annotated[
        str | None,
        typer.Option(
            "--over",
            metavar="TIME",
            help="Time the film is to last, such as '4 h'; else the sheet's dipping gives it.",
        ),
    ] = None,
    check: CheckOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Film stability: loss over time, and by which law.

    Finds the holds in a record (constant pressure with drifting area, or constant area with drifting
    pressure), fits the published laws of loss, and reports loss and rate averaged over them.

    \b
    Examples:
      upstroke hold held30.csv --sheet run.toml --figure held.svg
      upstroke hold held30.csv held35.csv -s run.toml --over "4 h" --json held.json
    """
    from cli.film import record_settings
    from cli.inputs import load_sheet, read_time
    from cli.outputs import OutputChoice, Renderers, plan_outputs
    from cli.serialise import input_stamp
    from isotherm.check_result import load_check
    from isotherm.hold import analyse_hold
    from isotherm.hold_read import read_hold

    seconds = None if planned is None else read_time(planned, option="--over")
    inputs = [*records, *(path for path in (sheet, check) if path is not None)]
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force), inputs)
    run_sheet = load_sheet(sheet, column)
    before = None if check is None else load_check(check)
    results = [
        analyse_hold(read_hold(path, run_sheet), run_sheet, seconds, check=before)
        for path in records
    ]
    settings = record_settings(
        "hold", sheet, column, over_s=seconds, check=None if check is None else input_stamp(check)
    )
    plan.deliver(
        Renderers(
            text=lambda: _text(results),
            json=lambda: _json(results, settings),
            csv=lambda: _csv(results),
            figure=lambda suffix: _figure(results, suffix),
            report=lambda: _report(results, settings),
        )
    )


def _text(results: list[HoldResult]) -> str:
    from cli.hold_text import hold_text
    from cli.render import join_results
    from cli.terminal import terminal_width

    width = terminal_width()
    return join_results([hold_text(result, width) for result in results], width)


def _payloads(results: list[HoldResult], settings: dict[str, Any]) -> list[dict[str, Any]]:
    from cli.serialise import with_provenance

    return [with_provenance(result.to_json(), settings) for result in results]


def _json(results: list[HoldResult], settings: dict[str, Any]) -> bytes:
    from cli.serialise import json_bytes

    payloads = _payloads(results, settings)
    return json_bytes(payloads if len(payloads) > 1 else payloads[0])


def _report(results: list[HoldResult], settings: dict[str, Any]) -> bytes:
    from cli.page import one_page
    from cli.page_figure import picture_of
    from isotherm.hold_figure import figure_hold

    caption = "The drifting quantity, the laws fitted to it, and what they leave over."
    pictures = [[picture_of(figure_hold(result), caption)] for result in results]
    return one_page(_payloads(results, settings), pictures=pictures)


def _csv(results: list[HoldResult]) -> bytes:
    from cli.hold_csv import hold_csv

    return hold_csv(results)


def _figure(results: list[HoldResult], suffix: str) -> bytes:
    """Draw the holds of all records on one sheet, numbered through."""
    from dataclasses import replace

    from isotherm.figures_style import figure_bytes
    from isotherm.hold_figure import figure_hold

    holds = [hold for result in results for hold in result.holds]
    numbered = tuple(replace(hold, number=n) for n, hold in enumerate(holds, start=1))
    return figure_bytes(figure_hold(replace(results[0], holds=numbered)), suffix)
