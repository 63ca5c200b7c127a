"""The zero of pressure against NumPy's weighted line, and what keeps it from being subtracted."""

from __future__ import annotations

import re

import numpy as np
import pytest
from numpy.typing import NDArray

from isotherm.condense import Nodes
from isotherm.zero import find_zero

NODES = 60  # 40 of them before lift-off
ROWS = 50  # in each node
END = 0.39  # x of the end of the flat start


def _nodes(pressure: NDArray[np.float64], sigma: float = 0.01) -> Nodes:
    """Nodes at x = 0, 0.01, ... with the given pressures and 50 rows each."""
    x = np.arange(NODES) * 0.01
    count = np.full(NODES, float(ROWS))
    return Nodes(
        x, np.exp(-x), pressure, count, np.full(NODES, sigma), sigma * np.sqrt(ROWS),
        np.arange(NODES) * ROWS, float(x[-1]),
    )  # fmt: skip


def _flat(level: float, trend: float = 0.0, seed: int = 1) -> NDArray[np.float64]:
    """A level start with a straight trend (mN/m over its 40 nodes) and noise, then a rise."""
    at = np.arange(NODES)
    noise = 0.01 * np.random.default_rng(seed).standard_normal(NODES)
    return np.asarray(level + trend * at / 40.0 + noise + 2.0 * np.maximum(at - 39, 0))


def test_a_level_start_is_its_mean() -> None:
    pressure = _flat(0.3)
    zero = find_zero(_nodes(pressure), END)
    assert zero.warnings == ()
    assert zero.baseline_rows == 40 * ROWS
    assert zero.offset.value == pytest.approx(pressure[:40].mean())
    assert zero.offset.u_random == pytest.approx(0.01 / np.sqrt(40), rel=0.3)
    # as much drift as could hide in the noise of the baseline, over the twenty nodes after it
    row = np.arange(40) * ROWS + 25.0
    u_slope = np.sqrt(
        np.polyfit(row, pressure[:40], 1, w=np.full(40, 100.0), cov="unscaled")[1][0, 0]
    )
    assert zero.offset.u_systematic == pytest.approx(u_slope * 20.5 * ROWS / np.sqrt(3.0), rel=0.3)


def test_a_straight_drift_is_followed_to_its_end() -> None:
    pressure = _flat(-0.2, trend=0.2)
    zero = find_zero(_nodes(pressure), END)
    row = np.arange(40) * ROWS + 25.0
    (slope, level), covariance = np.polyfit(
        row, pressure[:40], 1, w=np.full(40, 100.0), cov="unscaled"
    )
    assert zero.warnings == ()
    assert zero.offset.value == pytest.approx(slope * row[-1] + level, rel=1e-6)
    scatter = max(1.0, float(np.sum(((pressure[:40] - slope * row - level) / 0.01) ** 2)) / 38.0)
    away = row[-1] - row.mean()
    u = np.sqrt(scatter * (1e-4 / 40 + covariance[0, 0] * away**2))
    assert zero.offset.u_random == pytest.approx(u, rel=1e-6)
    rest = NODES * ROWS - row[-1]
    assert zero.offset.u_systematic == pytest.approx(abs(slope) * rest / np.sqrt(3.0), rel=1e-6)


@pytest.mark.parametrize(
    ("pressure", "end", "says"),
    [
        (_flat(0.0), None, "no flat start"),
        (_flat(0.0), -0.5, "too few points"),
        (_flat(0.0, trend=0.5), END, r"not flat .it changes by \+0.49"),
        (_flat(0.0, trend=-0.5), END, r"not flat .it changes by -0.49"),
        (_flat(1.2), END, r"reads \+1.20 mN/m"),
        (_flat(-1.2), END, r"reads -1.20 mN/m"),
        # a gas resists ever more: what bends is film, however little
        (_flat(0.0) + 0.3 * (np.arange(NODES) / 40.0) ** 4, END, "not flat"),
    ],
)
def test_what_is_no_zero_is_not_subtracted(
    pressure: NDArray[np.float64], end: float | None, says: str
) -> None:
    zero = find_zero(_nodes(pressure), end)
    assert zero.offset.value == 0.0
    assert zero.offset.u_random is None
    assert zero.offset.u_systematic == pytest.approx(0.35 / np.sqrt(3.0))
    (warning,) = zero.warnings
    assert re.search(says, warning), warning


@pytest.mark.parametrize("trend", [0.3, -0.3])
def test_a_drift_below_what_probes_do_is_subtracted(trend: float) -> None:
    zero = find_zero(_nodes(_flat(0.1, trend=trend)), END)
    assert zero.warnings == ()
    assert zero.offset.value == pytest.approx(0.1 + trend * 39 / 40, abs=0.02)


@pytest.mark.parametrize("level", [0.95, -0.95])
def test_a_level_below_one_is_subtracted(level: float) -> None:
    zero = find_zero(_nodes(_flat(level)), END)
    assert zero.offset.value == pytest.approx(level, abs=0.01)


def test_a_short_start_takes_the_nodes_beside_it() -> None:
    zero = find_zero(_nodes(_flat(0.2)), 0.015)
    assert zero.warnings == ()
    assert zero.baseline_rows == 4 * ROWS
