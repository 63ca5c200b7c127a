"""Rows out of order, and clocks that start again."""

from __future__ import annotations

import numpy as np

from isotherm.trace_order import time_order


def test_rows_in_order_are_left_alone() -> None:
    time = np.array([0.0, 1.0, 1.0, 3.0])
    done = time_order(time)
    assert done.order is None
    assert not done.warning
    np.testing.assert_array_equal(done.time, time)


def test_a_row_out_of_order_is_sorted() -> None:
    done = time_order(np.array([0.0, 2.0, 1.0, 3.0, 4.0]))
    assert done.order is not None
    assert done.order.tolist() == [0, 2, 1, 3, 4]
    assert "1 row was" in done.warning


def test_clocks_that_start_again_run_on_with_the_usual_step() -> None:
    part = np.arange(5.0, 45.0, 2.0)
    done = time_order(np.concatenate([part, part, part]))
    assert done.order is None
    np.testing.assert_allclose(done.time, 5.0 + 2.0 * np.arange(60))
    assert "2 times" in done.warning


def test_once_is_said_in_the_singular() -> None:
    part = np.arange(0.0, 40.0, 2.0)
    assert "1 time " in time_order(np.concatenate([part, part])).warning


def test_a_step_back_into_the_middle_is_no_restart() -> None:
    part = np.arange(0.0, 100.0)
    done = time_order(np.concatenate([part, part[50:] + 0.5]))
    assert done.order is not None
    assert (np.diff(done.time) >= 0).all()
