"""`upstroke sheet`: a run sheet to fill in."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from cli.options import ForceOption

__all__ = ["app"]

app = typer.Typer(add_completion=False, rich_markup_mode=None)


@app.command()
def sheet(
    path: Annotated[
        Path | None,
        typer.Argument(metavar="PATH", help="File to write; left out, the sheet is printed."),
    ] = None,
    force: ForceOption = False,
) -> None:
    """Write a commented run sheet to fill in.

    A run sheet says what the export cannot: what was spread, on what, in which trough, and what the
    multilayer should become. Take the # off the lines that apply.

    \b
    Example:
      upstroke sheet run.toml
    """
    from cli.outputs import check_target
    from cli.terminal import say
    from cli.whole import StagedFiles
    from isotherm.sheet_template import template

    if path is None or str(path) == "-":
        say(template())
        return
    target = check_target(path, force=force)
    with StagedFiles(replace=force) as staged:
        staged.add(target, template().encode())
        staged.commit()
    say(f"Wrote {path}: fill it in and give it to a command with --sheet {path}\n")
