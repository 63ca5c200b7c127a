"""Rows put in order of time."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

__all__ = ["TimeOrder", "time_order"]

# A recorder restarts a few times in one file at most; more backward steps than this are rows out of order.
_MOST_RESTARTS: Final = 20
# A clock set back begins within this part of the stretch before it.
_NEAR_START: Final = 0.1


@dataclass(frozen=True)
class TimeOrder:
    """order : (n,) indices that sort the rows, None where they are sorted. time : (n,) s, in that order."""

    order: NDArray[np.intp] | None
    time: NDArray[np.float64]
    warning: str = ""


def time_order(time: NDArray[np.float64]) -> TimeOrder:
    """Order rows by time (stable), keeping apart recordings that each start their own clock.

    Parameters
    ----------
    time : (n,) array of float
        Finite times in file order, s.
    """
    steps = np.diff(time)
    back = np.flatnonzero(steps < 0)
    if not len(back):
        return TimeOrder(None, time)
    if len(back) <= _MOST_RESTARTS:
        starts = np.concatenate([[0], back + 1])
        ends = np.concatenate([back, [len(time) - 1]])
        if _restarts(time, starts, ends):
            shift = np.zeros(len(time))
            forward = steps[steps > 0]
            gap = float(np.median(forward)) if len(forward) else 1.0
            for start, before in zip(starts[1:], ends[:-1], strict=True):
                shift[start:] = time[before] + shift[before] + gap - time[start]
            return TimeOrder(
                None,
                time + shift,
                f"time starts again {len(back)} {'time' if len(back) == 1 else 'times'} in the file; "
                "the parts are taken one after the other",
            )
    order = np.argsort(time, kind="stable")
    rows = "1 row was" if len(back) == 1 else f"{len(back)} rows were"
    return TimeOrder(order, time[order], f"{rows} out of order in time; sorted by time")


def _restarts(time: NDArray[np.float64], starts: NDArray[np.intp], ends: NDArray[np.intp]) -> bool:
    """Whether every stretch after a backward step begins about where the first did: its clock was set back.

    Sorting would shuffle such stretches together. A row out of order goes back a little only.
    """
    if np.any(ends - starts < 3):
        return False
    first, spans = time[starts[0]], time[ends] - time[starts]
    return bool(np.all(np.abs(time[starts[1:]] - first) < _NEAR_START * spans[:-1]))
