"""Clock times and dates become seconds."""

from __future__ import annotations

import datetime
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError

__all__ = ["clock_seconds"]

_Date = tuple[str, str, str]
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
    count = len(cells)
    hours, minutes, seconds = (np.full(count, np.nan) for _ in range(3))
    shift = np.zeros(count)  # s, of the half of the day and the time zone
    day = np.zeros(count, dtype=np.int64)
    dates: dict[_Date, int] = {}
    found = _Found()
    for row, cell in enumerate(cells):
        match = _PARTS.fullmatch(cell.strip()) if cell else None
        if match is None or (match[1] is None and match[4] is None):
            continue
        if match[1] is not None:
            date = (match[1], match[2], match[3])
            day[row] = dates.setdefault(date, len(dates))
        hours[row], minutes[row] = float(match[4] or 0), float(match[5] or 0)
        seconds[row] = float((match[6] or match[7] or "0").replace(",", "."))
        found.note(match)
        if match[8] is not None:
            noon = 12.0 if match[8] in "Pp" else 0.0
            shift[row] = 3600.0 * (noon - (12.0 if hours[row] == 12.0 else 0.0))
        if match[9] is not None:
            zone = 3600.0 * abs(float(match[9])) + 60.0 * float(match[10] or 0)
            shift[row] += zone if match[9].startswith("-") else -zone
    if not found.times and not dates:
        return np.full(count, np.nan)
    if found.short and found.short < found.times:
        raise UpstrokeError(
            "some times have seconds and some have not", where=where, remedy="export the seconds"
        )
    if found.short and _minutes_first(found, hours, bool(dates), form.casefold(), where):
        hours, minutes, seconds = np.zeros(count), hours, minutes + seconds
    out: NDArray[np.float64] = 3600.0 * hours + 60.0 * minutes + seconds + shift
    if dates:
        out += _DAY * _days(list(dates), where)[day]
    else:
        _unroll(out)
    return out


@dataclass
class _Found:
    """What the cells have shown: times in all, times of two parts, decimals of two parts, halves of a day."""

    times: int = 0
    short: int = 0
    decimals: bool = False
    halves: bool = False

    def note(self, match: re.Match[str]) -> None:
        self.times += match[4] is not None
        self.short += match[4] is not None and match[6] is None
        self.decimals = self.decimals or match[7] is not None
        self.halves = self.halves or match[8] is not None


def _minutes_first(
    found: _Found, first: NDArray[np.float64], dated: bool, form: str, where: str
) -> bool:
    """Whether 12:30 is minutes and seconds."""
    if found.decimals:
        return True  # 01:30.5: only seconds have decimals
    if form in ("mm:ss", "m:ss", "m:s", "min:s"):
        return True
    if form in ("hh:mm", "h:mm", "h:m") or dated or found.halves:
        return False
    if np.nanmax(first) > 23.0:
        return True
    raise UpstrokeError(
        "times may be hours and minutes or minutes and seconds",
        where=where,
        remedy="export the seconds, or say (mm:ss) or (hh:mm) in the header",
    )


def _days(dates: Sequence[_Date], where: str) -> NDArray[np.float64]:
    """Number the days of the dates met, from the first; day and month are told apart by their values."""
    found: list[NDArray[np.float64]] = []
    for order in ("ymd", "dmy", "mdy"):
        days = [_ordinal(date, order) for date in dates]
        known = [one for one in days if one is not None]
        if len(known) == len(days):
            found.append(np.array(known) - min(known))
    if not found:
        raise UpstrokeError("a date that is none", where=where, remedy="write dates as 2031-05-06")
    # a run lasts days, not months: the reading with the shorter span
    spans = [float(one.max()) for one in found]
    shortest = found[spans.index(min(spans))]
    if any(
        span == min(spans) and np.any(one != shortest)
        for span, one in zip(spans, found, strict=True)
    ):
        raise UpstrokeError(
            "day and month cannot be told apart", where=where, remedy="write dates as 2031-05-06"
        )
    return shortest


def _ordinal(date: _Date, order: str) -> float | None:
    parts = dict(zip(order, date, strict=True))
    year, month, day = (parts[key] for key in "ymd")
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
