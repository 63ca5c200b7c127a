"""Results of this project read back from JSON, which anyone may have changed meanwhile."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any, Final

from isotherm.errors import UpstrokeError
from isotherm.file_bytes import FileBytes

__all__ = ["read_json"]

_LARGEST: Final = 200_000_000  # bytes; a result of a million rows is a few MB
_DEEPEST: Final = 60  # lists and objects within each other; results have at most ten
_LONGEST_INTEGER: Final = 18  # digits; longer ones are read as numbers with a point


def read_json(path: str | Path, *, remedy: str) -> tuple[Any, bytes]:
    """Read a JSON file, with null for what is no finite number.

    Parameters
    ----------
    path : str or Path
    remedy : str
        What to do when the file is no JSON.

    Returns
    -------
    tuple
        The value and the bytes it was read from.

    Raises
    ------
    UpstrokeError
        The file cannot be read, is no JSON, or is larger or deeper than any result.
    """
    where = str(path)
    with FileBytes.open(path) as content:
        if len(content) > _LARGEST:
            raise UpstrokeError("is too large for a result", where=where, remedy=remedy)
        data = content.whole()
    try:
        value = json.loads(
            data, parse_float=_number, parse_int=_integer, parse_constant=lambda name: None
        )
    except (ValueError, RecursionError) as error:
        raise UpstrokeError("is no JSON", where=where, remedy=remedy) from error
    if _deeper_than(value, _DEEPEST):
        raise UpstrokeError("is nested deeper than any result", where=where, remedy=remedy)
    return value, data


def _number(text: str) -> float | None:
    number = float(text)
    return number if math.isfinite(number) else None


def _integer(text: str) -> int | float | None:
    return int(text) if len(text) <= _LONGEST_INTEGER else _number(text)


def _deeper_than(value: Any, limit: int) -> bool:
    level = [value]
    for _ in range(limit):
        level = [
            item
            for each in level
            if isinstance(each, (dict, list))
            for item in (each.values() if isinstance(each, dict) else each)
        ]
        if not level:
            return False
    return True
