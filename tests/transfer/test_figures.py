"""The sheet of a build, tested by what it draws."""

from pathlib import Path

import pytest

from isotherm.figures_style import figure_bytes
from isotherm.sheet_read import read_sheet
from transfer.analysis import analyse_log
from transfer.figures import transfer_figure
from transfer.log import read_log
from transfer.result import TransferResult

DEMO = Path(__file__).resolve().parents[2] / "demo"


@pytest.fixture(scope="module")
def failing() -> TransferResult:
    sheet = read_sheet(DEMO / "build_failing.toml")
    return analyse_log(read_log(DEMO / "build_failing.csv", sheet), sheet)


def test_every_judged_stroke_is_drawn_with_its_bar(failing: TransferResult) -> None:
    figure = transfer_figure(failing)
    ratios = next(a for a in figure.axes if a.get_ylabel() == "transfer ratio")
    drawn: dict[float, float] = {}
    for container in ratios.containers:
        line = container[0]
        drawn.update(zip(line.get_xdata(), line.get_ydata(), strict=True))
        segments = container[2][0].get_segments()
        for (x, low), (_, high) in segments:
            stroke = next(s for s in failing.strokes if s.number == x)
            assert stroke.ratio is not None
            assert stroke.ratio.u is not None
            assert high - low == pytest.approx(4 * stroke.ratio.u)
    expected = {float(s.number): s.ratio.value for s in failing.strokes if s.ratio is not None}
    assert drawn == pytest.approx(expected)


def test_the_change_and_the_limits_are_marked(failing: TransferResult) -> None:
    figure = transfer_figure(failing)
    ratios = next(a for a in figure.axes if a.get_ylabel() == "transfer ratio")
    words = " ".join(t.get_text() for t in ratios.texts)
    assert f"limits {failing.limits[0]:g} to {failing.limits[1]:g}" in words
    assert [f"changes after stroke {n}" in words for n in failing.drift.changes] == [True]


def test_the_stack_is_to_scale(failing: TransferResult) -> None:
    figure = transfer_figure(failing)
    stack = next(
        a
        for a in figure.axes
        if a.get_title().startswith("stack") or "stack" in a.get_title(loc="left")
    )
    slabs = stack.patches[1:]
    assert len(slabs) == len(failing.stack.ledger)
    for slab, layer in zip(slabs, failing.stack.ledger, strict=True):
        assert slab.get_width() == pytest.approx(layer.layers.value)
        assert layer.thickness is not None
        # area drawn is the thickness the stroke added, averaged over the substrate
        assert slab.get_width() * slab.get_height() == pytest.approx(layer.thickness.value)


def test_the_same_result_gives_the_same_bytes(failing: TransferResult) -> None:
    first, second = (figure_bytes(transfer_figure(failing), "svg") for _ in range(2))
    assert first == second
