"""Few points, as read off a figure: what is plain is found, and nothing is invented."""

import os
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from isotherm.analysis import analyse
from isotherm.result import Branch
from isotherm.sheet import RunSheet
from isotherm.source import Source
from isotherm.trace import Trace
from isotherm.trace_read import read_trace

FloatArray = NDArray[np.float64]
BESIDE = Path(__file__).resolve().parents[3] / "shared" / "data" / "published-isotherms"
FOLDER = Path(os.environ.get("UPSTROKE_PUBLISHED_ISOTHERMS", BESIDE))

# corners of films drawn with straight branches: area nm^2, pressure mN/m
ACID = ((0.32, 0.0), (0.25, 0.0), (0.21, 24.0), (0.195, 55.0), (0.180, 55.5))
LECITHIN = ((1.1, 0.0), (0.95, 0.0), (0.75, 8.0), (0.55, 9.5), (0.42, 60.0), (0.38, 60.4))
FALLING = ((0.7, 0.0), (0.5, 0.0), (0.4, 50.0), (0.34, 38.0))


def read_off(
    corners: tuple[tuple[float, float], ...], n: int, noise: float, seed: int = 1
) -> Branch:
    """Analyse n points along the curve, misread by `noise` (share of either axis; area: half of it)."""
    rng = np.random.default_rng(seed)
    area, pressure = np.array(corners).T
    width, height = float(np.ptp(area)), float(np.ptp(pressure))
    way = np.concatenate(
        [[0.0], np.cumsum(np.hypot(np.diff(area) / width, np.diff(pressure) / height))]
    )
    at = np.linspace(0.0, way[-1], n)
    a = np.interp(at, way, area) + 0.5 * noise * width * rng.standard_normal(n)
    p = np.interp(at, way, pressure) + noise * height * rng.standard_normal(n)
    return run(a, p)


def run(area: FloatArray, pressure: FloatArray) -> Branch:
    """Analyse points in the order of falling area."""
    order = np.argsort(-area, kind="stable")
    return analyse(Trace(area[order], pressure[order], Source("points", "", area.size))).headline


@pytest.mark.parametrize("noise", [0.0, 0.001, 0.003])
@pytest.mark.parametrize("n", [20, 32, 60, 90])
def test_an_acid_has_one_kink_and_a_level_collapse(n: int, noise: float) -> None:
    branch = read_off(ACID, n, noise)
    assert [t.kind for t in branch.transitions] == ["kink"]
    kink = branch.transitions[0].at
    assert kink is not None
    assert kink.area.value == pytest.approx(0.21, rel=0.02)
    assert branch.collapse is not None
    assert branch.collapse.kind == "constant-pressure"
    assert branch.collapse.pressure.value == pytest.approx(55.0, abs=1.5)


@pytest.mark.parametrize("noise", [0.0, 0.001, 0.003])
@pytest.mark.parametrize("n", [24, 45, 90])
def test_a_lecithin_has_one_coexistence(n: int, noise: float) -> None:
    branch = read_off(LECITHIN, n, noise)
    assert [t.kind for t in branch.transitions] == ["coexistence"]
    onset, end = branch.transitions[0].onset, branch.transitions[0].end
    assert onset is not None
    assert end is not None
    assert onset.pressure.value == pytest.approx(8.0, abs=1.0)
    assert end.area.value == pytest.approx(0.55, rel=0.03)
    assert branch.collapse is not None


@pytest.mark.parametrize("n", [15, 30, 60])
def test_a_peak_with_few_points_after_it_is_a_collapse(n: int) -> None:
    branch = read_off(FALLING, n, 0.001)
    assert branch.transitions == ()
    assert branch.collapse is not None
    assert branch.collapse.kind == "constant-area"
    assert branch.collapse.pressure.value == pytest.approx(50.0, abs=2.0)


@pytest.mark.parametrize("noise", [0.0, 0.001, 0.003])
@pytest.mark.parametrize("n", [15, 25, 50, 90])
def test_a_fluid_film_has_nothing_to_find(n: int, noise: float) -> None:
    # Volmer, Z. Phys. Chem. 1925, 115, 253: pressure = kT / (A - omega) - cohesion
    rng = np.random.default_rng(n)
    area = np.linspace(1.2, 0.6, n)
    pressure = 2.0 * 4.114 / (area - 0.42)
    pressure = pressure - pressure[0]
    branch = run(area, pressure + noise * np.ptp(pressure) * rng.standard_normal(n))
    assert branch.transitions == ()
    assert branch.collapse is None


def test_repeated_and_doubled_back_points_change_nothing() -> None:
    area, pressure = np.array(LECITHIN[1:]).T
    way = np.linspace(0.0, 4.0, 33)
    a, p = np.interp(way, np.arange(5), area), np.interp(way, np.arange(5), pressure)
    a, p = np.append(a, [a[12], a[12], a[20]]), np.append(p, [p[12] + 0.2, p[12] - 0.2, p[20]])
    branch = run(a, p)
    assert [t.kind for t in branch.transitions] == ["coexistence"]
    assert branch.collapse is not None


def test_a_lone_level_point_after_a_clean_rise_is_a_collapse() -> None:
    area = np.array([0.6, 0.55, 0.5, 0.49, 0.48, 0.47, 0.46, 0.45, 0.44, 0.43, 0.42, 0.4])
    pressure = np.array([0, 0, 0, 5, 10, 15, 20, 25, 30, 35, 40, 40.2])
    collapse = run(area, pressure).collapse
    assert collapse is not None
    assert collapse.pressure.value == pytest.approx(40.2, abs=1.0)
    assert run(area[:-1], pressure[:-1]).collapse is None


@pytest.mark.skipif(not FOLDER.is_dir(), reason="the published isotherms are not here")
@pytest.mark.parametrize(
    ("name", "kinds"),
    [
        ("DPPC_isotherm_LeeLinChang2006.csv", ["coexistence"]),  # doi 10.1016/j.jcis.2005.09.050
        ("POPC_isotherm_Volinsky2012.csv", []),  # doi 10.1016/j.bpj.2012.06.017
        ("POPC_isotherm_Olzynska2016_310K.csv", []),  # doi 10.1016/j.bbamem.2016.09.015
        ("DPPE_isotherm.csv", []),  # doi 10.1073/pnas.0934731100
    ],
)
def test_published_curves_read_alike_without_some_points(name: str, kinds: list[str]) -> None:
    trace = read_trace(FOLDER / name, RunSheet())
    for seed in range(4):
        keep = np.random.default_rng(seed).random(trace.area.size) > 0.12
        branch = run(trace.area[keep], trace.pressure[keep])
        assert [t.kind for t in branch.transitions] == kinds, seed
