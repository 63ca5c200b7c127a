"""One piece of work over several files: order kept, a bad file named, progress shown."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Generic, TypeVar

import typer

from cli.terminal import complain
from isotherm.errors import UpstrokeError

__all__ = ["Outcomes", "progress", "run_each"]

Item = TypeVar("Item")
Result = TypeVar("Result")

# Fewer files than this are done before a progress bar could be read.
BAR_FROM = 5


@dataclass(frozen=True)
class Outcomes(Generic[Item, Result]):
    """Results in the order of the items, bad ones left out; `done` the items that gave them."""

    done: list[Item]
    results: list[Result]
    failed: int


def run_each(
    items: Sequence[Item],
    work: Callable[[Item], Result],
    *,
    keep_going: bool,
    jobs: int = 1,
) -> Outcomes[Item, Result]:
    """Do `work` on every item, in order.

    Parameters
    ----------
    items : sequence
        What to work on; with more than one job, items and results must pickle.
    work : callable
        Takes an item and returns its result; with more than one job, a module's own function.
    keep_going : bool
        Whether a bad item is reported on standard error and left out; otherwise it ends the run.
    jobs : int
        Processes to share the work among.

    Returns
    -------
    Outcomes
        The same at any number of jobs.

    Raises
    ------
    UpstrokeError
        An item is bad and `keep_going` is false, or every item is.
    """
    if jobs == 1 and not keep_going:
        # nothing is caught on the way: a fault of the program shows as one
        with progress(len(items)) as step:
            found = []
            for item in items:
                found.append(work(item))
                step()
        return Outcomes(list(items), found, 0)
    from isotherm.batch import run_batch

    done: list[Item] = []
    results: list[Result] = []
    failed = 0
    with progress(len(items)) as step:
        for outcome in run_batch(items, work, jobs=jobs):
            if outcome.result is not None:
                done.append(outcome.item)
                results.append(outcome.result)
            elif keep_going:
                complain(outcome.error or "failed")
                failed += 1
            else:
                raise UpstrokeError(outcome.error or "failed")
            step()
    if not results:
        raise UpstrokeError("none of the files could be analysed", remedy="see the lines above")
    return Outcomes(done, results, failed)


@contextmanager
def progress(length: int) -> Iterator[Callable[[], None]]:
    """Show a bar on standard error where a person watches; yields what to call after each item."""
    if length < BAR_FROM or not sys.stderr.isatty():
        yield lambda: None
        return
    with typer.progressbar(range(length), label="runs", file=sys.stderr) as bar:

        def step() -> None:
            bar.update(1)

        yield step
