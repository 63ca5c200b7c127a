"""A small slice of the accuracy programme for holds, on reported seeds, against the floors of the task."""

from __future__ import annotations

from functools import cache

import numpy as np
from hold_score import Score, score_one

HOLDS = 40  # eight of each law; the sampling error of a share of 0.9 is then 0.05


@cache
def scores() -> tuple[Score, ...]:
    found = tuple(score_one(seed) for seed in range(700_000, 700_000 + HOLDS))
    return tuple(score for score in found if score is not None)


def test_every_hold_is_analysed_and_its_kind_known() -> None:
    assert len(scores()) == HOLDS
    assert sum(score.kind == score.kind_found for score in scores()) >= HOLDS - 2


def test_law_chosen() -> None:
    assert np.mean([score.chosen == score.law for score in scores()]) >= 0.9 - 0.05


def test_loss_over_four_hours() -> None:
    off = np.array([abs(s.loss / s.truth - 1.0) for s in scores() if s.truth > 0])
    assert off.size >= 30
    assert np.median(off) <= 0.03
    assert np.mean(off <= 0.1) >= 0.9 - 0.05


def test_truth_lies_inside_two_u() -> None:
    inside = np.mean([abs(s.loss - s.truth) <= 2.0 * s.u for s in scores()])
    assert inside >= 0.9 - 0.05
