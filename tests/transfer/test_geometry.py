"""Area of a substrate below the water line, against school geometry."""

from __future__ import annotations

import math
from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet, Substrate, Trough
from isotherm.sheet_read import parse_sheet
from transfer.geometry import Geometry, substrate_geometry


def geometry(text: str) -> Geometry:
    return substrate_geometry(parse_sheet(f"[substrate]\n{text}"))


PLATE = 'shape = "plate"\nwidth = "20.0 ± 0.1 mm"\nthickness = "1.00 ± 0.02 mm"\n'


def test_a_plate() -> None:
    """Perimeter 2 (w + t) = 42 mm, lower face 20 mm^2."""
    plate = geometry(PLATE)
    assert plate.perimeter_at(7.0) == pytest.approx(4.2)
    np.testing.assert_allclose(
        plate.coated(np.array([-3.0, 0.0, 1e-9, 10.0])), [0.0, 0.0, 0.2, 4.4], atol=1e-9
    )
    # area 2 (w + t) L + w t: one u of the width changes (2 L + t) u, one of the thickness (2 L + w) u
    assert plate.u_coated(0.0, 10.0) == pytest.approx(math.hypot(21.0 * 0.1, 40.0 * 0.02) / 100.0)
    assert plate.u_coated(2.0, 10.0) == pytest.approx(2.0 * math.hypot(0.1, 0.02) * 8.0 / 100.0)
    assert plate.u_coated(0.0, 0.0) == 0.0
    assert not plate.exact


def test_a_rod() -> None:
    """Perimeter pi d, lower face pi d^2 / 4."""
    rod = geometry('shape = "rod"\ndiameter = "4.00 ± 0.01 mm"\n')
    assert rod.perimeter_at(1.0) == pytest.approx(0.4 * math.pi)
    assert rod.coated(np.array([10.0]))[0] == pytest.approx((40.0 + 4.0) * math.pi / 100.0)
    want = (math.pi * 0.01 * 10.0 + math.pi * 4.0 * 0.01 / 2.0) / 100.0
    assert rod.u_coated(-1.0, 10.0) == pytest.approx(want)


def test_dimensions_without_uncertainty_are_exact() -> None:
    plate = geometry('shape = "plate"\nwidth = "20 mm"\nthickness = "1 mm"\n')
    assert plate.exact
    assert plate.u_coated(0.0, 10.0) == 0.0


def trapezium() -> Geometry:
    """Widths 10 mm at the lower edge and 20 mm at 10 mm height, 1 mm thick, and straight edges."""
    sheet = parse_sheet(f"[substrate]\n{PLATE}")
    points = tuple(SimpleNamespace(height=h, width=w) for h, w in ((0.0, 10.0), (10.0, 20.0)))
    substrate = Substrate(
        shape="plate",
        width=Quantity(20.0, 0.1, "mm"),
        thickness=Quantity(1.0, 0.02, "mm"),
        profile=points,  # type: ignore[arg-type]
    )
    return substrate_geometry(replace(sheet, substrate=substrate))


def test_a_trapezium() -> None:
    """Two faces of (10 + 20)/2 x 10 mm^2, two slanted edges of hypot(10, 5) x 1 mm^2, lower face 10 mm^2."""
    table = trapezium()
    whole = 2.0 * 150.0 + 2.0 * math.hypot(10.0, 5.0) + 10.0
    assert table.coated(np.array([10.0]))[0] == pytest.approx(whole / 100.0)
    half = 2.0 * 62.5 + 2.0 * math.hypot(5.0, 2.5) + 10.0
    assert table.coated(np.array([5.0]))[0] == pytest.approx(half / 100.0)
    # goes on unchanged above the last height: 2 x 20 mm of face, and the edges' slope
    more = whole + 5.0 * (40.0 + 2.0 * math.hypot(1.0, 0.5))
    assert table.coated(np.array([15.0]))[0] == pytest.approx(more / 100.0)
    assert table.height == 10.0


@pytest.mark.parametrize("width", [0.0, 1.0, 4.0])
def test_the_mean_over_a_bin(width: float) -> None:
    """Against a fine average of the area itself, across the lower edge too."""
    plate = geometry(PLATE)
    at = np.array([-3.0, 5.0, 12.0])
    shifts = (np.arange(4000) + 0.5) / 4000.0 - 0.5
    want = np.mean([plate.coated(at + width * s) for s in shifts], axis=0)
    np.testing.assert_allclose(plate.mean_coated(at, width), want, rtol=1e-9)


@pytest.mark.parametrize(
    ("text", "what"),
    [
        ('shape = "plate"\nthickness = "1 mm"\n', "width is missing"),
        ('shape = "plate"\nwidth = "20 mm"\n', "thickness is missing"),
        ('shape = "rod"\n', "diameter is missing"),
    ],
)
def test_a_missing_dimension_is_named(text: str, what: str) -> None:
    with pytest.raises(UpstrokeError, match=what):
        geometry(text)


def test_no_substrate() -> None:
    with pytest.raises(UpstrokeError, match=r"no \[substrate\]"):
        substrate_geometry(RunSheet())


@pytest.mark.parametrize("wide", ["20 mm", "15 mm"])
def test_wider_than_the_trough(wide: str) -> None:
    sheet = parse_sheet(f'[trough]\nwidth = "{wide}"\n[substrate]\n{PLATE}')
    assert isinstance(sheet.trough, Trough)
    with pytest.raises(UpstrokeError, match="as wide as the trough"):
        substrate_geometry(sheet)


def test_just_narrower_than_the_trough() -> None:
    sheet = parse_sheet(f'[trough]\nwidth = "20.1 mm"\n[substrate]\n{PLATE}')
    assert substrate_geometry(sheet).shape == "plate"


def profiled(*points: tuple[float, float]) -> Geometry:
    made = tuple(SimpleNamespace(height=h, width=w) for h, w in points)
    substrate = Substrate(
        shape="table",
        thickness=Quantity(1.0, 0.02, "mm"),
        profile=made,  # type: ignore[arg-type]
    )
    return substrate_geometry(RunSheet(substrate=substrate))


@pytest.mark.parametrize(
    "points",
    [
        ((0.0, 10.0),),
        ((0.0, 10.0), (0.0, 12.0)),
        ((0.0, 10.0), (5.0, 0.0)),
        ((0.0, -1.0), (5.0, 10.0)),
    ],
)
def test_a_table_that_is_no_shape(points: tuple[tuple[float, float], ...]) -> None:
    with pytest.raises(UpstrokeError, match="two or more rising heights"):
        profiled(*points)


def test_a_table_in_any_order_that_begins_above_the_edge() -> None:
    """10 mm wide up to 2 mm, then to 20 mm at 12 mm: the part below the first height goes on unchanged."""
    table = profiled((12.0, 20.0), (2.0, 10.0))
    assert table.heights.tolist() == [0.0, 2.0, 12.0]
    # faces 2 x (20 + 150) mm^2, lower face 10 mm^2, edges 1 mm thick between 12 mm and the slant's length
    area = float(table.coated(np.array([12.0]))[0])
    assert 3.5 + 2 * 0.12 < area < 3.5 + 2 * 0.01 * (2.0 + math.hypot(10.0, 5.0)) + 1e-9
    # one u of the thickness: both edges' length and the width of the lower face
    edges = area - 3.4 - 0.1
    assert table.u_coated(-1.0, 12.0) == pytest.approx(0.02 * (edges + 0.1))
