"""`upstroke transfer`: the transfer ratio of every stroke of a dipping log."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import typer

from cli.options import (
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    IsothermOption,
    IsothermSheetOption,
    JsonOption,
    LogArgument,
    NeededSheetOption,
    ReportOption,
)

if TYPE_CHECKING:
    from transfer.expected_stack import ExpectedStack
    from transfer.result import TransferResult

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def transfer(
    log: LogArgument,
    sheet: NeededSheetOption,
    isotherm: IsothermOption = None,
    isotherm_sheet: IsothermSheetOption = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Transfer ratio of every stroke, deposition type, layers.

    Finds strokes, dwells and renewals in a dipping log, and divides the film each stroke removed by the
    area it coated, corrected for loss of film and for pressure. Where the film's modulus is not in the
    sheet, an isotherm of the same film gives it, or else the dwells of the log do.

    \b
    Examples:
      upstroke transfer build.csv --sheet run.toml
      upstroke transfer build.csv -s run.toml --isotherm run.txt --json build.json
    """
    from cli.film import film_isotherm, film_settings
    from cli.inputs import load_sheet
    from cli.outputs import OutputChoice, Renderers, plan_outputs
    from transfer.analysis import analyse_log
    from transfer.expected_stack import expected_stack
    from transfer.log import read_log

    inputs = [path for path in (log, sheet, isotherm, isotherm_sheet) if path is not None]
    plan = plan_outputs(OutputChoice(json, csv, figure, report=report, force=force), inputs)
    run_sheet = load_sheet(sheet, column)
    film = film_isotherm(isotherm, isotherm_sheet, run_sheet)
    result = analyse_log(read_log(log, run_sheet), run_sheet, isotherm=film)
    shows = expected_stack(result, run_sheet, isotherm=film)
    settings = film_settings("transfer", sheet, column, film, isotherm_sheet)
    plan.deliver(
        Renderers(
            text=lambda: _text(result, shows),
            json=lambda: _json(result, shows, settings),
            csv=lambda: _csv(result),
            figure=lambda suffix: _figure(result, suffix),
            report=lambda: _report(result, shows, settings),
        )
    )


def _text(result: TransferResult, shows: ExpectedStack) -> str:
    from cli.evidence_text import expected_block
    from cli.terminal import terminal_width
    from cli.transfer_text import transfer_text

    width = terminal_width()
    return transfer_text(result, width, expected_block(shows, width))


def _payload(
    result: TransferResult, shows: ExpectedStack, settings: dict[str, Any]
) -> dict[str, Any]:
    from cli.serialise import with_provenance

    return with_provenance({**result.to_json(), "expected": shows.to_json()}, settings)


def _json(result: TransferResult, shows: ExpectedStack, settings: dict[str, Any]) -> bytes:
    from cli.serialise import json_bytes

    return json_bytes(_payload(result, shows, settings))


def _report(result: TransferResult, shows: ExpectedStack, settings: dict[str, Any]) -> bytes:
    from cli.page import one_page
    from cli.page_plots import result_pictures
    from transfer.figures import transfer_figure

    payload = _payload(result, shows, settings)
    return one_page(payload, lambda: transfer_figure(result), [result_pictures(payload)])


def _figure(result: TransferResult, suffix: str) -> bytes:
    from isotherm.figures_style import figure_bytes
    from transfer.figures import transfer_figure

    return figure_bytes(transfer_figure(result), suffix)


def _csv(result: TransferResult) -> bytes:
    from cli.transfer_csv import transfer_csv

    return transfer_csv(result)
