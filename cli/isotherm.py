"""`upstroke isotherm`: a pressure-area trace becomes numbers."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import typer

from cli.options import (
    AtOption,
    ColumnOption,
    CsvOption,
    FigureOption,
    ForceOption,
    JobsOption,
    JsonOption,
    KeepGoingOption,
    ReportOption,
    SheetOption,
    TracesArgument,
    parse_numbers,
)

if TYPE_CHECKING:
    from cli.runs import Run
    from isotherm.result import IsothermResult

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def isotherm(
    traces: TracesArgument,
    sheet: SheetOption = None,
    at: AtOption = "10,20,30,40",
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
    keep_going: KeepGoingOption = False,
    jobs: JobsOption = 1,
) -> None:
    """Areas, phases, transitions, collapse and modulus of a compression.

    Reads text exports of any layout, finds compressions and expansions, and reports each feature with
    its uncertainty. Several traces, or a folder of them, give a list.

    \b
    Examples:
      upstroke isotherm run.txt --sheet run.toml
      upstroke isotherm run.txt -s run.toml --json run.json --figure run.svg
      upstroke isotherm digitised.csv --column molecular_area=1:A^2 --column pressure=2
    """
    from cli.outputs import OutputChoice, Renderers, plan_outputs
    from cli.runs import analyse_runs, find_runs, run_inputs, run_settings

    pressures = parse_numbers(at, option="--at")
    runs = find_runs(traces, sheet, column, pressures)
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force=force), run_inputs(runs))
    found = analyse_runs(runs, keep_going=keep_going, jobs=jobs)
    settings = run_settings("isotherm", runs, at=list(pressures))
    plan.deliver(
        Renderers(
            text=lambda: _text(found.results),
            json=lambda: _json(found.results, settings, as_list=len(runs) > 1),
            csv=lambda: _csv(found.results),
            figure=lambda suffix: _figure(found.results, suffix),
            report=lambda: _report(found.done, found.results, settings),
        )
    )
    if found.failed:
        raise typer.Exit(1)


def _text(results: list[IsothermResult]) -> str:
    from cli.isotherm_text import isotherm_text
    from cli.render import join_results
    from cli.terminal import terminal_width

    width = terminal_width()
    return join_results([isotherm_text(result, width) for result in results], width)


def _json(results: list[IsothermResult], settings: dict[str, Any], *, as_list: bool) -> bytes:
    from cli.serialise import json_bytes, with_provenance

    payloads = [with_provenance(result.to_json(), settings) for result in results]
    return json_bytes(payloads if as_list else payloads[0])


def _report(runs: list[Run], results: list[IsothermResult], settings: dict[str, Any]) -> bytes:
    from cli.page import one_page
    from cli.page_plots import isotherm_picture
    from cli.runs import run_sheet
    from cli.serialise import with_provenance
    from isotherm.figures import isotherm_figure

    payloads = [with_provenance(result.to_json(), settings) for result in results]
    pictures = [
        [isotherm_picture(result, run_sheet(run))]
        for run, result in zip(runs, results, strict=True)
    ]
    return one_page(payloads, lambda: isotherm_figure(*results), pictures)


def _csv(results: list[IsothermResult]) -> bytes:
    from cli.isotherm_csv import isotherm_csv

    return isotherm_csv(results)


def _figure(results: list[IsothermResult], suffix: str) -> bytes:
    from isotherm.figures import isotherm_figure
    from isotherm.figures_style import figure_bytes

    return figure_bytes(isotherm_figure(*results), suffix)
