"""Clock times and dates become seconds."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError

__all__ = ["clock_seconds"]

_DAY: Final = 86400.0  # s
# A recorder's clock that falls by more than half a day has passed midnight; less is a row out of order.
_MIDNIGHT: Final = _DAY / 2
_PARTS: Final = re.compile(
    r"(?:(\d{1,4})[-./](\d{1,2})[-./](\d{1,4}))?[T ,]*"
    r"(?:(\d{1,3}):(\d{1,2})(?::(\d{1,2}(?:[.,]\d{1,9})?)|([.,]\d{1,9}))?)?"
    r"(?: ?([AaPp])\.?[Mm]\.?)?(?:Z|([-+]\d\d):?(\d\d))?",
    re.ASCII,
)


def clock_seconds(cells: Sequence[str], *, where: str, form: str = "") -> NDArray[np.float64]:
    """Convert clock times (`09:15:02.5`, `2031-05-06T09:15:02`, `06.05.2031 09:15:02`) to seconds.

    Parameters
    ----------
    cells : sequence of str, length n
        One cell per row; a cell that is no time gives NaN.
    where : str
        Column named in the error.
    form : str
        How the header says it is written, such as `mm:ss`; "" where it does not.

    Returns
    -------
    (n,) array of float
        Seconds since the first midnight (or the first date's midnight). A clock without dates that falls
        by more than half a day has passed midnight.

    Raises
    ------
    UpstrokeError
        When the order of day and month, or of hours and minutes, cannot be told.
    """
    matches = [_PARTS.fullmatch(cell.strip()) if cell else None for cell in cells]
    groups = [m.groups() if m is not None else None for m in matches]
    used = [g for g in groups if g is not None and (g[0] is not None or g[3] is not None)]
    out = np.full(len(cells), np.nan)
    if not used:
        return out
    dates = {(g[0], g[1], g[2]): 0.0 for g in used if g[0] is not None}
    dates = _days(dates, where)
    short = sum(g[3] is not None and g[5] is None for g in used)
    if short and short < len(used):
        raise UpstrokeError(
            "some times have seconds and some have not", where=where, remedy="export the seconds"
        )
    minutes_first = _minutes_first(used, form.casefold(), where) if short else False
    for row, g in enumerate(groups):
        if g is None or (g[0] is None and g[3] is None):
            continue
        out[row] = dates.get((g[0], g[1], g[2]), 0.0) * _DAY + _of_day(g, minutes_first)
    if not dates:
        _unroll(out)
    return out


def _minutes_first(used: Sequence[tuple[str | None, ...]], form: str, where: str) -> bool:
    """Whether 12:30 is minutes and seconds."""
    if any(g[6] is not None for g in used):
        return True  # 01:30.5: only seconds have decimals
    if form in ("mm:ss", "m:ss", "m:s", "min:s"):
        return True
    if form in ("hh:mm", "h:mm", "h:m") or any(g[0] is not None or g[7] is not None for g in used):
        return False
    if any(int(g[3] or 0) > 23 for g in used):
        return True
    raise UpstrokeError(
        "times may be hours and minutes or minutes and seconds",
        where=where,
        remedy="export the seconds, or say (mm:ss) or (hh:mm) in the header",
    )


def _of_day(g: tuple[str | None, ...], minutes_first: bool) -> float:
    first, second = float(g[3] or 0), float(g[4] or 0)
    if minutes_first and g[5] is None:
        return 60.0 * first + second + float((g[6] or "0").replace(",", "."))
    if g[7] is not None:
        first = first % 12 + (12 if g[7] in "Pp" else 0)
    seconds = 3600.0 * first + 60.0 * second + float((g[5] or "0").replace(",", "."))
    if g[8] is not None:
        sign = -1.0 if g[8].startswith("-") else 1.0
        seconds -= sign * (3600.0 * abs(float(g[8])) + 60.0 * float(g[9] or 0))
    return seconds


def _days(
    dates: dict[tuple[str | None, str | None, str | None], float], where: str
) -> dict[tuple[str | None, str | None, str | None], float]:
    """Number the days of the dates met, from the first; day and month are told apart by their values."""
    if not dates:
        return {}
    found: list[dict[tuple[str | None, str | None, str | None], float]] = []
    for order in ("ymd", "dmy", "mdy"):
        days = {}
        for date in dates:
            number = _ordinal(date, order)
            if number is None:
                break
            days[date] = number
        else:
            start = min(days.values())
            found.append({date: number - start for date, number in days.items()})
    if not found:
        raise UpstrokeError("a date that is none", where=where, remedy="write dates as 2031-05-06")
    if any(other != found[0] for other in found[1:]):
        # a run lasts days, not months: the reading with the shorter span, unless they tie
        spans = [max(one.values()) for one in found]
        if spans.count(min(spans)) > 1:
            raise UpstrokeError(
                "day and month cannot be told apart",
                where=where,
                remedy="write dates as 2031-05-06",
            )
        return found[spans.index(min(spans))]
    return found[0]


def _ordinal(date: tuple[str | None, str | None, str | None], order: str) -> float | None:
    import datetime

    parts = dict(zip(order, date, strict=True))
    year, month, day = (parts[key] or "" for key in "ymd")
    if len(year) not in (2, 4) or len(month) > 2 or len(day) > 2:
        return None
    number = int(year) + (2000 if len(year) == 2 else 0)
    try:
        return float(datetime.date(number, int(month), int(day)).toordinal())
    except ValueError:
        return None


def _unroll(seconds: NDArray[np.float64]) -> None:
    """Add a day wherever a clock without dates has passed midnight (in place)."""
    good = np.flatnonzero(np.isfinite(seconds))
    steps = np.diff(seconds[good])
    seconds[good[1:]] += _DAY * np.cumsum(steps < -_MIDNIGHT)
