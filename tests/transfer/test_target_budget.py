"""The film budget against examples worked out by hand."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from target_films import FOOT, START, STIFF, plain_film, steady_hold

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.sheet_read import parse_sheet
from transfer.target import choose_target
from transfer.target_budget import Budget
from transfer.target_plan import Filling, fits, plan_strokes
from transfer.target_programme import Move, programme, stroke_film, timing
from transfer.target_result import TargetResult

# Plate 20 x 1 mm, 25 mm of it crossing the surface: 2 (20 + 1) 25 + 20 x 1 = 1070 mm^2 = 10.7 cm^2 a stroke.
SHEET = """
[film]
name = "octadecanoic acid"
molar_mass = "284.48 g/mol"
concentration = "1.00 mg/mL"
volume = "25 µL"
[substrate]
shape = "plate"
width = "20 mm"
thickness = "1 mm"
[trough]
smallest_area = "60 cm^2"
[dipping]
tolerance = "0.2 mN/m"
stroke_length = "25 mm"
speed = "5 mm/min"
dwell_top = "60 s"
dwell_bottom = "10 s"
[stack]
layers = 12
type = "Y"
first_stroke = "up"
accept = [0.9999999, 1.0000001]
"""
# The plain film is recommended at 20 mN/m, where A = 0.25 exp(-20/200) nm^2; these molecules cover 114 cm^2.
MOLECULES = 114.0e14 / (FOOT * math.exp(-20.0 / STIFF))


def worked(text: str = SHEET, molecules: float = MOLECULES, **holds: float) -> TargetResult:
    film = plain_film(molecules=molecules)
    given_holds = tuple(steady_hold(20.0, rate) for rate in holds.values())
    return choose_target(film, parse_sheet(text), holds=given_holds)


def budget_of(result: TargetResult) -> Budget:
    assert result.budget is not None
    return result.budget


def test_worked_example_strokes_renewals_areas_time() -> None:
    result = worked()
    assert result.recommended is not None
    assert result.recommended.value == pytest.approx(20.0, abs=1e-6)
    budget = budget_of(result)
    assert budget.area.value == pytest.approx(114.0, rel=1e-4)
    assert budget.stroke.coated.value == pytest.approx(10.70)
    assert budget.stroke.film.value == pytest.approx(10.70)
    # (114 - 60) / 10.7 = 5.05 strokes
    assert budget.strokes_possible == 5
    assert budget.strokes_needed == 12
    # 5 + 5 + 2 strokes
    assert budget.renewals == 2
    assert [row.stroke for row in result.plan if row.renew_before] == [6, 11]
    ends = [row.area_at_end.value for row in result.plan]
    filling = [103.3, 92.6, 81.9, 71.2, 60.5]
    assert ends == pytest.approx([*filling, *filling, *filling[:2]], abs=0.02)
    assert [row.direction for row in result.plan] == ["up", "down"] * 6
    # 12 strokes of 300 s; between them 6 dwells of 60 s above and 5 of 10 s below
    assert budget.time is not None
    assert budget.time.value == pytest.approx(12 * 300 + 6 * 60 + 5 * 10)
    assert [row.starts_s for row in result.plan[:3]] == [0.0, 360.0, 670.0]


def test_worked_example_volume_to_spread() -> None:
    # The record starts at 0.45 nm^2; a trough of 240 cm^2 then takes 240/0.45e-14 molecules, and the sheet's
    # 25 µL hold MOLECULES.
    text = SHEET.replace("[dipping]", 'largest_area = "240 cm^2"\n[dipping]')
    spreading = budget_of(worked(text)).spreading
    assert spreading is not None
    assert spreading.area_per_molecule.value == pytest.approx(START)
    expected = 25.0 * (240e14 / START) / MOLECULES
    assert spreading.volume.value == pytest.approx(expected)
    assert spreading.volume.unit == "µL"
    # film at 20 mN/m: 240 x A(20)/0.45 cm^2
    area = 240.0 * FOOT * math.exp(-20.0 / STIFF) / START
    assert spreading.strokes_possible == math.floor((area - 60.0) / 10.7)
    # one filling for all: 12 x 10.7 + 60 = 188.4 cm^2 against the 114 of 25 µL
    assert spreading.whole_stack is not None
    assert spreading.whole_stack.value == pytest.approx(25.0 * 188.4 / 114.0, rel=1e-4)


def test_uncertainty_of_film_and_area_by_hand() -> None:
    text = SHEET.replace('"20 mm"', '"20.0 ± 0.1 mm"').replace('"25 µL"', '"25 ± 0.25 µL"')
    text = text.replace("accept = [0.9999999, 1.0000001]", "accept = [0.95, 1.05]")
    budget = budget_of(worked(text))
    # u of the coated area: 2 x 25 mm x 0.1 mm of the sides and 1 mm x 0.1 mm of the lower face
    u_coated = (2 * 25 * 0.1 + 1 * 0.1) / 100
    # transfer ratio between 0.95 and 1.05, rectangular: 0.1/sqrt(12)
    u_film = math.hypot(u_coated, 10.7 * 0.1 / math.sqrt(12))
    assert budget.stroke.coated.u == pytest.approx(u_coated)
    assert budget.stroke.film.u == pytest.approx(u_film)
    # two volumes of 1 % each, and 0.2 mN/m over 200 mN/m
    u_area = 114.0 * math.hypot(0.01 * math.sqrt(2), 0.2 / STIFF)
    assert budget.area.u == pytest.approx(u_area, rel=1e-3)
    assert budget.plan[2].area_at_end.u == pytest.approx(math.hypot(u_area, 3 * u_film), rel=1e-3)


def test_a_plan_on_the_brink_says_so() -> None:
    text = SHEET.replace("accept = [0.9999999, 1.0000001]", "accept = [0.9, 1.1]")
    result = worked(text)
    budget = budget_of(result)
    assert budget.strokes_possible == 5
    assert budget.strokes_sure == 4
    assert "sure (95 %)" in " ".join(result.warnings)
    assert "sure (95 %)" not in " ".join(worked(molecules=MOLECULES * 1.04).warnings)


def test_loss_from_holds_is_in_the_plan() -> None:
    # 6 % an hour: stroke 1 lasts 300 s and costs 0.5 % of 114 cm^2
    result = worked(hold=0.06 / 3600)
    budget = budget_of(result)
    assert budget.plan[0].area_at_end.value == pytest.approx(114.0 * 0.995 - 10.7, abs=0.03)
    assert budget.strokes_possible == 4
    assert budget.renewals == 2
    assert "no hold given" not in " ".join(result.warnings)
    assert "no hold given" in " ".join(worked().warnings)


@settings(max_examples=40)
@given(
    area=st.floats(70.0, 400.0), film=st.floats(0.5, 30.0), count=st.integers(1, 60),
    more=st.floats(1.0, 1.5),
)  # fmt: skip
def test_no_planned_area_passes_the_smallest_and_more_film_never_renews_more(
    area: float, film: float, count: int, more: float
) -> None:
    moves = [Move(("up", "down")[j % 2], True) for j in range(count)]

    def filling(value: float) -> Filling:
        return Filling(
            Quantity(value, 0.0, "cm^2"),
            Quantity(60.0, 0.0, "cm^2"),
            Quantity(film, 0.0, "cm^2"),
            20.0,
        )

    serves = fits(filling(area), moves)
    assert serves == math.floor((area - 60.0) / film + 1e-9)
    plan = plan_strokes(filling(area), moves)
    if serves == 0:
        assert plan == ()
        return
    assert [row.stroke for row in plan] == list(range(1, count + 1))
    assert all(row.area_at_end.value >= 60.0 - 1e-6 for row in plan)
    renewals = sum(row.renew_before for row in plan)
    assert renewals == math.ceil(count / serves) - 1
    richer = plan_strokes(filling(area * more), moves)
    assert sum(row.renew_before for row in richer) <= renewals
    # what one row leaves the next begins with, unless the film is fresh
    for before, after in pairwise(plan):
        start = area if after.renew_before else before.area_at_end.value
        assert after.area_at_start.value == pytest.approx(start)


def test_rod_and_missing_length() -> None:
    text = SHEET.replace(
        'shape = "plate"\nwidth = "20 mm"\nthickness = "1 mm"', 'shape = "rod"\ndiameter = "3 mm"'
    )
    film = stroke_film(parse_sheet(text))
    assert film is not None
    # pi 3 x 25 mm^2 and the end's pi 9/4
    assert film.coated.value == pytest.approx(math.pi * (75 + 2.25) / 100)
    bare = parse_sheet(text.replace('stroke_length = "25 mm"', ""))
    assert stroke_film(bare) is None
    tall = parse_sheet(
        text.replace('stroke_length = "25 mm"', "").replace(
            "[trough]", 'height = "25 mm"\n[trough]'
        )
    )
    whole = stroke_film(tall)
    assert whole is not None
    assert whole.coated.value == pytest.approx(film.coated.value)
    assert "whole height" in whole.notes[0]


def test_stroke_longer_than_the_substrate_is_an_error() -> None:
    text = SHEET.replace("[trough]", 'height = "20 mm"\n[trough]')
    with pytest.raises(
        UpstrokeError, match=r"stroke_length \(25 mm\) is more than substrate.height"
    ):
        worked(text)


@pytest.mark.parametrize(
    ("kind", "first", "directions", "takes"),
    [
        ("Y", "up", "up down up", [True, True, True]),
        ("Y", "down", "down up down", [True, True, True]),
        ("XY", "down", "down up down", [True, True, True]),
        ("X", "down", "down up down up down up", [True, False] * 3),
        ("Z", "up", "up down up down up", [True, False, True, False, True]),
    ],
)
def test_programme_of_each_type(kind: str, first: str, directions: str, takes: list[bool]) -> None:
    sheet = parse_sheet(f'[stack]\nlayers = 3\ntype = "{kind}"\nfirst_stroke = "{first}"\n')
    moves = programme(sheet).moves
    assert " ".join(move.direction for move in moves) == directions
    assert [move.takes for move in moves] == takes
    assert programme(sheet).depositing == 3


def test_idle_strokes_take_time_but_no_film() -> None:
    result = worked(SHEET.replace('type = "Y"', 'type = "Z"'))
    budget = budget_of(result)
    assert len(result.plan) == 23
    idle = [row for row in result.plan if row.direction == "down"]
    assert all(row.film_removed.value == 0.0 for row in idle)
    assert budget.renewals == 2
    assert budget.time is not None
    assert budget.time.value == pytest.approx(23 * 300 + 11 * 60 + 11 * 10)


def test_first_stroke_follows_the_wetting_and_says_so() -> None:
    text = SHEET.replace('first_stroke = "up"\n', "")
    wetted = parse_sheet(text.replace("[trough]", "wetting = true\n[trough]"))
    bare = parse_sheet(text.replace("[trough]", "wetting = false\n[trough]"))
    assert programme(wetted).moves[0].direction == "up"
    assert programme(bare).moves[0].direction == "down"
    assert "first_stroke not given: down is planned" in " ".join(programme(parse_sheet(text)).notes)


def test_alternating_films_are_budgeted_one_at_a_time() -> None:
    text = SHEET + (
        '[[stack.film]]\nname = "octadecanoic acid"\nstrokes = "up"\n'
        '[[stack.film]]\nname = "octadecylamine"\nstrokes = "down"\n'
    )
    result = worked(text)
    budget = budget_of(result)
    assert budget.strokes_needed == 6
    assert budget.renewals == 1
    other = [row for row in result.plan if row.film == "octadecylamine"]
    assert len(other) == 6
    assert all(row.area_at_end.value == pytest.approx(row.area_at_start.value) for row in other)
    assert "several films" in " ".join(result.warnings)


def test_without_layers_one_filling_is_planned() -> None:
    result = worked(SHEET.replace("layers = 12\n", ""))
    budget = budget_of(result)
    assert budget.strokes_possible == 5
    assert len(result.plan) == 5
    assert budget.renewals is None
    assert budget.time is None


def test_without_speed_there_is_no_time_but_a_plan() -> None:
    result = worked(SHEET.replace('speed = "5 mm/min"\n', ""))
    assert budget_of(result).time is None
    assert len(result.plan) == 12
    assert result.plan[0].starts_s is None
    assert timing(parse_sheet(SHEET.replace('speed = "5 mm/min"\n', ""))) is None


def test_missing_pieces_are_named() -> None:
    result = choose_target(plain_film(molecules=None), parse_sheet("[trough]\n"))
    assert result.budget is None
    text = " ".join(result.warnings)
    assert all(word in text for word in ("amount spread", "trough.smallest_area", "[substrate]"))


def test_amount_spread_comes_from_the_sheet_when_the_record_does_not_tell() -> None:
    budget = budget_of(choose_target(plain_film(molecules=None), parse_sheet(SHEET)))
    # 25 µg of 284.48 g/mol
    molecules = 6.02214076e23 * 25e-6 / 284.48
    assert budget.area.value == pytest.approx(molecules * FOOT * math.exp(-0.1) / 1e14, rel=1e-4)


def test_sheets_own_pressure_gets_a_plan_too() -> None:
    result = worked(SHEET.replace("[dipping]", '[dipping]\npressure = "30 mN/m"'))
    assert result.asked is not None
    assert result.asked.budget is not None
    expected = MOLECULES * FOOT * math.exp(-30.0 / STIFF) / 1e14
    assert result.asked.budget.area.value == pytest.approx(expected, rel=1e-4)
    assert len(result.to_json()["asked"]["plan"]) == 12


def test_plan_json_is_what_an_audit_reads() -> None:
    rows = worked().to_json()["plan"]
    assert len(rows) == 12
    for row in rows:
        assert {"stroke", "direction", "film_removed", "area_at_end", "renew_before"} <= set(row)
        assert row["film_removed"]["value"] == pytest.approx(10.7)
        assert row["film_removed"]["unit"] == "cm^2"


def test_exact_fit_counts() -> None:
    filling = Filling(
        Quantity(60.0 + 3 * 10.7, 0.0, "cm^2"), Quantity(60.0, 0.0, "cm^2"),
        Quantity(10.7, 0.0, "cm^2"), 20.0,
    )  # fmt: skip
    assert fits(filling, [Move("up", True)]) == 3
    assert fits(replace(filling, film=Quantity(0.0, 0.0, "cm^2")), [Move("up", True)]) == 0
