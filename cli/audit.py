"""`upstroke audit`: the build against its design."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

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
    from transfer.audit import AuditResult

__all__ = ["REJECTED", "app"]

REJECTED = 3  # exit status: done, and the build is outside its acceptance limits

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def audit(
    log: LogArgument,
    sheet: NeededSheetOption,
    isotherm: IsothermOption = None,
    isotherm_sheet: IsothermSheetOption = None,
    evidence: Annotated[
        Path | None,
        typer.Option(
            "--evidence",
            "-e",
            metavar="EVIDENCE",
            help="Measurements on the deposited film (CSV or TOML).",
        ),
    ] = None,
    plan: Annotated[
        Path | None,
        typer.Option(
            "--plan",
            metavar="TARGET.json",
            help="JSON of upstroke target: compare every stroke with its plan.",
        ),
    ] = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """The build against its design: accepted or rejected, and why.

    Judges a dipping log by the [stack] of the sheet, rule by rule. What lies within its uncertainty of a
    limit is undecided: neither passed nor failed. Exit status 3 when the build is rejected.

    \b
    Examples:
      upstroke audit build.csv --sheet run.toml
      upstroke audit build.csv -s run.toml --evidence sample.toml --report build.html
    """
    from cli.film import film_isotherm, film_settings
    from cli.inputs import load_sheet
    from cli.outputs import OutputChoice, Renderers, plan_outputs
    from cli.serialise import input_stamp
    from transfer.analysis import analyse_log
    from transfer.audit import audit as judge
    from transfer.evidence import evidence_for
    from transfer.log import read_log

    given = (log, sheet, isotherm, isotherm_sheet, evidence, plan)
    inputs = [path for path in given if path is not None]
    outputs = plan_outputs(OutputChoice(json, csv, figure, report=report, force=force), inputs)
    run_sheet = load_sheet(sheet, column)
    planned = None if plan is None else _plan(plan)
    film = film_isotherm(isotherm, isotherm_sheet, run_sheet)
    built = analyse_log(read_log(log, run_sheet), run_sheet, isotherm=film)
    seen = None if evidence is None else evidence_for(evidence, built, run_sheet, isotherm=film)
    outputs.keep_off([] if seen is None else [Path(name) for name in seen.raw_files])
    result = judge(built, run_sheet, plan=planned, evidence=seen)
    settings = film_settings("audit", sheet, column, film, isotherm_sheet)
    for name, path in (("evidence", evidence), ("plan", plan)):
        if path is not None:
            settings[name] = input_stamp(path)
    outputs.deliver(
        Renderers(
            text=lambda: _text(result),
            json=lambda: _json(result, settings),
            csv=lambda: _csv(result),
            figure=lambda suffix: _figure(result, suffix),
            report=lambda: _report(result, settings),
        )
    )
    if result.verdict == "reject":
        raise typer.Exit(REJECTED)


def _plan(path: Path) -> dict[str, Any]:
    """The target's JSON at `path`."""
    from isotherm.errors import UpstrokeError
    from isotherm.json_file import read_json

    plan, _ = read_json(path, remedy="give what upstroke target --json wrote")
    if not isinstance(plan, dict) or plan.get("schema") != "upstroke.target/1":
        raise UpstrokeError(
            "is not the result of upstroke target",
            where=str(path),
            remedy="give what upstroke target --json wrote",
        )
    return plan


def _text(result: AuditResult) -> str:
    from cli.audit_text import audit_text
    from cli.terminal import terminal_width

    return audit_text(result, terminal_width())


def _payload(result: AuditResult, settings: dict[str, Any]) -> dict[str, Any]:
    from cli.serialise import with_provenance

    return with_provenance(result.to_json(), settings)


def _json(result: AuditResult, settings: dict[str, Any]) -> bytes:
    from cli.serialise import json_bytes

    return json_bytes(_payload(result, settings))


def _csv(result: AuditResult) -> bytes:
    from cli.serialise import csv_bytes

    header = ("stroke", "rule", "found", "allowed", "status", "decide")
    rows = [[f.stroke, f.rule, f.found, f.allowed, f.status, f.decide] for f in result.findings]
    return csv_bytes(header, rows)


def _figure(result: AuditResult, suffix: str) -> bytes:
    from isotherm.figures_style import figure_bytes
    from transfer.figures import transfer_figure

    return figure_bytes(transfer_figure(result.result), suffix)


def _report(result: AuditResult, settings: dict[str, Any]) -> bytes:
    from cli.page import one_page
    from cli.page_plots import result_pictures
    from transfer.figures import transfer_figure

    payload = _payload(result, settings)
    return one_page(payload, lambda: transfer_figure(result.result), [result_pictures(payload)])
