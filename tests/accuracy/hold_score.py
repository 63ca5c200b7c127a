"""Score film-stability fits on simulated holds: law chosen, loss over 4 h, coverage, settling found.

    python tests/accuracy/hold_score.py --holds 200 --seed 700000

Seeds below 500000 were used while the methods were made; reported figures use seeds from 700000.
"""

from __future__ import annotations

import argparse
import sys
from dataclasses import dataclass
from functools import partial
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent))
sys.path.insert(0, str(Path(__file__).parents[2]))

from hold_simulate import KINDS, LAWS, SimulatedHold, simulate_hold

from isotherm.hold import analyse_hold
from isotherm.hold_read import HoldRecord
from isotherm.hold_segments import find_stretches
from isotherm.source import Source

FOUR_HOURS = 4 * 3600.0


@dataclass(frozen=True)
class Score:
    """One simulated hold against its truth."""

    seed: int
    law: str
    kind: str
    chosen: str
    kind_found: str
    truth: float
    loss: float
    u: float
    settling: float
    settling_true: float


def record_of(hold: SimulatedHold) -> HoldRecord:
    """Wrap the simulated rows as a record with its holds found from the rows."""
    stretches = find_stretches(hold.time, hold.area, hold.pressure)
    source = Source("simulated", "", hold.time.size)
    return HoldRecord(source, hold.time, hold.area, "cm^2", hold.pressure, stretches)


def score_one(seed: int, noise: float = 1.0) -> Score | None:
    """Simulate, analyse and compare one hold; law and kind follow from the seed."""
    rng = np.random.default_rng(seed)
    hold = simulate_hold(rng, LAWS[seed % 5], KINDS[(seed // 5) % 2], noise)
    result = analyse_hold(record_of(hold), planned_time=FOUR_HOURS)
    if not result.holds:
        return None
    found = max(result.holds, key=lambda h: h.duration_s)
    loss = found.loss_over(FOUR_HOURS)
    return Score(
        seed, hold.law, hold.kind, found.chosen, found.kind, hold.truth_loss_4h, loss.value,
        loss.u or 0.0, found.settling_s, hold.settling,
    )  # fmt: skip


def summary(scores: list[Score | None]) -> str:
    """Table of what matters, per law and together."""
    done = [s for s in scores if s is not None]
    lines = [
        f"{len(done)} of {len(scores)} analysed",
        f"{'law':<13}{'right':>7}{'med':>8}{'<10 %':>8}{'+-2u':>8}",
    ]
    for law in (*LAWS, "all"):
        some = [s for s in done if law in (s.law, "all")]
        lossy = [abs(s.loss / s.truth - 1.0) for s in some if s.truth > 0]
        right = np.mean([s.chosen == s.law for s in some])
        inside = np.mean([abs(s.loss - s.truth) <= 2.0 * s.u for s in some])
        median = (
            f"{np.median(lossy):8.3f}{np.mean(np.array(lossy) < 0.1):8.2f}" if lossy else " " * 16
        )
        lines.append(f"{law:<13}{right:7.2f}{median}{inside:8.2f}")
    kinds = np.mean([s.kind == s.kind_found for s in done])
    lines.append(f"kind of hold right: {kinds:.3f}")
    return "\n".join(lines)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--holds", type=int, default=100)
    parser.add_argument("--seed", type=int, default=0)
    parser.add_argument("--noise", type=float, default=1.0, help="times that of ordinary troughs")
    parser.add_argument("--jobs", type=int, default=1)
    parser.add_argument(
        "--misses", action="store_true", help="list wrong laws and losses off by > 3 u"
    )
    options = parser.parse_args()
    seeds = range(options.seed, options.seed + options.holds)
    if options.jobs > 1:
        from multiprocessing import Pool

        with Pool(options.jobs) as pool:
            scores = pool.map(partial(score_one, noise=options.noise), seeds, chunksize=5)
    else:
        scores = [score_one(seed, options.noise) for seed in seeds]
    print(summary(scores))
    if options.misses:
        for s in scores:
            if s is not None and (s.chosen != s.law or abs(s.loss - s.truth) > 3 * s.u):
                print(s)


if __name__ == "__main__":
    main()
