"""Transfer ratios, their uncertainty and their drift against hand work and general libraries."""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np
import pytest
import ruptures
from scipy import stats
from uncertainties import ufloat

from isotherm.quantity import Quantity
from isotherm.sheet import Dipping, RunSheet, Stack, Substrate
from isotherm.source import Source
from transfer.analysis import analyse_log
from transfer.drift import theil_sen
from transfer.drift_changes import change_points
from transfer.evidence_coverage import scan_rate_check
from transfer.evidence_line import scatter_inflation
from transfer.geometry import substrate_geometry
from transfer.log import DippingLog

SURFACE = 12.0  # mm, reading with the lower edge at the water


def by_hand(steps: list[tuple[float, float, float]], film: float, start: float) -> DippingLog:
    """Rows 1 s apart: (depth to go to in mm, film to lose on the way in cm^2, seconds to rest).

    A film that does not creep, under a controller that is never wrong. The film goes evenly with the way.
    """
    depth, area = [start] * 150, [film] * 150
    for to, loss, rest in steps:
        rows = max(2, round(abs(to - depth[-1]) / 0.5))
        # starting and stopping softly: even steps would look like those of a coarse encoder
        way = 0.5 - 0.5 * np.cos(np.pi * np.arange(1, rows + 1) / rows)
        depth += (depth[-1] + (to - depth[-1]) * way).tolist()
        area += (area[-1] - loss * way).tolist()
        depth += [to] * round(rest)
        area += [area[-1]] * round(rest)
    n = len(depth)
    return DippingLog(
        time=np.arange(1.0, n + 1.0),
        position=SURFACE + np.asarray(depth),
        area=np.asarray(area),
        pressure=np.full(n, 30.0),
        source=Source("by_hand.csv", "", n),
    )


def sheet(
    substrate: Substrate, u_surface: float | None = None, stack: Stack | None = None
) -> RunSheet:
    return RunSheet(
        substrate=substrate,
        dipping=Dipping(
            pressure=Quantity(30.0, None, "mN/m"),
            position_reads="depth",
            surface_at=Quantity(SURFACE, u_surface, "mm"),
            modulus=Quantity(150.0, 1.0, "mN/m"),
        ),
        stack=stack or Stack(),
    )


PLATE = Substrate(width=Quantity(20.0, None, "mm"), thickness=Quantity(1.0, None, "mm"))


def test_ratio_of_a_plate_worked_by_hand() -> None:
    """Transfer ratio: area lost by the film over area coated (IUPAC, Pure Appl. Chem.
    1994, 66, 1667; memory).

    Plate 20 mm x 1 mm, dipped 25 mm. Two faces 2 x 2.0 cm x 2.5 cm = 10.0 cm^2, two edges
    2 x 0.1 x 2.5 = 0.5 cm^2, lower face 2.0 x 0.1 = 0.2 cm^2: 10.7 cm^2.
    Down: the film goes from 300.00 to 289.30 cm^2: 10.70 / 10.7 = 1.000.
    Up:   from 289.30 to 279.67 cm^2: 9.63 / 10.7 = 0.900.
    """
    log = by_hand([(25.0, 10.70, 120.0), (-3.0, 9.63, 120.0)], 300.0, -3.0)
    # the way in air takes no film: let it go only under water
    log = only_under_water(log, [(10.70, -3.0, 25.0), (9.63, 25.0, -3.0)])
    down, up = analyse_log(log, sheet(PLATE)).strokes
    assert down.coated_area.value == pytest.approx(10.7, abs=0.002)
    assert up.coated_area.value == pytest.approx(10.7, abs=0.002)
    assert down.film_removed.value == pytest.approx(10.70, abs=0.003)
    assert up.film_removed.value == pytest.approx(9.63, abs=0.003)
    assert down.ratio is not None
    assert up.ratio is not None
    assert down.ratio.value == pytest.approx(1.000, abs=0.0005)
    assert up.ratio.value == pytest.approx(0.900, abs=0.0005)


def only_under_water(log: DippingLog, moves: list[tuple[float, float, float]]) -> DippingLog:
    """Redistribute the film lost in each move over the part of the way under the surface."""
    depth = log.position - SURFACE
    area = log.area.copy()
    inside = np.flatnonzero(np.abs(np.diff(depth, prepend=depth[0])) > 1e-9)
    starts = [inside[0], *inside[1:][np.diff(inside) > 1]]
    for first, (loss, a, b) in zip(starts, moves, strict=True):
        before = area[first - 1]
        last = first
        while last + 1 < depth.size and abs(depth[last + 1] - depth[last]) > 1e-9:
            last += 1
        wet = np.maximum(depth[first : last + 1], 0.0)
        gone = np.abs(wet - max(a, 0.0)) / abs(max(b, 0.0) - max(a, 0.0))
        area[first : last + 1] = before - loss * gone
    return DippingLog(log.time, log.position, area, log.pressure, log.source)


def test_ratio_of_a_rod_that_stays_in_the_water_worked_by_hand() -> None:
    """Rod 8 mm across between 5 and 25 mm: pi x 0.8 cm x 2.0 cm = 5.0265 cm^2, no lower face.

    Film lost going down 5.0265 cm^2, ratio 1; coming up 2.5133 cm^2, ratio 1/2.
    """
    rod = Substrate(shape="rod", diameter=Quantity(8.0, None, "mm"))
    log = by_hand([(25.0, 5.0265, 120.0), (5.0, 2.5133, 120.0)], 200.0, 5.0)
    down, up = analyse_log(log, sheet(rod)).strokes
    for stroke, want in ((down, 1.0), (up, 0.5)):
        assert stroke.coated_area.value == pytest.approx(math.pi * 0.8 * 2.0, abs=0.001)
        assert stroke.ratio is not None
        assert stroke.ratio.value == pytest.approx(want, abs=0.0005)


def coated(width, thick, deep, at):  # type: ignore[no-untyped-def]
    """cm^2 of a plate, lengths in mm, for numbers with or without uncertainty."""
    return (2.0 * (width + thick) * (deep - at) + width * thick) / 100.0


def test_uncertainty_of_the_ratio_against_uncertainties() -> None:
    """Common part: width, thickness and surface, each carried through 10.7 cm^2 as a correlated number."""
    width, thick, at = ufloat(20.0, 0.1), ufloat(1.0, 0.05), ufloat(SURFACE, 0.08)
    plate = Substrate(width=Quantity(20.0, 0.1, "mm"), thickness=Quantity(1.0, 0.05, "mm"))
    losses = (10.70, 9.63, 8.56)
    log = by_hand(
        [(25.0, losses[0], 120.0), (-3.0, losses[1], 120.0), (25.0, losses[2], 120.0)], 300.0, -3.0
    )
    stack = Stack(layer_thickness=Quantity(2.5, 0.1, "nm"))
    result = analyse_log(log, sheet(plate, 0.08, stack))
    area = coated(width, thick, SURFACE + 25.0, at)
    ratios = [stroke.film_removed.value / area for stroke in result.strokes]
    for stroke, want in zip(result.strokes, ratios, strict=True):
        assert stroke.ratio is not None
        assert stroke.ratio.value == pytest.approx(want.nominal_value, rel=5e-4)
        assert stroke.ratio.u_systematic == pytest.approx(want.std_dev, rel=2e-3)
        assert stroke.coated_area.u == pytest.approx(area.std_dev, rel=0.01)
    # what the strokes share is not averaged away in their sum, nor the layer's thickness
    layers = sum(ratios)
    assert result.stack.layers.u_systematic == pytest.approx(layers.std_dev, rel=2e-3)
    thickness = layers * ufloat(2.5, 0.1)
    assert result.stack.thickness is not None
    assert result.stack.thickness.value == pytest.approx(thickness.nominal_value, rel=5e-4)
    assert result.stack.thickness.u_systematic == pytest.approx(thickness.std_dev, rel=2e-3)


def test_uncertainty_of_a_tapered_area_against_uncertainties() -> None:
    """Trapezium 10 to 20 mm wide over 10 mm: a common error of the width, and the thickness."""
    error, thick = ufloat(0.0, 0.1), ufloat(1.0, 0.05)
    slant = math.sqrt(1.25)
    area = (2.0 * 150.0 + 2.0 * error * 10.0 + 2.0 * thick * 10.0 * slant) / 100.0
    area = area + (10.0 + error) * thick / 100.0
    table = Substrate(
        shape="table",
        width=Quantity(20.0, 0.1, "mm"),
        thickness=Quantity(1.0, 0.05, "mm"),
        profile=tuple(SimpleNamespace(height=h, width=w) for h, w in ((0.0, 10.0), (10.0, 20.0))),  # type: ignore[arg-type]
    )
    geometry = substrate_geometry(RunSheet(substrate=table))
    assert geometry.coated(np.asarray([10.0]))[0] == pytest.approx(area.nominal_value)
    assert geometry.u_coated(-1.0, 10.0) == pytest.approx(area.std_dev)


@pytest.mark.parametrize("n", [3, 4, 7, 12, 40])
@pytest.mark.parametrize("noise", [0.0, 0.01, 1.0])
def test_slope_against_scipy_theilslopes(n: int, noise: float) -> None:
    """One direction alone: scipy's slope, and the limits it takes from Sen (1968)."""
    rng = np.random.default_rng(n)
    x = np.arange(1.0, n + 1.0)
    y = 1.0 - 0.004 * x + noise * rng.standard_normal(n)
    found = theil_sen(x, y, np.zeros(n, dtype=np.intp))
    slope, _, low, high = stats.theilslopes(y, x, 0.95)
    assert found is not None
    assert found.slope == pytest.approx(slope, abs=1e-15)
    assert found.low == pytest.approx(low, abs=1e-15)
    assert found.high == pytest.approx(high, abs=1e-15)


def test_slope_of_both_directions_is_the_median_of_both_sets_of_pairs() -> None:
    """Down and up on levels of their own: numpy's median over scipy-style pairs within each."""
    rng = np.random.default_rng(4)
    x = np.arange(1.0, 21.0)
    group = np.tile([1, 0], 10)
    y = np.where(group == 1, 1.0, 0.4) - 0.01 * x + 0.01 * rng.standard_normal(20)
    pairs = [
        (y[j] - y[i]) / (x[j] - x[i])
        for i in range(20)
        for j in range(i + 1, 20)
        if group[i] == group[j]
    ]
    found = theil_sen(x, y, group)
    assert found is not None
    assert found.slope == pytest.approx(np.median(pairs))
    assert found.low < -0.01 < found.high


@pytest.mark.parametrize("levels", [(1.0, 0.8), (1.0, 0.7, 0.9), (0.6, 1.0), (1.0, 0.85, 0.7, 0.5)])
@pytest.mark.parametrize("each", [5, 8])
def test_changes_against_ruptures_dynp(levels: tuple[float, ...], each: int) -> None:
    """Clean steps: the exact least-squares partition of `ruptures` told how many there are."""
    ratios = np.repeat(levels, each) + 0.003 * np.cos(np.arange(each * len(levels)) * 2.4)
    group = np.tile([1, 0], ratios.size)[: ratios.size]
    told = ruptures.Dynp(model="l2", min_size=2, jump=1).fit(ratios.reshape(-1, 1))
    want = told.predict(n_bkps=len(levels) - 1)[:-1]
    assert list(change_points(ratios, group, np.full(ratios.size, 0.002))) == want


@pytest.mark.parametrize("side", [0, 1])
def test_changes_of_one_direction_against_ruptures_dynp(side: int) -> None:
    """Only one direction steps: what Dynp finds in its strokes alone, counted among all strokes."""
    group = np.tile([1, 0], 12)
    ratios = 1.0 + 0.003 * np.cos(np.arange(24) * 2.4)
    ratios = np.where((group == side) & (np.arange(24) > 13), 0.75 * ratios, ratios)
    mine = np.flatnonzero(group == side)
    told = ruptures.Dynp(model="l2", min_size=2, jump=1).fit(ratios[mine].reshape(-1, 1))
    want = int(mine[told.predict(n_bkps=1)[0]])
    assert change_points(ratios, group, np.full(24, 0.002)) == (want,)


@pytest.mark.parametrize("dof", [3, 4, 5, 10, 50])
def test_few_residuals_widen_as_student_says(dof: int) -> None:
    """Variance of Student's t; without one (two degrees of freedom or fewer) nothing can be said."""
    line = SimpleNamespace(dof=dof, noise_scale=1.0)
    assert scatter_inflation(line) == pytest.approx(stats.t.var(dof))  # type: ignore[arg-type]
    for few in (1, 2):
        none = SimpleNamespace(dof=few, noise_scale=1.0)
        assert scatter_inflation(none) == math.inf  # type: ignore[arg-type]


@pytest.mark.parametrize("n", [4, 6, 12])
def test_interval_of_the_scan_rate_against_scipy(n: int) -> None:
    """Scatter far beyond the points' u: slope ± t(0.975) s of a plain regression of the logarithms."""
    rng = np.random.default_rng(n)
    rates = np.geomspace(0.02, 1.0, n)
    heights = 1e-6 * rates * np.exp(0.2 * rng.standard_normal(n))
    found = scan_rate_check(
        [Quantity(float(v), None, "V/s") for v in rates],
        [Quantity(float(h), 1e-3 * float(h), "A") for h in heights],
    )
    plain = stats.linregress(np.log(rates), np.log(heights))
    assert found is not None
    assert found.exponent.value == pytest.approx(plain.slope)
    assert found.exponent.u == pytest.approx(plain.stderr)
    limit = stats.t.ppf(0.975, n - 2) * plain.stderr
    assert found.linear == (abs(plain.slope - 1.0) <= limit)
