"""Score the isotherm analysis on films from equations of state.

    python tests/accuracy/isotherm_states_score.py --runs 270 --half report

Even seeds are the tune half, odd seeds the report half. A roll-over has no one pressure: any between its
beginning and its level counts.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

if __name__ == "__main__":  # run as a script: the packages lie two folders up
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from isotherm_states import KINDS, StatesTruth, simulate_states

from isotherm.analysis import analyse
from isotherm.result import Branch

__all__ = ["StatesMark", "main", "score_run"]

_NEAR = 1.5  # mN/m a called pressure may be off


@dataclass(frozen=True)
class StatesMark:
    """What was called rightly of one run, and the errors of pressures, mN/m, with their u."""

    seed: int
    truth: StatesTruth
    collapse: bool
    transitions: bool
    errors: tuple[tuple[str, float, float], ...]
    found: str


def _collapse(branch: Branch, truth: StatesTruth) -> tuple[bool, list[tuple[str, float, float]]]:
    called, true = branch.collapse, truth.collapse
    if called is None or true is None:
        return called is None and true is None, []
    error = called.pressure.value - true[1]
    above = truth.highest - true[1] if truth.form == "roll" else 0.0
    scored = [] if truth.form == "roll" else [("collapse", error, called.pressure.u or 0.0)]
    return -_NEAR < error < above + _NEAR, scored


def _transitions(branch: Branch, truth: StatesTruth) -> tuple[bool, list[tuple[str, float, float]]]:
    kinks = [t.at for t in branch.transitions if t.kind == "kink" and t.at is not None]
    plateaus = [
        (t.onset, t.end) for t in branch.transitions if t.onset is not None and t.end is not None
    ]
    if (len(kinks), len(plateaus)) != (len(truth.kinks), len(truth.coexistences)):
        return False, []
    errors = [
        ("kink", point.pressure.value - true, point.pressure.u or 0.0)
        for point, (_, true) in zip(kinks, truth.kinks, strict=True)
    ]
    for (onset, end), true in zip(plateaus, truth.coexistences, strict=True):
        # a plateau of finite cooperativity slopes; the transition's pressure is that of its middle
        middle = 0.5 * (onset.pressure.value + end.pressure.value)
        u = 0.5 * np.hypot(onset.pressure.u or 0.0, end.pressure.u or 0.0)
        errors.append(("plateau", middle - true, float(u)))
    return all(abs(error) < _NEAR for _, error, _ in errors), errors


def score_run(seed: int) -> StatesMark:
    """Simulate, analyse and mark one seed."""
    trace, truth = simulate_states(seed)
    branch = analyse(trace).branches[0]
    right, errors = _collapse(branch, truth)
    transitions, more = _transitions(branch, truth)
    found = f"collapse {branch.collapse and round(branch.collapse.pressure.value, 1)}, " + (
        ", ".join(t.kind for t in branch.transitions) or "no transition"
    )
    return StatesMark(seed, truth, right, transitions, (*errors, *more), found)


def main(arguments: Sequence[str] | None = None) -> int:
    """Print a table, and every wrong call."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--runs", type=int, default=160)
    parser.add_argument("--half", choices=("tune", "report"), default="tune")
    parser.add_argument("--list", action="store_true", help="list every wrong call")
    options = parser.parse_args(arguments)
    odd = int(options.half == "report")
    marks = [score_run(2 * i + odd) for i in range(options.runs)]
    print(f"  {'film':<18}{'n':>5}{'collapse %':>12}{'transitions %':>15}")
    for kind in (*KINDS, "all"):
        part = [m for m in marks if kind in ("all", m.truth.kind)]
        if part:
            share = [
                100.0 * np.mean([getattr(m, n) for m in part]) for n in ("collapse", "transitions")
            ]
            print(f"  {kind:<18}{len(part):>5}{share[0]:>12.1f}{share[1]:>15.1f}")
    for name in ("collapse", "kink", "plateau"):
        errors = np.array([(e, u) for m in marks for what, e, u in m.errors if what == name])
        if errors.size:
            size = np.abs(errors[:, 0])
            inside = 100.0 * np.mean(size <= 2.0 * errors[:, 1])
            print(
                f"  {name} pressure: median {np.median(size):.3f}, 90 % {np.quantile(size, 0.9):.3f} mN/m, "
                f"inside 2u {inside:.0f} % (n {size.size})"
            )
    for m in marks if options.list else ():
        if not (m.collapse and m.transitions):
            print(f"  {m.seed} {m.truth.kind} {m.truth.form}: true {m.truth.collapse}, "
                  f"{m.truth.kinks}, {m.truth.coexistences}; found {m.found}")  # fmt: skip
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
