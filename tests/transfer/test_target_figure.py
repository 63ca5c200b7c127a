"""The figure by the data it draws."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.patches import Rectangle
from target_films import coexistence, kink, plain_film

from isotherm.figures_style import figure_bytes
from isotherm.sheet_read import parse_sheet
from transfer.target import choose_target
from transfer.target_figure import target_figure
from transfer.target_result import TargetResult


@pytest.fixture(scope="module")
def open_choice() -> TargetResult:
    text = '[dipping]\ntolerance = "0.2 mN/m"\novershoot = "0.5 mN/m"\n'
    film = plain_film(coexistence(8.0, 10.0, u=0.1), kink(16.0, u=0.2), collapse_u=0.3)
    return choose_target(film, parse_sheet(text))


def test_recommendation_is_drawn_across_all_axes(open_choice: TargetResult) -> None:
    assert open_choice.recommended is not None
    at = open_choice.recommended.value
    for axes in target_figure(open_choice).axes:
        levels = [line.get_ydata()[0] for line in axes.lines if len(set(line.get_ydata())) == 1]
        assert at in levels


def test_pressure_axis_is_shared(open_choice: TargetResult) -> None:
    axes = target_figure(open_choice).axes
    assert len({ax.get_ylim() for ax in axes}) == 1


def test_isotherm_is_the_whole_compression(open_choice: TargetResult) -> None:
    lines = target_figure(open_choice).axes[0].lines
    drawn = [line for line in lines if len(line.get_xdata()) > 10]
    assert len(drawn) == 1
    assert np.array_equal(drawn[0].get_xdata(), open_choice.drawing.area)
    assert np.array_equal(drawn[0].get_ydata(), open_choice.drawing.pressure)


def test_bars_are_the_allowed_stretches(open_choice: TargetResult) -> None:
    patches = target_figure(open_choice).axes[2].patches
    bars = [patch for patch in patches if isinstance(patch, Rectangle)]
    solid = sorted(
        [round(bar.get_x() + 0.5 * bar.get_width()), bar.get_y(), bar.get_y() + bar.get_height()]
        for bar in bars
        if bar.get_hatch() is None and bar.get_width() < 0.7
    )
    expected = [
        [column, i.low, i.high]
        for column, limit in enumerate(open_choice.limits)
        for i in limit.intervals
    ]
    assert np.allclose(solid, expected)


def test_names_and_margins_are_written(open_choice: TargetResult) -> None:
    axes = target_figure(open_choice).axes[2]
    names = " ".join(label.get_text().replace("\n", " ") for label in axes.get_xticklabels())
    assert all(limit.label in names for limit in open_choice.limits)
    written = [text.get_text() for text in axes.texts]
    for limit in open_choice.limits:
        if limit.margin is not None:
            assert f"{limit.margin.value:.1f}" in written


def test_no_window_is_said_with_the_smallest_relaxation() -> None:
    result = choose_target(plain_film(), parse_sheet('[target]\nphase = "solid"\n'))
    figure = target_figure(result)
    words = " ".join(text.get_text() for text in figure.texts)
    assert "No pressure obeys all limits" in words
    assert "drop" in words


def test_bytes_are_the_same_every_time(open_choice: TargetResult) -> None:
    first = figure_bytes(target_figure(open_choice), "svg")
    assert first == figure_bytes(target_figure(open_choice), "svg")
    assert first.startswith(b"<?xml")
