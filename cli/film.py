"""The isotherm of the film that is dipped: what `--isotherm` and its sheet say."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from isotherm.result import IsothermResult
    from isotherm.sheet import RunSheet

__all__ = ["film_isotherm", "film_settings", "record_settings"]


def film_isotherm(
    trace: Path | None, own_sheet: Path | None, run_sheet: RunSheet
) -> IsothermResult | None:
    """Analyse the film's isotherm; None where none is given.

    Without a sheet of its own it takes the run's, but not what that says of columns, which is about
    the log.

    Raises
    ------
    UpstrokeError
        The trace or its sheet cannot be used.
    """
    if trace is None:
        return None
    from cli.inputs import load_sheet
    from isotherm.analysis import analyse
    from isotherm.trace_read import read_trace

    sheet = replace(run_sheet, columns=()) if own_sheet is None else load_sheet(own_sheet)
    pressure = run_sheet.dipping.pressure
    asked = {10.0, 20.0, 30.0, 40.0} | ({pressure.value} if pressure is not None else set())
    return analyse(read_trace(trace, sheet), at=tuple(sorted(asked)))


def record_settings(
    command: str, sheet: Path | None, columns: Sequence[str] | None, **others: Any
) -> dict[str, Any]:
    """Return what the JSON records of the options of any command with one sheet."""
    from cli.serialise import input_stamp

    settings: dict[str, Any] = {"command": command, **others}
    settings["sheet"] = None if sheet is None else input_stamp(sheet)
    if columns:
        settings["columns"] = list(columns)
    return settings


def film_settings(
    command: str,
    sheet: Path | None,
    columns: Sequence[str] | None,
    film: IsothermResult | None,
    own_sheet: Path | None,
    **others: Any,
) -> dict[str, Any]:
    """Return what the JSON records of the options of a command about a dipped film."""
    from cli.serialise import input_stamp

    settings = record_settings(command, sheet, columns, **others)
    if film is not None:
        settings["isotherm"] = {"path": film.source.path, "sha256": film.source.sha256}
    if own_sheet is not None:
        settings["isotherm_sheet"] = input_stamp(own_sheet)
    return settings
