"""Score `transfer.analysis.analyse_log` on simulated dipping logs.

    python tests/accuracy/transfer_score.py --logs 200 --half tune --jobs 2 --failures /some/folder

Even seeds are the half to tune on, odd seeds the half to report, once. --baseline scores a hasty spreadsheet,
--limit least squares that is told strokes and contact.
"""

from __future__ import annotations

import argparse
import sys
import time
from collections.abc import Callable, Iterable
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from functools import partial
from pathlib import Path

import numpy as np

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from transfer_matching import Match, Reading, compare, reading_from_json
from transfer_pictures import draw_log
from transfer_references import spreadsheet, told_least_squares
from transfer_simulator import FAMILIES, simulate
from transfer_truth import SimulatedLog, Truth

from isotherm.sheet import RunSheet

__all__ = ["Figures", "LogScore", "figures", "main", "read_with_upstroke", "score_log", "seeds"]

WORST = 30  # pictures drawn of failing logs, at most
PASSES = "pass while set-point changed"  # trait of logs scored apart, too
READERS = ("upstroke", "baseline", "limit")


@dataclass(frozen=True)
class LogScore:
    """One log scored: its truth, what was read, how it matches, rows, seconds taken."""

    truth: Truth
    reading: Reading
    match: Match
    rows: int
    seconds: float


@dataclass(frozen=True)
class Figures:
    """The figures of the table; shares are 0–1, NaN where nothing was there to be scored."""

    logs: int
    strokes: int
    strokes_right: float
    strokes_right_plain: float
    type_right: float
    median: float
    ninety: float
    ninety_nine: float
    covered: float
    covered_inexact: float
    drop_located: float
    steady_untouched: float
    renewals_right: float
    judged: float
    ends_flagged: float
    contact_covered: float
    contact_error: float
    seconds_per_million: float


def seeds(half: str, logs: int) -> list[int]:
    """Even seeds for "tune", odd for "report"."""
    return [2 * i + (half == "report") for i in range(logs)]


def read_with_upstroke(log: SimulatedLog, sheet: RunSheet, truth: Truth) -> Reading:
    """Run the project's own analysis; `truth` is not looked at."""
    from isotherm.errors import UpstrokeError
    from isotherm.source import Source
    from transfer.analysis import analyse_log
    from transfer.log import DippingLog

    source = Source(path="simulated.csv", digest="", rows=log.time.size, columns={})
    record = DippingLog(log.time, log.position, log.area, log.pressure, source)
    try:
        return reading_from_json(analyse_log(record, sheet).to_json())
    except UpstrokeError as error:
        return Reading((), error=str(error))


def score_log(job: tuple[int, str], reader: str = "upstroke") -> LogScore:
    """Simulate and score one log.

    Parameters
    ----------
    job : (seed, family)
    reader : str
        One of READERS.
    """
    seed, family = job
    log, sheet, truth = simulate(seed, family)
    begin = time.process_time()
    if reader == "baseline":
        reading = spreadsheet(log, sheet, truth.contact)
    elif reader == "limit":
        reading = told_least_squares(log, sheet, truth)
    else:
        reading = read_with_upstroke(log, sheet, truth)
    seconds = time.process_time() - begin
    row = float(np.median(np.diff(log.time)))
    return LogScore(truth, reading, compare(reading, truth, row), log.time.size, seconds)


def _share(values: Iterable[bool | None]) -> float:
    known = [v for v in values if v is not None]
    return float(np.mean(known)) if known else float("nan")


def _coverage(scores: list[LogScore], exact: bool) -> float:
    return _share(
        abs(e.error) <= 2.0 * e.u
        for s in scores
        for e in s.match.errors
        if e.u is not None and s.truth.exact_sheet is exact
    )


def figures(scores: list[LogScore]) -> Figures:
    """Sum up. TR errors are taken on logs whose sheet is exact, so that they are the method's own."""
    own = [s for s in scores if s.truth.exact_sheet]
    errors = np.abs([e.error for s in own for e in s.match.errors])
    median, ninety, ninety_nine = (
        np.percentile(errors, [50, 90, 99]) if errors.size else np.full(3, np.nan)
    )
    searched = [s for s in scores if not s.truth.contact_given]
    places = [(s.reading.contact, s.truth.contact) for s in searched if s.reading.contact]
    judged = sum(len(s.match.errors) for s in scores)
    silent = sum(s.match.unjudged for s in scores)
    open_ended = [s for s in scores if any(k.flag_due for k in s.truth.strokes)]
    looked = [s for s in scores if s.reading.changes is not None]
    return Figures(
        len(scores),
        judged,
        _share(s.match.strokes_right for s in scores),
        _share(s.match.strokes_right for s in scores if PASSES not in s.truth.traits),
        _share(s.match.type_right for s in scores),
        float(median),
        float(ninety),
        float(ninety_nine),
        _coverage(scores, True),
        _coverage(scores, False),
        _share(s.match.drop_located for s in scores),
        _share(s.match.invented_changes == 0 for s in looked if s.truth.steady),
        _share(s.match.renewals_right for s in scores),
        judged / max(judged + silent, 1),
        _share(s.match.guessed == 0 for s in open_ended),
        _share(abs(p[0] - c) <= 2.0 * p[1] for p, c in places if p[1] is not None),
        float(np.median([abs(p[0] - c) for p, c in places])) if places else float("nan"),
        1e6 * sum(s.seconds for s in scores) / max(sum(s.rows for s in scores), 1),
    )


def _percent(x: float) -> str:
    return "–" if np.isnan(x) else f"{100 * x:5.1f}%"


LINES: tuple[tuple[str, str, str, str], ...] = (
    ("logs", "logs", "", ""),
    ("strokes scored", "strokes", "", ""),
    ("all strokes found, none invented", "strokes_right", "%", ">= 99 %"),
    ("same, without passes off pressure", "strokes_right_plain", "%", ""),
    ("deposition type right", "type_right", "%", ">= 98 %"),
    ("TR error, median", "median", "n", "<= 0.0015"),
    ("TR error, 90 %", "ninety", "n", "<= 0.006"),
    ("TR error, 99 %", "ninety_nine", "n", "<= 0.02"),
    ("truth inside 2u (exact sheet)", "covered", "%", "92-98 %"),
    ("truth inside 2u (sheet off by u)", "covered_inexact", "%", "92-98 %"),
    ("20 % drop within one stroke", "drop_located", "%", ">= 95 %"),
    ("steady build left alone", "steady_untouched", "%", ""),
    ("renewals right", "renewals_right", "%", ""),
    ("found strokes given a TR", "judged", "%", ""),
    ("unjudgeable strokes flagged", "ends_flagged", "%", ""),
    ("contact inside 2u, if searched", "contact_covered", "%", ""),
    ("contact error, median / mm", "contact_error", "n", ""),
    ("seconds per million rows", "seconds_per_million", "n", "<= 1.7"),
)


def _table(scores: list[LogScore], families: list[str]) -> str:
    groups = [("all", scores)] + [
        (f, [s for s in scores if s.truth.family == f]) for f in families if len(families) > 1
    ]
    sums = [(name, figures(group)) for name, group in groups]
    width = 35
    lines = [" " * width + "".join(f"{n[:7]:>8}" for n, _ in sums) + "  must reach"]
    for text, name, kind, reach in LINES:
        cells = []
        for _, sum_ in sums:
            x = float(getattr(sum_, name))
            cells.append(
                _percent(x)
                if kind == "%"
                else (f"{x:.5f}"[:7] if kind == "n" else f"{x:.0f}").replace("nan", "–")
            )
        lines.append(f"{text:<{width}}" + "".join(f"{c:>8}" for c in cells) + f"  {reach}")
    return "\n".join(line.rstrip() for line in lines)


def _badness(score: LogScore) -> tuple[float, str]:
    """How much a log asks to be looked at, and why."""
    match, why = score.match, []
    bad = 0.0
    if score.reading.error:
        bad, why = bad + 20.0, [f"error: {score.reading.error[:60]}"]
    if not match.strokes_right:
        bad, why = bad + 10.0, [*why, f"missed {match.missed} invented {match.invented}"]
    if match.type_right is False:
        bad, why = bad + 8.0, [*why, f"type {score.truth.type} read {score.reading.type}"]
    if match.drop_located is False:
        bad, why = (
            bad + 5.0,
            [*why, f"drop after {score.truth.drop_after} read {match.change_found}"],
        )
    if match.guessed:
        bad, why = bad + 4.0, [*why, "guessed"]
    if not match.renewals_right:
        bad, why = bad + 3.0, [*why, "renewals"]
    worst = max((abs(e.error) for e in match.errors), default=0.0)
    scaled = max((abs(e.error) / e.u for e in match.errors if e.u), default=0.0)
    if (worst > 0.02 and score.truth.exact_sheet) or scaled > 4.0:
        bad, why = bad + min(worst, 1.0) + 1.0, [*why, f"TR off by {worst:.4f}, {scaled:.1f} u"]
    return bad, "; ".join(why)


def _report_failures(scores: list[LogScore], folder: Path | None) -> None:
    ranked = sorted(((*_badness(s), s) for s in scores), key=lambda x: -x[0])
    for bad, why, score in ranked:
        if bad <= 0.0:
            break
        truth = score.truth
        print(f"{truth.family} {truth.seed} [{', '.join(truth.traits)}]: {why}")
    if folder is None:
        return
    folder.mkdir(parents=True, exist_ok=True)
    for bad, _, score in ranked[:WORST]:
        if bad > 0.0:
            log, _, truth = simulate(score.truth.seed, score.truth.family)
            path = folder / f"{truth.family}-{truth.seed}.png"
            draw_log(path, log, truth, score.reading, score.match)


def main() -> None:
    """Run the programme from the command line."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else "")
    parser.add_argument("--logs", type=int, default=200, help="logs to simulate")
    parser.add_argument("--half", choices=["tune", "report"], default="tune")
    parser.add_argument("--family", choices=FAMILIES, help="one family only (default: in turn)")
    parser.add_argument("--seed", type=int, help="score this single seed (with --family)")
    parser.add_argument("--jobs", type=int, default=1, help="processes")
    parser.add_argument("--failures", type=Path, help="folder for pictures of failing logs")
    parser.add_argument("--quiet", action="store_true", help="do not list failing logs")
    which = parser.add_mutually_exclusive_group()
    which.add_argument("--baseline", action="store_true", help="score the hasty spreadsheet")
    which.add_argument("--limit", action="store_true", help="score least squares told the strokes")
    options = parser.parse_args()
    families = [options.family] if options.family else list(FAMILIES)
    chosen = [options.seed] if options.seed is not None else seeds(options.half, options.logs)
    jobs = [(seed, families[i % len(families)]) for i, seed in enumerate(chosen)]
    reader = "baseline" if options.baseline else "limit" if options.limit else "upstroke"
    work: Callable[[tuple[int, str]], LogScore] = partial(score_log, reader=reader)
    if options.jobs > 1:
        with ProcessPoolExecutor(options.jobs) as pool:
            scores = list(pool.map(work, jobs, chunksize=4))
    else:
        scores = [work(job) for job in jobs]
    if not options.quiet:
        _report_failures(scores, options.failures)
    print(f"\n{reader}, half to {options.half}, {len(scores)} logs")
    print(_table(scores, families))


if __name__ == "__main__":
    main()
