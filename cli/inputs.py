"""What a command is given: the run sheet and the user's word on columns."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import typer

if TYPE_CHECKING:
    from isotherm.quantity import Quantity
    from isotherm.sheet import ColumnHint, RunSheet

__all__ = ["column_hints", "load_sheet", "read_quantity", "read_time"]


def column_hints(texts: list[str] | None) -> tuple[ColumnHint, ...]:
    """Read `--column ROLE=WHICH[:UNIT]` options.

    WHICH is a column number from 1, or a header. A header that holds a colon needs the unit after it.

    Raises
    ------
    typer.BadParameter
        Wrong usage: no such role, or nothing after the equals sign.
    """
    from isotherm.sheet import ColumnHint
    from isotherm.sheet_schema import ROLES

    hints = []
    for text in texts or []:
        role, equals, rest = text.partition("=")
        role = role.strip().lower().replace(" ", "_").replace("-", "_")
        which, _, unit = rest.rpartition(":") if ":" in rest else (rest, "", "")
        which, unit = which.strip(), unit.strip()
        if not equals or not which:
            raise typer.BadParameter(
                f"'{text}' is not ROLE=WHICH[:UNIT]; write for example area=2:cm^2",
                param_hint="--column",
            )
        if role not in ROLES:
            raise typer.BadParameter(
                f"'{role}' is no role; use one of {', '.join(ROLES)}", param_hint="--column"
            )
        if which.isdecimal():
            hints.append(ColumnHint(role, index=int(which), unit=unit or None))
        else:
            hints.append(ColumnHint(role, header=which, unit=unit or None))
    return tuple(hints)


def load_sheet(path: Path | None, columns: list[str] | None = None) -> RunSheet:
    """Read the run sheet (an empty one where none is given) and lay `--column` options over it.

    Raises
    ------
    UpstrokeError
        The sheet cannot be read or says something impossible.
    """
    from isotherm.sheet import RunSheet

    hints = column_hints(columns)
    if path is None:
        sheet = RunSheet()
    else:
        from isotherm.sheet_read import read_sheet

        sheet = read_sheet(path)
    if not hints:
        return sheet
    told = {hint.role for hint in hints}
    kept = tuple(hint for hint in sheet.columns if hint.role not in told)
    return replace(sheet, columns=kept + hints)


def read_quantity(text: str, dimension: str, *, option: str) -> Quantity:
    """Read a quantity given as an option, such as `12 ± 3 mV`, in its fixed unit.

    Raises
    ------
    typer.BadParameter
        Wrong usage: no quantity of that dimension.
    """
    from isotherm.errors import UpstrokeError
    from isotherm.quantity_text import parse_quantity

    try:
        return parse_quantity(text, dimension)
    except UpstrokeError as error:
        raise typer.BadParameter(str(error), param_hint=option) from error


def read_time(text: str, *, option: str) -> float:
    """Read a time with its unit, such as `4 h`, in seconds.

    Raises
    ------
    typer.BadParameter
        Wrong usage: no time, or not above zero.
    """
    seconds = read_quantity(text, "time", option=option).value
    if seconds <= 0:
        raise typer.BadParameter(f"'{text}' is not above zero", param_hint=option)
    return seconds
