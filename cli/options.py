"""Options that several commands share, with one wording each."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

__all__ = [
    "AtOption",
    "CheckOption",
    "ColumnOption",
    "CommonSheetOption",
    "CsvOption",
    "FigureOption",
    "ForceOption",
    "IsothermOption",
    "IsothermSheetOption",
    "JobsOption",
    "JsonOption",
    "KeepGoingOption",
    "LogArgument",
    "NeededSheetOption",
    "PressuresOption",
    "ReportOption",
    "SheetOption",
    "TraceArgument",
    "TracesArgument",
    "parse_numbers",
]

JsonOption = Annotated[
    str | None,
    typer.Option("--json", metavar="PATH", help="Write the result as JSON; - is standard output."),
]
CsvOption = Annotated[
    Path | None, typer.Option("--csv", metavar="PATH", help="Write the table behind it as CSV.")
]
FigureOption = Annotated[
    Path | None,
    typer.Option("--figure", metavar="PATH", help="Draw it: .svg, .png or .pdf by suffix."),
]
ReportOption = Annotated[
    Path | None,
    typer.Option("--report", metavar="PATH", help="Write all of it as one page (.html)."),
]
ForceOption = Annotated[
    bool, typer.Option("--force", help="Replace output files that exist (never an input).")
]
SheetOption = Annotated[
    Path | None,
    typer.Option("--sheet", "-s", metavar="SHEET", help="Run sheet (TOML); see upstroke sheet."),
]
CommonSheetOption = Annotated[
    Path | None,
    typer.Option(
        "--sheet",
        "-s",
        metavar="SHEET",
        help="Run sheet for runs without their own (run7.toml beside run7.txt is run 7's own).",
    ),
]
PressuresOption = Annotated[
    str | None,
    typer.Option("--at", metavar="LIST", help="Pressures (mN/m) to compare at: --at 10,20,30."),
]
NeededSheetOption = Annotated[
    Path,
    typer.Option("--sheet", "-s", metavar="SHEET", help="Run sheet (TOML); see upstroke sheet."),
]
LogArgument = Annotated[Path, typer.Argument(metavar="LOG", help="Dipping log, as exported.")]
IsothermOption = Annotated[
    Path | None,
    typer.Option("--isotherm", "-i", metavar="TRACE", help="Isotherm of the film that is dipped."),
]
IsothermSheetOption = Annotated[
    Path | None,
    typer.Option("--isotherm-sheet", metavar="SHEET", help="Its own run sheet, if it has one."),
]
TraceArgument = Annotated[Path, typer.Argument(metavar="TRACE", help="Export of a trough.")]
TracesArgument = Annotated[
    list[Path], typer.Argument(metavar="TRACE", help="Exports of a trough, one run each.")
]
ColumnOption = Annotated[
    list[str] | None,
    typer.Option(
        "--column",
        metavar="ROLE=WHICH[:UNIT]",
        help="Say what a column holds, by number (from 1) or header: --column area=2:cm^2. Repeat.",
    ),
]
CheckOption = Annotated[
    Path | None,
    typer.Option(
        "--check",
        metavar="JSON",
        help="What upstroke check --json wrote: zero and drift of the probe.",
    ),
]
KeepGoingOption = Annotated[
    bool,
    typer.Option("--keep-going", help="Of several traces, report the bad ones and do the rest."),
]
JobsOption = Annotated[
    int,
    typer.Option("--jobs", "-j", min=1, metavar="N", help="Processes to share several traces."),
]
AtOption = Annotated[
    str,
    typer.Option("--at", metavar="LIST", help="Pressures (mN/m) to report area and modulus at."),
]


def parse_numbers(text: str, *, option: str) -> tuple[float, ...]:
    """Read a comma-separated list of finite numbers.

    Raises
    ------
    typer.BadParameter
        Wrong usage: something in the list is no number.
    """
    numbers = []
    for part in text.split(","):
        try:
            number = float(part)
        except ValueError:
            number = float("nan")
        if number != number or number in (float("inf"), float("-inf")):
            raise typer.BadParameter(
                f"'{part.strip()}' is not a number; write a list such as 10,20,30",
                param_hint=option,
            )
        numbers.append(number)
    return tuple(numbers)
