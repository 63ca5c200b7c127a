"""Strokes, dwells, pauses, renewals and what is no stroke."""

import numpy as np
import pytest

from tests.transfer.dipping_example import Programme, sheet, y_build
from transfer.analysis import analyse_log


def directions(result):
    return [s.direction for s in result.strokes]


def test_every_stroke_of_a_plain_build_is_found_with_its_times():
    result = analyse_log(y_build(6).log(), sheet())
    assert directions(result) == ["down", "up"] * 3
    # rests of 150 and 120 s, moves of 60 s
    starts = [s.start_s for s in result.strokes]
    assert np.allclose(starts, 150 + 180 * np.arange(6), atol=1.5)
    assert all(abs(s.end_s - s.start_s - 60) < 2 for s in result.strokes)
    assert all(s.ratio is not None for s in result.strokes)


@pytest.mark.parametrize("reads", ["depth", "height"])
@pytest.mark.parametrize("said", [True, False])
def test_either_sign_of_the_reading(reads, said):
    result = analyse_log(y_build(4).log(reads=reads), sheet(reads=reads if said else None))
    assert directions(result) == ["down", "up", "down", "up"]
    assert result.contact.reads == reads
    assert result.contact.reads_from == ("sheet" if said else "data")
    assert any("position_reads" in w for w in result.warnings) is not said


def test_a_pause_is_part_of_its_stroke():
    run = Programme().rest(150).move(10.0).rest(25).move(27.0).rest(120).move(-3.0).rest(120)
    result = analyse_log(run.log(), sheet())
    assert directions(result) == ["down", "up"]
    assert any("pause of 2" in f for f in result.strokes[0].flags)
    assert result.strokes[0].ratio.value == pytest.approx(1.0, abs=0.005)


def test_partial_strokes_count_what_crossed():
    run = Programme().rest(150).move(27.0).rest(120).move(15.0).rest(120).move(27.0).rest(120)
    run.move(-3.0).rest(120)
    result = analyse_log(run.log(), sheet())
    assert directions(result) == ["down", "up", "down", "up"]
    assert result.strokes[1].coated_area.value == pytest.approx(4.2 * 1.2, abs=0.02)
    assert any("partial" in f for f in result.strokes[1].flags)
    assert result.strokes[1].ratio.value == pytest.approx(1.0, abs=0.01)


def test_moves_in_air_are_no_strokes():
    run = Programme().rest(150).move(-9.0).rest(60).move(-3.0).rest(60).move(27.0).rest(120)
    run.move(-3.0).rest(60).move(-8.0).rest(60)
    assert directions(analyse_log(run.log(), sheet())) == ["down", "up"]


@pytest.mark.parametrize("under_water", [False, True])
def test_nothing_in_a_renewal_is_a_stroke(under_water):
    run = Programme().rest(150).move(27.0).rest(120)
    if not under_water:
        run.move(-3.0).rest(120)
    run.renew().rest(120)
    run.move(-3.0 if under_water else 27.0).rest(120)
    result = analyse_log(run.log(), sheet())
    assert directions(result) == (["down", "up"] if under_water else ["down", "up", "down"])
    assert len(result.renewals) == 1
    assert result.strokes[-1].renewed_before
    assert result.strokes[-1].ratio.value == pytest.approx(1.0, abs=0.01)


def test_a_crossing_while_no_film_is_held_is_named_not_counted():
    run = y_build(2)
    run.pressure = 22.0
    run.rest(60).move(27.0, 0.5).rest(60).move(-3.0, 0.5).rest(60)
    run.pressure = 30.0
    run.rest(120).move(27.0).rest(120).move(-3.0).rest(120)
    result = analyse_log(run.log(), sheet())
    assert directions(result) == ["down", "up", "down", "up"]
    assert len(result.unjudged) == 2
    assert any("not counted as a stroke" in w for w in result.warnings)
    assert [i.kind for i in result.interruptions] == ["set-point change"]


def test_first_compression_is_no_film_yet():
    run = Programme()
    run.renew(300.0)
    run.rest(150).move(27.0).rest(120).move(-3.0).rest(120)
    result = analyse_log(run.log(), sheet())
    assert directions(result) == ["down", "up"]
    assert [i.kind for i in result.interruptions] == ["start"]


def test_a_log_that_ends_in_a_stroke_flags_it():
    run = y_build(2).move(14.0)
    result = analyse_log(run.log(), sheet())
    assert directions(result) == ["down", "up", "down"]
    assert "log ends during this stroke" in result.strokes[-1].flags
    assert result.strokes[-1].ratio.u > 3 * result.strokes[0].ratio.u


def test_no_dwell_before_a_stroke_is_flagged():
    run = Programme().rest(150).move(27.0).move(-3.0).rest(120)
    result = analyse_log(run.log(), sheet())
    assert directions(result) == ["down", "up"]
    assert any("no dwell before" in f for f in result.strokes[1].flags)
    assert abs(result.strokes[1].ratio.value - 1.0) < 4 * result.strokes[1].ratio.u


@pytest.mark.parametrize("step", [0.0, 0.01, 0.1])
def test_encoder_steps_make_no_strokes(step):
    log = y_build(4).log()
    position = np.round(log.position / step) * step if step else log.position
    from dataclasses import replace

    result = analyse_log(replace(log, position=position), sheet())
    assert directions(result) == ["down", "up", "down", "up"]


def test_inputs_are_never_changed():
    log = y_build(2).log()
    before = [a.copy() for a in (log.time, log.position, log.area, log.pressure)]
    analyse_log(log, sheet())
    for a, b in zip(before, (log.time, log.position, log.area, log.pressure), strict=True):
        assert np.array_equal(a, b)


def test_added_time_changes_nothing_and_reversed_reading_only_the_sign():
    from dataclasses import replace

    log = y_build(4).log()
    plain = analyse_log(log, sheet())
    later = analyse_log(replace(log, time=log.time + 86400.0), sheet())
    mirrored = analyse_log(
        replace(log, position=24.0 - log.position), sheet(reads="height", surface_at=12.0)
    )
    for other in (later, mirrored):
        for a, b in zip(plain.strokes, other.strokes, strict=True):
            assert b.ratio.value == pytest.approx(a.ratio.value, abs=1e-6)
            assert b.direction == a.direction
