"""A limit on the time one input may take, for the programmes that try very many."""

from __future__ import annotations

import contextlib
import faulthandler
import signal
import sys
from collections.abc import Iterator
from types import FrameType

__all__ = ["TookTooLong", "time_limit"]

# Code that never comes back to Python cannot be interrupted from it: after this time on the clock of the
# wall (s) the stack is printed and the process ends, with its input still on the disk.
_LAST_RESORT = 600.0


class TookTooLong(BaseException):
    """An input took longer than it may. No `Exception`, so that nothing on the way takes it for its own."""


@contextlib.contextmanager
def time_limit(seconds: float) -> Iterator[None]:
    """Raise `TookTooLong`, with the stack it stopped in, after `seconds` of this process's own time.

    Parameters
    ----------
    seconds : float
        s of processor time, so that a busy machine makes no findings. Without effect where the system
        has no such timer.
    """
    if not hasattr(signal, "setitimer"):
        yield
        return

    def stop(number: int, frame: FrameType | None) -> None:
        raise TookTooLong(f"took longer than {seconds:g} s")

    before = signal.signal(signal.SIGPROF, stop)
    signal.setitimer(signal.ITIMER_PROF, seconds)
    faulthandler.dump_traceback_later(_LAST_RESORT + seconds, exit=True, file=sys.__stderr__)
    try:
        yield
    finally:
        signal.setitimer(signal.ITIMER_PROF, 0.0)
        signal.signal(signal.SIGPROF, before)
        faulthandler.cancel_dump_traceback_later()
