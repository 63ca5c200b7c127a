"""`upstroke batch`: many isotherms, one row each."""

from __future__ import annotations

from typing import TYPE_CHECKING

import typer

from cli.options import (
    AtOption,
    ColumnOption,
    CommonSheetOption,
    CsvOption,
    ForceOption,
    JobsOption,
    JsonOption,
    ReportOption,
    TracesArgument,
    parse_numbers,
)

if TYPE_CHECKING:
    from cli.runs import Run
    from isotherm.series import Row

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def batch(
    traces: TracesArgument,
    sheet: CommonSheetOption = None,
    at: AtOption = "10,20,30,40",
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
    jobs: JobsOption = 1,
) -> None:
    """One row a run for folders of isotherms.

    Analyses every trace like upstroke isotherm and keeps one row of each: a table that opens anywhere.
    A bad file is reported, gets a row that says why, and the rest is done.

    \b
    Example:
      upstroke batch runs/ --sheet film.toml --csv runs.csv --jobs 2
    """
    from cli.outputs import OutputChoice, plan_outputs
    from cli.runs import find_runs, run_inputs, run_settings, run_sheet
    from cli.single import deliver_one

    pressures = parse_numbers(at, option="--at")
    runs = find_runs(traces, sheet, column, pressures, own_sheets=True)
    plan = plan_outputs(OutputChoice(json, csv, report=report, force=force), run_inputs(runs))
    for one in {(run.sheet, run.columns): run for run in runs}.values():
        run_sheet(one)  # a bad sheet is told before any work

    from cli.batch_text import batch_text
    from cli.several import progress
    from cli.terminal import complain
    from isotherm.batch import run_batch
    from isotherm.batch_row import error_row

    rows: list[Row] = []
    failed = 0
    with progress(len(runs)) as step:
        for outcome in run_batch(runs, summary, jobs=jobs):
            if outcome.result is None:
                failed += 1
                complain(outcome.error or f"{outcome.item.trace}: failed")
                path = str(outcome.item.trace)
                rows.append(error_row(path, outcome.error or "", pressures))
            else:
                rows.append(outcome.result)
            step()
    deliver_one(
        plan,
        {"schema": "upstroke.batch/1", "failed": failed, "runs": rows},
        run_settings("batch", runs, at=list(pressures)),
        text=lambda width: batch_text(rows, width),
        rows=lambda: rows,
    )
    if failed:
        raise typer.Exit(1)


def summary(run: Run) -> Row:
    """Analyse one run down to its row."""
    from cli.runs import analysed
    from isotherm.batch_row import summary_row

    return summary_row(analysed(run), run.at)
