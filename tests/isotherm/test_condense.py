"""Nodes, noise and spikes."""

import numpy as np
import pytest

from isotherm.condense import condense, despike, row_noise


def _line(n: int) -> tuple[np.ndarray, np.ndarray]:
    area = np.linspace(1.0, 0.5, n)
    return area, 60.0 * (1.0 - area)


@pytest.mark.parametrize("n", [40, 300, 5000, 200_000])
def test_noise_is_recovered_from_a_line(n: int) -> None:
    area, pressure = _line(n)
    random = np.random.default_rng(n)
    found = row_noise(area, pressure + 0.1 * random.standard_normal(n))
    assert found == pytest.approx(0.1, rel=0.35 if n < 100 else 0.15)


def test_nodes_lie_on_a_straight_line_and_use_every_row() -> None:
    area, pressure = _line(50_000)
    nodes = condense(area, pressure, 0.01)
    assert nodes.x.size <= 256
    assert nodes.count.sum() == 50_000
    assert np.all(np.diff(nodes.x) > 0)
    assert nodes.pressure == pytest.approx(60.0 * (1.0 - nodes.area), abs=1e-9)
    assert nodes.sigma == pytest.approx(0.01 / np.sqrt(nodes.count))


def test_steep_and_flat_stretches_both_get_nodes() -> None:
    area = np.linspace(1.0, 0.2, 20_000)
    pressure = np.maximum(0.0, 4000 * (0.21 - area))
    nodes = condense(area, pressure, 0.01)
    steep = int((nodes.area < 0.21).sum())
    assert 60 < steep < 200


def test_few_rows_are_kept_as_they_are() -> None:
    area, pressure = _line(15)
    nodes = condense(area, pressure, 0.1)
    assert nodes.area == pytest.approx(area)
    assert nodes.pressure == pytest.approx(pressure)


@pytest.mark.parametrize("length", [1, 2, 3])
def test_spikes_are_marked_and_nothing_else(length: int) -> None:
    _area, pressure = _line(2000)
    random = np.random.default_rng(length)
    noisy = pressure + 0.05 * random.standard_normal(2000)
    noisy[700 : 700 + length] += 4.0
    marked = np.flatnonzero(despike(noisy, 0.05))
    assert list(marked) == list(range(700, 700 + length))


def test_a_sharp_collapse_is_not_a_spike() -> None:
    rows = np.arange(2000.0)
    pressure = np.where(rows < 1500, 0.04 * rows, 60.0 - 0.4 * (rows - 1500))
    random = np.random.default_rng(9)
    assert despike(pressure + 0.05 * random.standard_normal(2000), 0.05).sum() == 0


def test_sparse_runs_are_never_despiked() -> None:
    pressure = np.zeros(60)
    pressure[30] = 20.0
    assert despike(pressure, 0.05).sum() == 0
