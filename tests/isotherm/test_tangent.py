"""The limiting area against NumPy's line on the nodes of the stiffest stretch."""

from __future__ import annotations

import math

import numpy as np
import pytest
from knee_models import straight

from isotherm.branch_view import BranchView
from isotherm.condense import Nodes
from isotherm.knee_model import KneeModel
from isotherm.modulus import local_regression
from isotherm.phases import read_stretches
from isotherm.quantity import Quantity
from isotherm.tangent import limiting_area

SIGMA = 0.02


def _view(model: KneeModel, *, zero: Quantity | None = None, noise: float = 0.0) -> BranchView:
    """A view of 400 nodes on the model; `zero` in mN/m."""
    x = np.linspace(model.start, model.stop, 400)
    noisy = noise * np.random.default_rng(3).standard_normal(x.size)
    pressure = model.pressure(x) + noisy
    nodes = Nodes(
        x, np.exp(-x), pressure, np.ones(x.size), np.full(x.size, SIGMA), SIGMA,
        np.arange(x.size), float(x[-1]),
    )  # fmt: skip
    zero = Quantity(0.0, None, "mN/m") if zero is None else zero
    bounds = np.array([0, x.size])
    local = local_regression(x, pressure, nodes.sigma, bounds)
    return BranchView(nodes, model, read_stretches(model), local, zero, 0.01, 0.1)


# a flat start, a condensed and a solid stretch, a collapse; knees at x = 0.5, 0.6 and 0.66
MODEL = straight((0.5, 0.0), (0.1, 100.0), (0.06, 400.0), (0.1, -30.0))


def _line(view: BranchView, low: float, high: float) -> tuple[float, float, float]:
    """Root, slope and u of the root by `numpy.polyfit` on the nodes between two x."""
    inside = (view.nodes.x >= low) & (view.nodes.x <= high)
    area, pressure = view.nodes.area[inside], view.nodes.pressure[inside] - view.offset
    centre = area.mean()
    (slope, level), covariance = np.polyfit(
        area - centre, pressure, 1, w=np.full(area.size, 1.0 / SIGMA), cov="unscaled"
    )
    rest = (pressure - level - slope * (area - centre)) / SIGMA
    scale = max(1.0, float(rest @ rest) / (area.size - 2))
    u = math.sqrt(scale * (covariance[1, 1] / slope**2 + level**2 / slope**4 * covariance[0, 0]))
    return centre - level / slope, slope, u


@pytest.mark.parametrize("noise", [0.0, 0.02])
def test_it_is_the_line_of_the_stiffest_stretch(noise: float) -> None:
    view = _view(MODEL, noise=noise)
    found = limiting_area(view)
    assert found is not None
    area, tangent = found
    # two widths of rounding at either end belong to no stretch
    low, high = 0.6 + 0.004, 0.66 - 0.004
    root, slope, u = _line(view, low, high)
    assert area.value == pytest.approx(root, rel=1e-9)
    assert tangent.slope == pytest.approx(slope, rel=1e-9)
    assert -tangent.intercept / tangent.slope == pytest.approx(area.value, rel=1e-12)
    inside = (view.nodes.x >= low) & (view.nodes.x <= high)
    assert tangent.area == (view.nodes.area[inside].max(), view.nodes.area[inside].min())
    doubt = max(
        abs(_line(view, max(a, low), min(b, high))[0] - root) / math.sqrt(3.0)
        for a, b in ((0.6 + 0.2 * 0.06, 0.66), (0.6, 0.66 - 0.2 * 0.06))
    )
    assert area.u_random == pytest.approx(math.hypot(u, doubt), rel=1e-6)
    assert area.u_systematic == pytest.approx(math.hypot(0.01 * root, 0.1 / abs(slope)), rel=1e-9)


def test_the_zero_moves_it_and_its_uncertainty() -> None:
    zero = Quantity.combine(0.7, "mN/m", u_random=0.3, u_systematic=0.4)
    plain, moved = limiting_area(_view(MODEL)), limiting_area(_view(MODEL, zero=zero))
    assert plain is not None
    assert moved is not None
    steep = abs(plain[1].slope)
    assert plain[0].value - moved[0].value == pytest.approx(0.7 / steep)
    assert plain[0].u_random is not None
    assert moved[0].u_random == pytest.approx(math.hypot(plain[0].u_random, 0.3 / steep), rel=0.01)
    systematic = math.hypot(0.01 * moved[0].value, math.hypot(0.4, 0.1) / steep)
    assert moved[0].u_systematic == pytest.approx(systematic)


def test_plateaus_and_collapsed_film_do_not_count() -> None:
    model = straight((0.3, 0.0), (0.3, 30.0), (0.3, 2.0), (0.1, 150.0), (0.1, 1.0))
    found = limiting_area(_view(model))
    assert found is not None
    assert found[1].area[0] <= math.exp(-0.9)
    assert found[1].area[1] >= math.exp(-1.0)


def test_a_branch_without_a_rise_has_none() -> None:
    assert limiting_area(_view(straight((1.0, -1.0)))) is None
    assert limiting_area(_view(straight((1.0, 0.0)))) is None
