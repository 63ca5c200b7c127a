"""Many runs, one compact row each: several processes, fixed order, flat memory."""

from __future__ import annotations

import os
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import islice
from typing import TYPE_CHECKING, Any, Final, Generic, TypeVar

from isotherm.errors import UpstrokeError

if TYPE_CHECKING:
    from concurrent.futures import Future, ProcessPoolExecutor

__all__ = ["BatchOutcome", "run_batch"]

Item = TypeVar("Item")
Result = TypeVar("Result")

_CHUNK: Final = 8  # items a worker takes at a time: the cost of sending is shared
_AHEAD: Final = 4  # chunks a worker may be ahead of the one waited for
# One thread in each worker: processes share the cores already.
_THREADS: Final = (
    "OMP_NUM_THREADS",
    "OPENBLAS_NUM_THREADS",
    "MKL_NUM_THREADS",
    "VECLIB_MAXIMUM_THREADS",
    "NUMEXPR_NUM_THREADS",
)


@dataclass(frozen=True)
class BatchOutcome(Generic[Item, Result]):
    """What one item gave: `result`, or the one-line `error` that stands in for it."""

    number: int  # place among the items, from 1
    item: Item
    result: Result | None
    error: str | None


@dataclass(frozen=True)
class _Answer(Generic[Result]):
    result: Result | None
    error: str | None


def _answer(work: Callable[[Item], Result], item: Item) -> _Answer[Result]:
    """Do one piece of work; whatever goes wrong with one item is that item's error."""
    try:
        return _Answer(work(item), None)
    except UpstrokeError as error:
        return _Answer(None, str(error))
    except OSError as error:
        reason = error.strerror or type(error).__name__
        where = f"{error.filename}: " if error.filename else ""
        return _Answer(None, f"{where}{reason}")
    except MemoryError:
        return _Answer(None, f"{item}: not enough memory; leave this file out")
    except Exception as error:  # one bad file must not end a thousand good ones
        what = " ".join(f"{type(error).__name__}: {error}".split())
        return _Answer(None, f"{item}: the analysis failed ({what}); please report this file")


def _answers(work: Callable[[Item], Result], items: Sequence[Item]) -> list[_Answer[Result]]:
    return [_answer(work, item) for item in items]


def run_batch(
    items: Iterable[Item], work: Callable[[Item], Result], *, jobs: int = 1
) -> Iterator[BatchOutcome[Item, Result]]:
    """Do `work` on every item; yield outcomes in the order of the items, as soon as they are known.

    Parameters
    ----------
    items : iterable
        Taken only a little ahead of what is yielded, so it may be endless.
    work : callable
        Item to result. With more than one job both must pickle, so it is a function of a module (or a
        `functools.partial` of one); let it return something small.
    jobs : int
        Processes. One works in this process.

    Yields
    ------
    BatchOutcome
        The same at any number of jobs. An item that fails, or kills its process, has an error instead
        of a result; the others are done.
    """
    source = enumerate(items, start=1)
    if jobs <= 1:
        for number, item in source:
            answer = _answer(work, item)
            yield BatchOutcome(number, item, answer.result, answer.error)
        return
    from concurrent.futures.process import BrokenProcessPool

    waiting: deque[tuple[list[tuple[int, Item]], Future[list[_Answer[Result]]] | None]] = deque()
    pool = _pool(jobs)
    try:
        while True:
            while len(waiting) < jobs * _AHEAD:
                chunk = list(islice(source, _CHUNK))
                if not chunk:
                    break
                waiting.append((chunk, _submit(pool, work, chunk)))
            if not waiting:
                return
            chunk, future = waiting.popleft()
            try:
                if future is None:
                    raise BrokenProcessPool
                answers = future.result()
            except BrokenProcessPool:
                # some item ended its process, and the pool with it: these go one by one to name it
                answers = [_alone(work, item) for _, item in chunk]
                pool.shutdown(wait=False, cancel_futures=True)
                pool = _pool(jobs)
                again = [(late, _submit(pool, work, late)) for late, _ in waiting]
                waiting = deque(again)
            for (number, item), answer in zip(chunk, answers, strict=True):
                yield BatchOutcome(number, item, answer.result, answer.error)
    finally:
        pool.shutdown(wait=False, cancel_futures=True)


def _submit(
    pool: ProcessPoolExecutor, work: Callable[[Item], Result], chunk: list[tuple[int, Item]]
) -> Future[list[_Answer[Result]]] | None:
    from concurrent.futures.process import BrokenProcessPool

    try:
        with _single_threads():
            return pool.submit(_answers, work, [item for _, item in chunk])
    except BrokenProcessPool:
        return None


def _alone(work: Callable[[Item], Result], item: Item) -> _Answer[Result]:
    """One item in a process of its own."""
    from concurrent.futures.process import BrokenProcessPool

    with _pool(1) as pool, _single_threads():
        try:
            return pool.submit(_answer, work, item).result()
        except BrokenProcessPool:
            return _Answer(
                None, f"{item}: the analysis was killed (out of memory?); leave this file out"
            )


def _pool(jobs: int) -> ProcessPoolExecutor:
    """Processes started afresh: a forked copy of a program with threads can hang."""
    from concurrent.futures import ProcessPoolExecutor
    from multiprocessing import get_all_start_methods, get_context

    method = "forkserver" if "forkserver" in get_all_start_methods() else "spawn"
    context: Any = get_context(method)
    return ProcessPoolExecutor(jobs, mp_context=context)


@contextmanager
def _single_threads() -> Iterator[None]:
    """Environment under which a worker starts; put back at once."""
    before = {name: os.environ.get(name) for name in _THREADS}
    os.environ.update({name: "1" for name in _THREADS if before[name] is None})
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
