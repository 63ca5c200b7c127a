"""One piece of work over several files: order kept, a bad file named, progress shown."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import AbstractContextManager, nullcontext
from dataclasses import dataclass
from typing import Any, Generic, TypeVar

import typer

from cli.terminal import complain
from isotherm.errors import UpstrokeError

__all__ = ["Outcomes", "run_each"]

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
    done: list[Item] = []
    results: list[Result] = []
    failed = 0
    with _progress(len(items)) as bar:
        for item, outcome in zip(items, _outcomes(items, work, jobs), strict=True):
            if isinstance(outcome, UpstrokeError):
                if not keep_going:
                    raise outcome
                complain(str(outcome))
                failed += 1
            else:
                done.append(item)
                results.append(outcome)
            if bar is not None:
                bar.update(1)
    if not results:
        raise UpstrokeError("none of the files could be analysed", remedy="see the lines above")
    return Outcomes(done, results, failed)


@dataclass(frozen=True)
class _Caught(Generic[Item, Result]):
    """Work that returns a refusal instead of raising it; it pickles when `work` does."""

    work: Callable[[Item], Result]

    def __call__(self, item: Item) -> Result | UpstrokeError:
        try:
            return self.work(item)
        except UpstrokeError as error:
            return error


def _outcomes(
    items: Sequence[Item], work: Callable[[Item], Result], jobs: int
) -> Iterator[Result | UpstrokeError]:
    caught: Callable[[Item], Result | UpstrokeError] = _Caught(work)
    if jobs <= 1 or len(items) < 2:
        yield from map(caught, items)
        return
    from concurrent.futures import ProcessPoolExecutor

    with ProcessPoolExecutor(min(jobs, len(items))) as pool:
        try:
            # a few items at a time: enough to hide the cost of sending, few enough to share out
            chunk = max(1, min(16, len(items) // (4 * jobs)))
            yield from pool.map(caught, items, chunksize=chunk)
        finally:
            pool.shutdown(wait=False, cancel_futures=True)


def _progress(length: int) -> AbstractContextManager[Any]:
    if length < BAR_FROM or not sys.stderr.isatty():
        return nullcontext()
    steps: Iterable[int] = range(length)
    bar: AbstractContextManager[Any] = typer.progressbar(steps, label="runs", file=sys.stderr)
    return bar
