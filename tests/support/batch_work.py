"""Pieces of work that processes can import."""

from __future__ import annotations

import os
import signal
from pathlib import Path

from isotherm.errors import UpstrokeError

AT = (10.0, 30.0)


def square(item: int) -> int:
    """Fail on 3 with a refusal, on 5 with a fault."""
    if item == 3:
        raise UpstrokeError("three is not allowed", where=str(item))
    if item == 5:
        raise ValueError("five\nis odd")
    return item * item


def deadly(item: int) -> int:
    """End the process on 7."""
    if item == 7:
        os.kill(os.getpid(), signal.SIGKILL)
    return item + 1


def threads(item: int) -> str:
    """What the worker was told about threads."""
    return os.environ.get("OMP_NUM_THREADS", "")


def summarise(path: str) -> dict[str, float | int | str | None]:
    """Read and analyse one export: what a batch does."""
    from isotherm.analysis import analyse
    from isotherm.batch_row import summary_row
    from isotherm.trace_read import read_trace

    return summary_row(analyse(read_trace(Path(path)), at=AT), AT)
