"""`upstroke potential`: effective dipole moment from a recorded surface potential."""

from __future__ import annotations

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
    TraceArgument,
)

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def potential(
    trace: TraceArgument,
    sheet: SheetOption = None,
    baseline: Annotated[
        str | None,
        typer.Option(
            "--baseline",
            metavar="POTENTIAL",
            help="Potential of the clean surface, such as '12 ± 3 mV'; else the record gives it.",
        ),
    ] = None,
    column: ColumnOption = None,
    json: JsonOption = None,
    csv: CsvOption = None,
    figure: FigureOption = None,
    report: ReportOption = None,
    force: ForceOption = False,
) -> None:
    """Effective dipole moment against area, onset of potential.

    For records with a column of surface potential: the moment normal to the surface by the Helmholtz
    relation, and where the potential rises compared with where the pressure does.

    \b
    Example:
      upstroke potential run.txt --sheet run.toml --baseline "12 ± 3 mV"
    """
    from cli.film import record_settings
    from cli.inputs import load_sheet, read_quantity
    from cli.outputs import OutputChoice, plan_outputs
    from cli.single import deliver_one

    inputs = [path for path in (trace, sheet) if path is not None]
    plan = plan_outputs(OutputChoice(json, csv, figure, report, force=force), inputs)
    clean = None if baseline is None else read_quantity(baseline, "potential", option="--baseline")

    from cli.potential_text import potential_text
    from isotherm.analysis import analyse
    from isotherm.potential import analyse_potential
    from isotherm.potential_figure import figure_potential
    from isotherm.trace_read import read_trace

    found = analyse(read_trace(trace, load_sheet(sheet, column)))
    result = analyse_potential(found, baseline=clean)
    deliver_one(
        plan,
        result.to_json(),
        record_settings(
            "potential", sheet, column, baseline=None if clean is None else clean.to_json()
        ),
        text=lambda width: potential_text(result, width),
        rows=result.rows,
        figure=lambda: figure_potential(result),
    )
