"""Score the choice of a dipping pressure on simulated isotherms with known truth.

    python tests/accuracy/target_score.py --traces 200 --half report

Even seeds are the tune half, odd seeds the report half. A recommendation is wrong when it lies in a true
coexistence, closer to a true coexistence or kink than the guard (what a controller of the sheet's tolerance
and overshoot needs, k = 2), within that guard of the true collapse, or beyond it.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections import Counter
from dataclasses import dataclass
from pathlib import Path

if __name__ == "__main__":  # run as a script: the packages lie two folders up
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from isotherm_simulator import FAMILIES, simulate
from isotherm_truth import Truth

from isotherm.analysis import analyse
from isotherm.sheet_read import parse_sheet
from transfer.target import choose_target

__all__ = ["Verdict", "fault_of", "main", "verdict_of"]

TOLERANCE, OVERSHOOT = 0.2, 0.5  # mN/m
SHEET = f'[dipping]\ntolerance = "{TOLERANCE} mN/m"\novershoot = "{OVERSHOOT} mN/m"\n'
BELOW, ABOVE = 2 * TOLERANCE + OVERSHOOT, 2 * TOLERANCE  # mN/m kept below and above a feature
FAMILIES_SCORED = tuple(name for name in FAMILIES if name != "dense")


@dataclass(frozen=True)
class Verdict:
    """One trace. recommended : mN/m or None. wrong : "", "coexistence", "guard" or "collapse"."""

    seed: int
    family: str
    recommended: float | None
    wrong: str


def verdict_of(seed: int, family: str) -> Verdict:
    """Simulate, analyse, choose, and hold the choice against the truth."""
    trace, truth = simulate(seed, family)
    found = choose_target(analyse(trace), parse_sheet(SHEET)).recommended
    if found is None:
        return Verdict(seed, family, None, "")
    return Verdict(seed, family, found.value, fault_of(truth, found.value))


def fault_of(truth: Truth, pressure: float) -> str:
    if truth.collapse is not None and pressure > truth.collapse.pressure - BELOW:
        return "collapse"
    for transition in truth.transitions:
        first = transition.onset or transition.at
        if first is None:
            continue
        low = high = first.pressure
        if transition.kind == "coexistence":
            high = float("inf") if transition.end is None else transition.end.pressure
            if low <= pressure <= high:
                return "coexistence"
        if low - BELOW < pressure < high + ABOVE:
            return "guard"
    return ""


def main() -> None:
    """Run from the command line; prints one JSON object."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--traces", type=int, default=200)
    parser.add_argument("--half", choices=("tune", "report"), default="tune")
    parser.add_argument("--first", type=int, default=0)
    asked = parser.parse_args()
    odd = int(asked.half == "report")
    verdicts = [
        verdict_of(2 * (asked.first + i) + odd, FAMILIES_SCORED[i % len(FAMILIES_SCORED)])
        for i in range(asked.traces)
    ]
    wrong = [v for v in verdicts if v.wrong]
    print(
        json.dumps(
            {
                "traces": len(verdicts),
                "wrong": [vars(v) for v in wrong],
                "no_window": dict(Counter(v.family for v in verdicts if v.recommended is None)),
                "families": dict(Counter(v.family for v in verdicts)),
            },
            indent=1,
        )
    )


if __name__ == "__main__":
    main()
