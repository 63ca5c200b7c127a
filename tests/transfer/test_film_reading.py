"""Packing error and strokes left along an isotherm, against arithmetic by hand."""

from __future__ import annotations

import numpy as np
import pytest

from isotherm.quantity import Quantity
from isotherm.result import Curve
from isotherm.sheet import Dipping, RunSheet, Substrate, Trough
from transfer.film_reading import film_reading

CURVE = Curve(
    area=np.array([0.25, 0.22, 0.20]),
    pressure=np.array([0.0, 20.0, 30.0]),
    u_pressure=np.full(3, 0.1),
    modulus=np.array([-2.0, 100.0, 400.0]),
    u_modulus=np.array([1.0, 5.0, 8.0]),
    trough_area=np.array([130.0, 70.0, 59.0]),
)


def sheet() -> RunSheet:
    return RunSheet(
        trough=Trough(smallest_area=Quantity(60.0, None, "cm^2")),
        substrate=Substrate(
            shape="plate", width=Quantity(10.0, 0.1, "mm"), thickness=Quantity(1.0, 0.01, "mm")
        ),
        dipping=Dipping(
            tolerance=Quantity(0.2, None, "mN/m"), stroke_length=Quantity(20.0, None, "mm")
        ),
    )


def test_packing_error_is_tolerance_over_modulus() -> None:
    reading = film_reading(CURVE, sheet())
    assert reading.packing_error is not None
    assert reading.u_packing_error is not None
    assert np.isnan(reading.packing_error[0])
    assert reading.packing_error[1:] == pytest.approx([0.2 / 100, 0.2 / 400])
    assert reading.u_packing_error[1] == pytest.approx(0.2 / 100 * 5 / 100)


def test_strokes_left_count_whole_strokes_down_to_the_smallest_area() -> None:
    reading = film_reading(CURVE, sheet())
    # 2 (10 + 1) mm × 20 mm + 10 mm × 1 mm = 4.5 cm^2 a stroke: 70/4.5 = 15.6, 10/4.5 = 2.2, none below 60
    assert reading.strokes_left is not None
    assert reading.strokes_left.tolist() == [15.0, 2.0, 0.0]


def test_what_the_sheet_lacks_is_not_said() -> None:
    reading = film_reading(CURVE, RunSheet())
    assert reading.packing_error is None
    assert reading.strokes_left is None
