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
    area, pressure = _line(2000)
    random = np.random.default_rng(length)
    noisy = pressure + 0.05 * random.standard_normal(2000)
    noisy[700 : 700 + length] += 4.0
    marked = np.flatnonzero(despike(area, noisy, 0.05))
    assert list(marked) == list(range(700, 700 + length))


def test_a_sharp_collapse_is_not_a_spike() -> None:
    rows = np.arange(2000.0)
    pressure = np.where(rows < 1500, 0.04 * rows, 60.0 - 0.4 * (rows - 1500))
    random = np.random.default_rng(9)
    noisy = pressure + 0.05 * random.standard_normal(2000)
    assert despike(3000.0 - rows, noisy, 0.05).sum() == 0


def test_sparse_runs_are_never_despiked() -> None:
    pressure = np.zeros(60)
    pressure[30] = 20.0
    assert despike(np.linspace(1.0, 0.5, 60), pressure, 0.05).sum() == 0


def test_nodes_are_means_of_consecutive_rows() -> None:
    random = np.random.default_rng(3)
    area = np.linspace(1.2, 0.3, 5000)
    pressure = np.maximum(0.0, 80.0 * (0.8 - area)) + 0.05 * random.standard_normal(5000)
    nodes = condense(area, pressure, 0.05)
    for i in (0, 1, 100, nodes.x.size - 1):
        rows = slice(int(nodes.first[i]), int(nodes.first[i] + nodes.count[i]))
        assert nodes.area[i] == pytest.approx(area[rows].mean(), rel=1e-12)
        assert nodes.pressure[i] == pytest.approx(pressure[rows].mean(), abs=1e-9)
        assert nodes.x[i] == pytest.approx(-np.log(area[rows].mean()), rel=1e-12)
        assert nodes.sigma[i] == pytest.approx(0.05 / np.sqrt(nodes.count[i]))
    assert nodes.stop == pytest.approx(-np.log(0.3))
    assert nodes.first.tolist() == (np.cumsum(nodes.count) - nodes.count).astype(int).tolist()


def test_nodes_are_evenly_spaced_along_the_curve() -> None:
    """Three straight legs in the plane of x and pressure, both scaled to their range; lengths by hand."""
    x = np.linspace(0.0, 1.0, 30_001)
    pressure = np.where(x < 0.4, 0.0, np.where(x < 0.5, 500.0 * (x - 0.4), 50.0))
    nodes = condense(np.exp(-x), pressure, 0.01)
    at = nodes.x
    counts = [int((at < 0.4).sum()), int(((at >= 0.4) & (at < 0.5)).sum()), int((at >= 0.5).sum())]
    # lengths 0.4, sqrt(0.1² + 1) and 0.5, and a quarter shared out by x
    lengths = np.array([0.4, np.hypot(0.1, 1.0), 0.5]) + 0.25 * np.array([0.4, 0.1, 0.5])
    assert counts == pytest.approx(256 * lengths / lengths.sum(), abs=3)


def test_known_noise_lends_less_length() -> None:
    """Half of the run is a level, noisy stretch: told its noise, it gets nearly the nodes its x is worth."""
    random = np.random.default_rng(5)
    x = np.linspace(0.0, 1.0, 20_000)
    pressure = np.where(x < 0.5, 0.0, 4.0 * (x - 0.5)) + 0.03 * random.standard_normal(20_000)
    level = [int((condense(np.exp(-x), pressure, noise).x < 0.5).sum()) for noise in (0.03, 0.0)]
    lengths = np.array([0.5, np.hypot(0.5, 1.0)]) + 0.25 * np.array([0.5, 0.5])
    worth = 256 * lengths[0] / lengths.sum()
    assert worth < level[0] < level[1]
    assert level[0] < worth + 12


def test_rounded_readings_are_known_to_their_step() -> None:
    """A reading of 0.5 mN/m steps and no scatter: u of a node is q/√12 over the root of steps crossed."""
    area = np.linspace(1.0, 0.5, 900)
    pressure = np.round(60.0 * (1.0 - area) / 0.5) * 0.5
    nodes = condense(area, pressure, 0.01)
    crossed = 1.0 + np.abs(np.gradient(nodes.pressure)) / 0.5
    expected = np.sqrt(0.01**2 / nodes.count + 0.25 / 12.0 / crossed)
    assert nodes.sigma == pytest.approx(expected, rel=1e-6)


def test_a_reading_without_scatter_is_known_to_its_digits() -> None:
    area, pressure = _line(2000)
    nodes = condense(area, pressure, 0.0)
    assert nodes.sigma == pytest.approx(1e-6 * float(np.ptp(pressure)) / np.sqrt(nodes.count))


def test_few_points_scatter_no_more_than_a_figure_is_read() -> None:
    area, pressure = _line(20)
    rough = pressure + np.where(np.arange(20) % 2, 3.0, -3.0)
    assert row_noise(area, rough) == pytest.approx(0.006 * float(np.ptp(rough)))
    assert row_noise(area[:4], pressure[:4]) == 0.0


@pytest.mark.parametrize("at", [0, 3, 1994, 1999])
def test_spikes_near_the_ends_are_marked_too(at: int) -> None:
    area, pressure = _line(2000)
    noisy = pressure + 0.05 * np.random.default_rng(at).standard_normal(2000)
    noisy[at] -= 4.0
    assert np.flatnonzero(despike(area, noisy, 0.05)).tolist() == [at]


@pytest.mark.parametrize("backwards", [False, True])
def test_the_last_rows_beyond_a_bend_are_no_spikes(backwards: bool) -> None:
    """A run that stops five rows after a kink keeps them."""
    area = np.linspace(1.0, 0.5, 800)
    pressure = 40.0 * (1.0 - area)
    pressure[-5:] += 2.0 * np.arange(1, 6)
    pressure = pressure + 0.02 * np.random.default_rng(2).standard_normal(800)
    if backwards:
        area, pressure = area[::-1], pressure[::-1]
    assert despike(area, pressure, 0.02).sum() == 0


def test_rows_taken_at_odd_moments_are_no_spikes() -> None:
    """A steep line read at random moments; by row number it would look like scatter of 2 mN/m."""
    random = np.random.default_rng(4)
    area = np.sort(random.uniform(0.2, 0.3, 600))[::-1]
    pressure = 600.0 * (0.3 - area) + 0.03 * random.standard_normal(600)
    assert row_noise(area, pressure) == pytest.approx(0.03, rel=0.15)
    assert despike(area, pressure, 0.03).sum() == 0
    pressure[300:302] -= 3.0
    assert np.flatnonzero(despike(area, pressure, 0.03)).tolist() == [300, 301]
