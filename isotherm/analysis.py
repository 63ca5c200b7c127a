"""The one way from a trace to its result."""

from __future__ import annotations

from isotherm.result import IsothermResult
from isotherm.trace import Trace

__all__ = ["analyse"]


def analyse(trace: Trace, *, at: tuple[float, ...] = (10.0, 20.0, 30.0, 40.0)) -> IsothermResult:
    """Analyse every branch of `trace`; `at` lists pressures (mN/m) to report area and modulus at."""
    raise NotImplementedError
