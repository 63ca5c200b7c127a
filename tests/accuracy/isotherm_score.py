"""Score the isotherm analysis on simulated traces with known truth.

    python tests/accuracy/isotherm_score.py --traces 400 --half tune

Even seeds are the tune half, odd seeds the report half. Never tune on the report half.
"""

from __future__ import annotations

import argparse
import json
import sys
import time
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from functools import partial
from pathlib import Path

if __name__ == "__main__":  # run as a script: the packages lie two folders up
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from isotherm_failures import plot_trace
from isotherm_marks import Marks, mark_trace
from isotherm_recipe import FILM_FAMILIES
from isotherm_rivals import argmax_script, told_fit
from isotherm_simulator import FAMILIES, family_of, simulate
from isotherm_tables import summarise, table
from isotherm_truth import Truth

from isotherm.analysis import analyse
from isotherm.result import Branch
from isotherm.trace import Trace

__all__ = ["main", "score_seed", "seeds_of"]

METHODS = ("analysis", "baseline", "limit")


def seeds_of(half: str, count: int, first: int = 0) -> list[int]:
    """The first `count` seeds of a half, from `first` on (counted within the half)."""
    return [2 * (first + i) + (0 if half == "tune" else 1) for i in range(count)]


def _find(method: str, trace: Trace, truth: Truth) -> Branch:
    if method == "baseline":
        return argmax_script(trace)
    if method == "limit":
        return told_fit(trace, truth)
    return analyse(trace).headline


def _failed(seed: int, truth: Truth, seconds: float, error: Exception) -> Marks:
    return Marks(
        seed=seed,
        family=truth.family,
        generator=truth.generator,
        collapse_right=False,
        kind_right=None,
        transitions_right=False,
        lift_off_missed=truth.lift_off is not None,
        limiting_missed=truth.limiting_area is not None,
        area_at_missed=len(truth.area_at),
        features=(),
        seconds=seconds,
        called="",
        expected="",
        error=f"{type(error).__name__}: {error}",
    )


def score_seed(
    seed: int, *, family: str | None, method: str = "analysis", failures: Path | None = None
) -> Marks:
    """Simulate, analyse and mark one seed; plot it to `failures` where a call was wrong."""
    trace, truth = simulate(seed, family)
    branch = None
    start = time.perf_counter()
    try:
        branch = _find(method, trace, truth)
        marks = mark_trace(seed, truth, branch, time.perf_counter() - start)
    except NotImplementedError:
        raise
    except Exception as error:  # every failure of the analysis is a mark, not the end of the run
        marks = _failed(seed, truth, time.perf_counter() - start, error)
    if failures is not None and not marks.right:
        plot_trace(failures, trace, truth, branch, marks, family or family_of(seed))
    return marks


def _run(
    seeds: Sequence[int], family: str | None, method: str, jobs: int, failures: Path | None
) -> list[Marks]:
    work = partial(score_seed, family=family, method=method, failures=failures)
    if jobs < 2:
        return [work(seed) for seed in seeds]
    with ProcessPoolExecutor(jobs) as pool:
        return list(pool.map(work, seeds, chunksize=4))


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the programme and print its tables."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--traces", type=int, default=140)
    parser.add_argument("--half", choices=("tune", "report"), default="tune")
    parser.add_argument("--first", type=int, default=0, help="skip so many seeds of the half")
    parser.add_argument("--family", choices=FAMILIES, help="default: film families in turn")
    parser.add_argument("--method", choices=METHODS, default="analysis")
    parser.add_argument("--baseline", action="store_const", dest="method", const="baseline")
    parser.add_argument("--limit", action="store_const", dest="method", const="limit")
    parser.add_argument("--jobs", type=int, default=1)
    parser.add_argument("--failures", type=Path, help="folder for pictures of wrong calls")
    parser.add_argument("--json", type=Path, help="write the figures here")
    parser.add_argument("--by-family", action="store_true", help="print a table per family too")
    parser.add_argument("--list", action="store_true", help="list every wrong call")
    options = parser.parse_args(arguments)
    if options.failures is not None:
        options.failures.mkdir(parents=True, exist_ok=True)
    seeds = seeds_of(options.half, options.traces, options.first)
    marks = _run(seeds, options.family, options.method, options.jobs, options.failures)
    figures = {"all": summarise(marks)}
    title = f"{options.family or 'all families'}, {options.half} half, {options.method}"
    print(table(title, figures["all"]))
    if options.family is None:
        print(
            f"\n  {'family':<20}{'n':>5}{'collapse %':>12}{'transitions %':>15}{'knees in 2u':>13}"
        )
        for family in FILM_FAMILIES:
            part = [m for m in marks if m.family == family]
            if not part:
                continue
            figures[family] = summary = summarise(part)
            cover = summary["coverage"]["knees"]["percent"]
            print(
                f"  {family:<20}{len(part):>5}{summary['collapse']['percent']:>12.1f}"
                f"{summary['transitions']['percent']:>15.1f}"
                + (f"{cover:>13.1f}" if cover is not None else f"{'-':>13}")
            )
        if options.by_family:
            for family, summary in figures.items():
                if family != "all":
                    print("\n" + table(family, summary))
    wrong = [m for m in marks if not m.right]
    if wrong and options.list:
        print("\n  wrong calls")
    for m in wrong if options.list else ():
        print(f"  {m.family} {m.seed} ({m.generator}): true {m.expected or '?'}")
        print(f"      found {m.error or m.called}")
    if options.json is not None:
        options.json.write_text(json.dumps(figures, indent=1) + "\n", encoding="utf-8")
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
