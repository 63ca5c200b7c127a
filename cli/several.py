"""One piece of work over several files: order kept, a bad file named, progress shown."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable, Sequence
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from pathlib import Path
from typing import Generic, TypeVar

import typer

from cli.terminal import complain
from isotherm.errors import UpstrokeError

__all__ = ["Outcomes", "run_each"]

Result = TypeVar("Result")

# Fewer files than this are done before a progress bar could be read.
BAR_FROM = 5


@dataclass(frozen=True)
class Outcomes(Generic[Result]):
    """Results in the order of the paths, bad files left out, and how many were bad."""

    results: list[Result]
    failed: int


def run_each(
    paths: Sequence[Path], work: Callable[[Path], Result], *, keep_going: bool
) -> Outcomes[Result]:
    """Do `work` on every path, in order.

    Parameters
    ----------
    paths : sequence of Path
        Files to work on.
    work : callable
        Takes a path and returns its result.
    keep_going : bool
        Whether a bad file is reported on standard error and left out; otherwise it ends the run.

    Returns
    -------
    Outcomes
        Results in the order of `paths`.

    Raises
    ------
    UpstrokeError
        A file is bad and `keep_going` is false, or every file is.
    """
    results: list[Result] = []
    failed = 0
    with _progress(paths) as progress:
        for path in progress:
            try:
                results.append(work(path))
            except UpstrokeError as error:
                if not keep_going:
                    raise
                complain(str(error))
                failed += 1
    if not results:
        raise UpstrokeError("none of the files could be analysed", remedy="see the lines above")
    return Outcomes(results, failed)


def _progress(paths: Sequence[Path]) -> AbstractContextManager[Iterable[Path]]:
    if len(paths) < BAR_FROM or not sys.stderr.isatty():
        return nullcontext(paths)
    bar: AbstractContextManager[Iterable[Path]] = typer.progressbar(
        paths, label="traces", file=sys.stderr
    )
    return bar
