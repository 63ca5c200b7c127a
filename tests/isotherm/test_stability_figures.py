"""Figures of holds, cycles and checks: what is drawn is what the result says."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from isotherm.check import check_records
from isotherm.check_figure import figure_check
from isotherm.cycles import analyse_cycles
from isotherm.cycles_figure import figure_cycles
from isotherm.figures_style import figure_bytes
from isotherm.hold import analyse_hold
from isotherm.hold_average import level_curve
from isotherm.hold_figure import figure_hold
from isotherm.hold_read import hold_record
from isotherm.quantity import Quantity
from isotherm.sheet import Check, RunSheet
from isotherm.source import Source
from isotherm.table import Table
from isotherm.trace import Trace


def hold_table(holds: int) -> Table:
    """`holds` steps of pressure, an hour each, losing 2 % by steady dissolution, ringing at the start."""
    rng = np.random.default_rng(0)
    times, areas, pressures = [], [], []
    start, area = 0.0, 150.0
    for k in range(holds):
        ramp = np.arange(0.0, 100.0, 5.0)
        level = 20.0 + 8.0 * k
        times.append(start + ramp)
        areas.append(area - 0.2 * ramp)
        pressures.append(np.linspace(0.0 if k == 0 else level - 8.0, level, ramp.size))
        t = np.arange(0.0, 3600.0, 5.0)
        ringing = 1.5 * np.exp(-t / 40.0)
        area -= 20.0
        times.append(start + 100.0 + t)
        areas.append(area * (1.0 - 0.02 * t / 3600.0) * (1.0 - ringing / 200.0))
        pressures.append(level + ringing)
        area = float(areas[-1][-1])
        start += 3700.0
    time, areas_, pressures_ = (np.concatenate(x) for x in (times, areas, pressures))
    values = {
        "time": time,
        "area": areas_ + 0.01 * rng.normal(size=time.size),
        "pressure": pressures_ + 0.02 * rng.normal(size=time.size),
    }
    return Table(Source("steps.csv", "", time.size), values, np.arange(time.size))


def texts(figure: Any) -> list[str]:
    import matplotlib.text

    return [one.get_text() for one in figure.findobj(matplotlib.text.Text) if one.get_text()]


def test_hold_figure_draws_the_blocks_the_law_and_the_residuals() -> None:
    result = analyse_hold(hold_record(hold_table(2), RunSheet()), planned_time=7200.0)
    figure = figure_hold(result)
    shown = [axes for axes in figure.axes if axes.axison]
    assert len(shown) == 4
    for hold, top, bottom in zip(result.holds, shown[:2], shown[2:], strict=True):
        points, law = top.lines[0], top.lines[1]
        assert np.array_equal(points.get_ydata(), hold.blocks.level)
        chosen = next(fit for fit in hold.fits if fit.name == hold.chosen)
        x = np.asarray(law.get_xdata(), dtype=float) * 3600.0
        assert np.asarray(law.get_ydata()) == pytest.approx(level_curve(chosen, x))
        residual = hold.blocks.level - level_curve(chosen, hold.blocks.time)
        assert np.asarray(bottom.lines[1].get_ydata()) == pytest.approx(residual)
    words = " ".join(texts(figure))
    assert "loss over 2 h" in words
    assert "settling" in words
    assert "ΔAICc" in words


def test_many_holds_keep_to_one_page_and_say_so() -> None:
    result = analyse_hold(hold_record(hold_table(3), RunSheet()))
    many = type(result)(result.source, result.holds * 3, None)
    figure = figure_hold(many)
    assert len([axes for axes in figure.axes if axes.axison]) == 12
    assert any("first 6 of 9" in text for text in texts(figure))


def film() -> Trace:
    rng = np.random.default_rng(1)
    down = np.linspace(0.30, 0.18, 400)
    area = np.concatenate([down, down[::-1]] * 2)
    factor = np.repeat([1.0, 0.9, 1.0, 0.9], 400)
    pressure = factor * 100.0 * np.log(np.maximum(0.25 / area, 1.0))
    return Trace(
        area, pressure + 0.05 * rng.normal(size=area.size), Source("c.csv", "", area.size),
        time=np.arange(area.size, dtype=float),
    )  # fmt: skip


def test_cycles_figure_draws_every_loop_and_its_work() -> None:
    result = analyse_cycles(film())
    figure = figure_cycles(result)
    loops, work, shift = figure.axes
    assert len(loops.lines) == 4
    assert np.array_equal(loops.lines[0].get_xdata(), result.cycles[0].compression.curve.area)
    assert [len(one[0].get_xdata()) for one in work.containers] == [2, 2, 2]
    assert shift.get_xlabel() == "cycle"


def bare() -> Table:
    rng = np.random.default_rng(2)
    t = np.arange(2000.0)
    area = 240.0 - 180.0 * (1.0 - np.abs(2.0 * t / t[-1] - 1.0))
    pressure = 0.4 * np.maximum(110.0 - area, 0.0) / 50.0 + 0.02 * rng.normal(size=t.size)
    values = {"time": t, "area": area, "pressure": pressure}
    return Table(Source("folder/bare.csv", "", t.size), values, np.arange(t.size))


def test_check_figure_marks_the_rise_and_every_verdict() -> None:
    sheet = RunSheet(check=Check(zero=Quantity(0.001, None, "mN/m")))
    result = check_records([bare()], sheet)
    figure = figure_check(result)
    record, items = figure.axes
    assert record.get_title(loc="left") == "bare.csv"
    assert np.array_equal(record.lines[0].get_ydata(), result.curves[0].pressure)
    labels = [label.get_text() for label in items.get_yticklabels()]
    judged = [item for item in result.items if item.limit is not None]
    assert len(labels) == len(judged)
    for label, item in zip(labels, judged, strict=True):
        assert item.name in label
        assert item.verdict in label
    low, high = items.get_xlim()
    for container in items.containers:
        x = float(container[0].get_xdata()[0])
        assert low < x < high


def test_same_result_same_bytes() -> None:
    result = check_records([bare()])
    assert figure_bytes(figure_check(result), "png") == figure_bytes(figure_check(result), "png")
