"""The isotherm figure: what it draws is what the result says, and nothing covers anything."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from isotherm_results import area, compression, expansion, pressure, result
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.text import Text

from isotherm.figures import isotherm_figure
from isotherm.figures_rail import spread
from isotherm.figures_style import figure_bytes
from isotherm.result import IsothermResult, Point, Transition


def texts(figure: Figure) -> list[Text]:
    legends = [a.get_legend() for a in figure.axes]
    inside = [t for legend in legends if legend is not None for t in legend.get_texts()]
    own = [t for axes in figure.axes for t in [*axes.texts, axes._left_title]]
    return [t for t in [*own, *inside] if t.get_text().strip()]


def crowded() -> IsothermResult:
    """Seven knees within 4 mN/m: more than fits beside their marks."""
    base = compression()
    kinks = tuple(
        Transition("kink", at=Point(area(0.26 - 0.002 * n), pressure(20.0 + 0.6 * n)))
        for n in range(7)
    )
    return result(replace(base, transitions=kinks))


CASES = {
    "acid": result(),
    "cycle": result(compression(), expansion()),
    "crowded": crowded(),
    "bare": result(
        replace(
            compression(),
            phases=(),
            transitions=(),
            collapse=None,
            lift_off=None,
            limiting_area=None,
            tangent=None,
            modulus_max=None,
        )
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_no_text_covers_another_or_leaves_the_paper(case: str) -> None:
    figure = isotherm_figure(CASES[case])
    canvas = FigureCanvasAgg(figure)
    canvas.draw()  # places the legend
    renderer = canvas.get_renderer()
    boxes = [(t.get_text(), t.get_window_extent(renderer)) for t in texts(figure)]
    for text, box in boxes:
        assert box.x0 >= 0, text
        assert box.y0 >= 0, text
        assert box.x1 <= figure.bbox.width, text
        assert box.y1 <= figure.bbox.height, text
    for (one, a), (two, b) in itertools.combinations(boxes, 2):
        assert not a.shrunk(0.98, 0.9).overlaps(b.shrunk(0.98, 0.9)), (one, two)


def test_every_branch_is_drawn_as_condensed() -> None:
    cycle = CASES["cycle"]
    upper = isotherm_figure(cycle).axes[0]
    for branch in cycle.branches:
        assert any(
            np.array_equal(line.get_xdata(), branch.curve.area)
            and np.array_equal(line.get_ydata(), branch.curve.pressure)
            for line in upper.lines
        )


def test_branches_differ_without_colour() -> None:
    lines = {
        line.get_label(): line.get_linestyle()
        for line in isotherm_figure(CASES["cycle"]).axes[0].lines
    }
    assert lines["compression 1, analysed here"] != lines["expansions"]


def test_knees_stand_where_the_result_has_them_with_their_bars() -> None:
    upper = isotherm_figure(CASES["acid"]).axes[0]
    kink = CASES["acid"].headline.transitions[1].at
    assert kink is not None
    marked = [
        line
        for line in upper.lines
        if line.get_marker() == "D" and line.get_xdata()[0] == kink.area.value
    ]
    assert [line.get_ydata()[0] for line in marked] == [kink.pressure.value]
    segments = [
        segment
        for collection in upper.collections
        if isinstance(collection, LineCollection)
        for segment in collection.get_segments()
    ]
    assert kink.area.u is not None
    assert kink.area.u_random is not None
    for u in (kink.area.u, kink.area.u_random):
        expected = [kink.area.value - 2 * u, kink.area.value + 2 * u]
        assert any(
            np.allclose(segment[:, 0], expected) and np.allclose(segment[:, 1], kink.pressure.value)
            for segment in segments
        )


def test_the_labels_say_the_values_of_the_result() -> None:
    said = "\n".join(t.get_text() for t in texts(isotherm_figure(CASES["acid"])))
    for words in (
        "collapse, constant-pressure",
        "Π 50.80 ± 0.21 mN/m",
        "coexistence onset",
        "coexistence end",
        "kink",
        "limiting area\n0.236 ± 0.005 nm²",
        "lift-off area",
        "liquid-condensed\n248 ± 10 mN/m",
    ):
        assert words in said


def test_a_film_that_did_not_collapse_is_said_to() -> None:
    said = "\n".join(t.get_text() for t in texts(isotherm_figure(CASES["bare"])))
    assert "collapse not reached" in said
    assert "Π ≥ 51.20" in said


def test_the_coexistence_is_hatched_and_other_phases_are_not() -> None:
    upper = isotherm_figure(CASES["acid"]).axes[0]
    ends = [p.get_path().get_extents(p.get_patch_transform()) for p in upper.patches]
    bands = {
        (round(box.x0, 3), round(box.x1, 3)): p.get_hatch()
        for p, box in zip(upper.patches, ends, strict=True)
    }
    assert bands[(0.3, 0.6)] == "////"
    assert bands[(0.6, 0.8)] is None


def test_several_runs_share_the_axes_and_differ_without_colour() -> None:
    runs = [replace(result(path=f"{n}.txt"), title=f"run {n}") for n in range(4)]
    upper, lower = isotherm_figure(*runs).axes
    curves = [line for line in upper.lines if len(line.get_xdata()) > 100]
    assert len(curves) == 4
    assert len({str(line.get_linestyle()) + str(line._dash_pattern) for line in curves}) == 4
    assert lower.get_yscale() == "log"
    said = [t.get_text() for t in upper.texts]
    assert sorted(said) == [f"{n + 1}  run {n}" for n in range(4)]


@pytest.mark.parametrize("suffix", ["svg", "png", "pdf"])
def test_the_same_result_gives_the_same_bytes(suffix: str) -> None:
    first = figure_bytes(isotherm_figure(CASES["acid"]), suffix)
    assert first == figure_bytes(isotherm_figure(CASES["acid"]), suffix)
    assert first.startswith({"svg": b"<?xml", "png": b"\x89PNG", "pdf": b"%PDF"}[suffix])


def test_a_hostile_title_is_only_text() -> None:
    title = '<script>alert(1)</script> & $\\frac{1}{2}$ "x"'
    svg = figure_bytes(isotherm_figure(replace(CASES["acid"], title=title)), "svg")
    assert b"<script" not in svg


@given(st.lists(st.tuples(st.floats(-50, 150), st.floats(0.5, 5)), min_size=1, max_size=12))
def test_spread_labels_keep_apart_in_order_and_inside(marks: list[tuple[float, float]]) -> None:
    marks = sorted(marks)
    sizes = [size for _, size in marks]
    centres = spread([where for where, _ in marks], sizes, 0.0, 100.0)
    for (a, size_a), (b, size_b) in itertools.pairwise(zip(centres, sizes, strict=True)):
        assert b - a >= (size_a + size_b) / 2 - 1e-9
    assert centres[0] - sizes[0] / 2 >= -1e-9
    assert centres[-1] + sizes[-1] / 2 <= 100 + 1e-9


def test_labels_that_do_not_collide_stay_where_they_are() -> None:
    assert spread([10.0, 50.0, 90.0], [10.0, 10.0, 10.0], 0.0, 100.0) == [10.0, 50.0, 90.0]


def test_two_labels_at_one_place_part_evenly() -> None:
    assert spread([50.0, 50.0], [10.0, 10.0], 0.0, 100.0) == [45.0, 55.0]
