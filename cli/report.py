"""`upstroke report`: the results on one sample, joined into one page."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from cli.options import CsvOption, ForceOption, JsonOption

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def report(
    results: Annotated[
        list[Path],
        typer.Argument(metavar="RESULT", help="What other commands wrote with --json."),
    ],
    title: Annotated[
        str | None, typer.Option("--title", metavar="TEXT", help="What the sample is called.")
    ] = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    report: Annotated[
        Path | None,
        typer.Option("--report", "--output", "-o", metavar="PATH", help="The page (.html)."),
    ] = None,
    force: ForceOption = False,
) -> None:
    """One page for a sample: its checks, isotherms, holds, target and build.

    Joins results written with --json. Every file they were made from is looked for and its hash compared;
    isotherms and holds whose files are unchanged are drawn again from them.

    \b
    Example:
      upstroke report iso.json held.json target.json build.json --title "Sample 7" -o sample7.html
    """
    from cli.outputs import OutputChoice, Renderers, plan_outputs

    plan = plan_outputs(OutputChoice(json, csv, report=report, force=force), results)

    from cli.report_join import join_results, load_results
    from cli.report_text import report_rows, report_text
    from cli.serialise import json_bytes, rows_csv, with_provenance
    from cli.terminal import terminal_width

    joined = join_results(load_results(results), title)
    plan.keep_off([place for e in joined.entries for item in e.inputs for place in item.places])
    settings = {"command": "report", "title": title}
    payload = with_provenance(joined.to_json(), settings)

    def page() -> bytes:
        from cli.report_page import dossier_page

        return dossier_page(joined)

    plan.deliver(
        Renderers(
            text=lambda: report_text(joined, terminal_width()),
            json=lambda: json_bytes(payload),
            csv=lambda: rows_csv(report_rows(joined)),
            report=page,
        )
    )
