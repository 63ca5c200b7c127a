"""Where the lower edge meets the surface when the sheet does not say, and what is made of the doubt."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from isotherm.quantity import Quantity
from isotherm.sheet import ProfilePoint, Stack, Substrate
from tests.transfer.dipping_example import Programme, sheet
from transfer.analysis import analyse_log
from transfer.contact import Contact
from transfer.geometry import Geometry, substrate_geometry
from transfer.ratio import _by_contact
from transfer.strokes import Passage


def oscillation(high: float, low: float, strokes: int = 4, **options: float) -> Programme:
    """Strokes between two immersions (mm) from the upper one, with dwells of two minutes."""
    run = Programme(depth=high, **options)  # type: ignore[arg-type]
    run.rest(150)
    for k in range(strokes):
        run.move(low if k % 2 == 0 else high).rest(120)
    return run


@pytest.mark.parametrize("reads", ["depth", "height"])
@pytest.mark.parametrize("said", [True, False])
@pytest.mark.parametrize(("high", "low"), [(5.0, 30.0), (1.5, 26.5), (12.0, 20.0)])
def test_substrate_that_stays_in_the_water(high: float, low: float, reads: str, said: bool) -> None:
    """Coated: 4.2 cm of water line over the way from one depth to the other, no lower face."""
    result = analyse_log(
        oscillation(high, low).log(reads=reads),
        sheet(reads=reads if said else None, surface_at=None),
    )
    by_hand = 4.2 * (low - high) / 10.0
    assert len(result.strokes) == 4
    for stroke in result.strokes:
        assert stroke.coated_area.value == pytest.approx(by_hand, rel=0.003)
        assert stroke.ratio is not None
        assert abs(stroke.ratio.value - 1.0) < 3.0 * (stroke.ratio.u or 0.0) + 0.001
    assert result.contact.at is None
    assert any("stay in the water" in w and "surface_at" in w for w in result.warnings)


def test_the_surface_given_between_the_turning_points_is_believed() -> None:
    """The same readings with the edge lifted out: 25 mm of travel, 20 mm of them under water."""
    result = analyse_log(oscillation(5.0, 30.0).log(), sheet(surface_at=22.0))
    assert result.strokes[0].coated_area.value == pytest.approx(4.2 * 2.0 + 0.2, abs=0.01)
    assert any(
        "film was taken over the whole travel" in w and "5.0 mm" in w for w in result.warnings
    )


def test_nothing_is_said_of_a_surface_that_agrees() -> None:
    for high in (-5.0, 5.0):
        result = analyse_log(oscillation(high, 20.0).log(), sheet())
        assert not any("whole travel" in w or "transfer starts" in w for w in result.warnings)


@pytest.mark.parametrize("high", [-5.7, -2.0, 3.0])
def test_strokes_told_by_three_rows_do_not_show_the_contact_and_say_so(high: float) -> None:
    """Fast strokes and slow rows: the area from the end of the travel has the doubt in its u."""
    run = Programme(depth=high, rate=0.2)
    run.rest(150)
    for k in range(6):
        run.move(23.8 if k % 2 == 0 else high, speed=2.0).rest(300)
    result = analyse_log(run.log(), sheet(surface_at=None))
    truth = 4.2 * (23.8 - max(high, 0.0)) / 10.0 + (0.2 if high < 0 else 0.0)
    assert result.contact.at_from == "assumed"
    assert any("no stroke took enough film" in w for w in result.warnings)
    for stroke in result.strokes:
        u = stroke.coated_area.u or 0.0
        assert abs(stroke.coated_area.value - truth) < 2.0 * u
        # a fifth of 29.5 mm at 4.2 cm and the lower face at most: the doubt is said, not hidden
        assert 0.3 * truth > u > 0.1 * truth
        assert stroke.ratio is not None
        assert (stroke.ratio.u_systematic or 0.0) > 0.1 * stroke.ratio.value


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_noise_that_hides_the_contact_is_in_the_uncertainty(seed: int) -> None:
    """Little film, much noise: whether 2.6 mm were in air cannot be told, and the u admits them."""
    run = Programme(depth=-2.6, film=600.0, noise=0.5, seed=seed)
    run.rest(150)
    for k in range(4):
        run.move(8.0 if k % 2 == 0 else -2.6, speed=1.0).rest(60)
    result = analyse_log(run.log(), sheet(surface_at=None))
    truth = 4.2 * 0.8 + 0.2
    for stroke in result.strokes:
        u = stroke.coated_area.u or 0.0
        assert abs(stroke.coated_area.value - truth) < 2.5 * u


def test_a_stroke_that_took_nothing_shows_no_contact() -> None:
    """One slow stroke without film: what creep leaves over is no place where transfer starts."""
    run = Programme(depth=-4.7, film=150.0, creep=0.0, noise=0.003)
    run.rest(150).move(15.2, ratio=0.002, speed=0.05).rest(60)
    result = analyse_log(run.log(), sheet(surface_at=None))
    assert result.contact.at_from == "assumed"
    assert abs(result.strokes[0].coated_area.value - 6.584) < 2 * result.strokes[0].coated_area.u


def tapered() -> Substrate:
    return Substrate(
        shape="table",
        thickness=Quantity(1.0, None, "mm"),
        profile=(ProfilePoint(0.0, 10.0), ProfilePoint(60.0, 40.0)),
    )


def test_a_tapered_substrate_that_stays_in_the_water_says_how_little_is_known() -> None:
    """10 mm wide at the lower edge, 40 mm at 60 mm: the same 20 mm of way coat 4.9 to 15 cm^2.

    By hand: 20 mm from the lower edge lie between widths of 10 and 20 mm (mean 15), the topmost between
    30 and 40 (mean 35); perimeter 2 w + 2 t slant.
    """
    slant = np.hypot(1.0, 0.25)
    least, most = (2.0 * (2.0 * w + 2.0 * slant) / 10.0 for w in (15.0, 35.0))
    result = analyse_log(oscillation(5.0, 25.0).log(), sheet(surface_at=None, substrate=tapered()))
    area = result.strokes[0].coated_area
    assert area.value == pytest.approx(0.5 * (least + most), rel=0.01)
    assert area.value - 2.0 * (area.u or 0.0) < least
    assert area.value + 2.0 * (area.u or 0.0) > most
    assert any("width changes with height" in w for w in result.warnings)


def passage(shallow: float, deep: float) -> Passage:
    return Passage("down", (0,), (0, 1), 0, 0.0, 1.0, shallow, deep)


@pytest.mark.parametrize(
    ("shallow", "deep", "u", "want"),
    [
        (-3.0, 20.0, 0.1, 0.042),  # the deep end alone: 4.2 cm x 0.01 cm
        (3.0, 20.0, 0.1, 0.0),  # both ends move together: nothing changes
        (
            0.001,
            20.0,
            1.0,
            0.42 * 0.9995 - 0.1,
        ),  # lifted out by 2 mm: 0.84 less, face 0.2 more; half
        (-3.0, 20.0, 0.0, 0.0),
    ],
)
def test_doubt_of_the_surface_carried_to_the_area(
    shallow: float, deep: float, u: float, want: float
) -> None:
    plate: Geometry = substrate_geometry(sheet())
    got = _by_contact(plate, passage(shallow, deep), u)
    assert got == pytest.approx(want, abs=1e-9)


def test_the_design_settles_a_sign_the_data_leave_open() -> None:
    """Always in the water, no sign given: the first stroke goes the way the design says."""
    log = oscillation(5.0, 30.0).log()
    for first, reads in (("down", "depth"), ("up", "height")):
        result = analyse_log(
            log, sheet(reads=None, surface_at=None, stack=Stack(first_stroke=first))
        )
        assert result.contact.reads == reads
        assert result.strokes[0].direction == first
        assert any("as designed" in w for w in result.warnings)


def test_the_longer_side_settles_a_sign_no_stroke_shows() -> None:
    """No film taken at all, surface given near the upper end: most of the travel is depth."""
    run = Programme()
    run.rest(150).move(27.0, ratio=0.0).rest(120).move(-3.0, ratio=0.0).rest(120)
    for reads in ("depth", "height"):
        result = analyse_log(run.log(reads=reads), sheet(reads=None))
        assert result.contact.reads == reads
        assert result.contact.reads_from == "assumed"
        assert any("most of the travel" in w for w in result.warnings)


def test_a_contact_without_a_place_counts_from_zero() -> None:
    from transfer.contact import immersion

    contact = Contact("height", "sheet", None, "data")
    assert immersion(contact, np.asarray([2.0, -1.0])).tolist() == [-2.0, 1.0]
    moved = replace(contact, reads="depth", at=Quantity(1.5, None, "mm"))
    assert immersion(moved, np.asarray([2.0, 1.0])).tolist() == [0.5, -0.5]


@pytest.mark.parametrize(("high", "levels"), [(-3.0, 1.0), (4.0, 2.0)])
def test_the_encoder_s_step_at_each_level_that_counts(high: float, levels: float) -> None:
    """Steps of 0.2 mm leave 0.2 / sqrt(12) at each level under water: one if the edge comes out, else two."""
    log = oscillation(high, 24.0).log()
    coarse = replace(log, position=0.2 * np.round(log.position / 0.2))
    stroke = analyse_log(coarse, sheet()).strokes[0]
    assert stroke.ratio is not None
    each = 0.42 * 0.2 / np.sqrt(12.0)
    want = stroke.ratio.value * each * np.sqrt(levels) / stroke.coated_area.value
    assert stroke.budget["position"] == pytest.approx(want, rel=0.02)
