"""Deposition type, what single strokes show, and the ledger, on ratios written down by hand."""

from __future__ import annotations

from dataclasses import replace
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from isotherm.quantity import Quantity
from isotherm.sheet import Component, Film, RunSheet, StackFilm
from isotherm.sheet import Stack as Design
from transfer.deposition import deposition_type, first_stroke_took_nothing, gives_back
from transfer.result import Deposition
from transfer.stack import build_stack, film_numbers

U = 0.005


def typed(ratios: list[float], *, first: str = "down", counted: list[bool] | None = None,
          u: float = U) -> Deposition:  # fmt: skip
    other = "up" if first == "down" else "down"
    directions = [first if k % 2 == 0 else other for k in range(len(ratios))]
    return deposition_type(
        directions,
        np.asarray(ratios),
        np.full(len(ratios), u),
        counted or [True] * len(ratios),
    )


@pytest.mark.parametrize(
    ("down", "up", "name"),
    [
        (1.0, 1.0, "Y"),
        (0.98, 0.92, "Y"),
        (1.0, 0.87, "Y"),
        (1.0, 0.82, "XY"),
        (0.84, 1.0, "XY"),  # up/down 1.19
        (0.88, 1.0, "Y"),
        (1.0, 0.5, "XY"),
        (1.0, 0.13, "XY"),
        (1.0, 0.10, "X"),
        (1.0, 0.0, "X"),
        (1.0, -0.05, "X"),
        (0.0, 1.0, "Z"),
        (0.10, 1.0, "Z"),
        (0.14, 1.0, "XY"),
        (0.2, 1.0, "XY"),
        (-0.02, 1.0, "Z"),
    ],
)
def test_type_from_up_over_down(down: float, up: float, name: str) -> None:
    """The rule the result itself states: 0.85 to 1.18 Y; one below 0.12 of the other X or Z; else XY."""
    found = typed([down, up] * 4)
    assert found.type == name
    assert found.down is not None
    assert found.up is not None
    assert found.down.value == pytest.approx(down)
    assert found.up.value == pytest.approx(up)
    # the same strokes the other way round in time
    assert typed([up, down] * 4, first="up").type == name


@pytest.mark.parametrize(
    ("down", "up", "decided"),
    [
        (1.0, 1.0, True),
        (1.0, 0.848, False),
        (1.0, 0.852, False),
        (0.121, 1.0, False),
        (0.0, 1.0, True),
    ],
)
def test_a_ratio_near_a_bound_does_not_decide(down: float, up: float, decided: bool) -> None:
    assert typed([down, up] * 4).decided is decided


def test_up_over_down_and_its_uncertainty() -> None:
    """0.72 / 0.8 in each of seven neighbouring pairs: u = hypot(u, 0.9 u) / 0.8 / sqrt(7)."""
    found = typed([0.8, 0.72] * 4).up_down_ratio
    assert found is not None
    assert found.value == pytest.approx(0.9)
    assert found.u == pytest.approx(np.hypot(U, 0.9 * U) / 0.8 / np.sqrt(7.0))


def test_where_down_takes_little_the_quotient_is_turned_round() -> None:
    """Down 0.14 of up: share 0.14, its u hypot(u_down, 0.14 u_up), and up/down 1/0.14."""
    found = typed([0.14, 1.0] * 4).up_down_ratio
    assert found is not None
    u_mean = U / 2.0  # four strokes
    assert found.value == pytest.approx(1.0 / 0.14)
    assert found.u == pytest.approx(np.hypot(u_mean, 0.14 * u_mean) / 0.14**2)
    assert typed([0.0, 1.0] * 4).up_down_ratio is None


def test_scatter_that_exceeds_the_strokes_own_uncertainty_is_taken() -> None:
    ratios = [1.0, 0.9, 1.0, 1.1, 1.0, 0.95, 1.0, 1.05]
    found = typed(ratios)
    assert found.up is not None
    # ups 0.9, 0.95, 1.05, 1.1: middle 1, distances 0.05 and 0.1 twice, median 0.075
    assert found.up.u == pytest.approx(1.4826 * 0.075 / 2.0)
    assert found.down is not None
    assert found.down.u == pytest.approx(U / 2.0)


def test_one_failed_stroke_does_not_change_the_type() -> None:
    ratios = [1.0, 0.98] * 5
    ratios[5] = 0.0
    assert typed(ratios).type == "Y"
    ratios[5], ratios[4] = 0.98, -0.6
    assert typed(ratios).type == "Y"


def test_a_fading_build_is_still_y() -> None:
    assert typed(list(np.linspace(1.0, 0.5, 12))).type == "Y"


@pytest.mark.parametrize(
    "ratios", [[1.0], [], [0.1, 0.05, 0.1, 0.05], [1.0, np.nan], [0.14, 0.149] * 3]
)
def test_no_type_without_film_in_both_directions(ratios: list[float]) -> None:
    found = typed(ratios)
    assert found.type is None
    assert not found.decided


def test_strokes_left_out_say_nothing() -> None:
    """Two strokes of which the first does not count: no down-stroke is left."""
    assert typed([0.0, 1.0], counted=[False, True]).down is None
    assert typed([0.0, 1.0, 1.0, 1.0], counted=[False, True, True, True]).type == "Y"


def test_strokes_of_one_direction_in_a_row_are_not_neighbours() -> None:
    """Down down up up: one pair of neighbours differs in direction, and it decides."""
    found = deposition_type(
        ["down", "down", "up", "up"], np.asarray([0.5, 1.0, 0.9, 0.4]), np.full(4, U), [True] * 4
    )
    assert found.up_down_ratio is not None
    assert found.up_down_ratio.value == pytest.approx(0.9)


@pytest.mark.parametrize(
    ("ratio", "u", "back"),
    [(-0.5, 0.01, True), (-0.02, 0.001, False), (-0.021, 0.001, True), (-0.05, 0.02, False),
     (-0.059, 0.02, False), (-0.061, 0.02, True), (0.5, 0.01, False)],
)  # fmt: skip
def test_a_stroke_gives_film_back(ratio: float, u: float, back: bool) -> None:
    assert gives_back(ratio, u) is back


@pytest.mark.parametrize(
    ("directions", "ratios", "wetting", "empty"),
    [
        ("dudu", [0.0, 1.0, 1.0, 1.0], None, True),
        ("dudu", [0.0, 1.0, 1.0, 1.0], True, True),
        ("dudu", [0.0, 1.0, 1.0, 1.0], False, False),
        ("dudu", [0.2, 1.0, 1.0, 1.0], True, False),
        ("dudu", [-0.2, 1.0, 1.0, 1.0], True, False),
        ("udud", [0.0, 1.0, 1.0, 1.0], True, False),
        ("dudu", [0.0, 1.0, 0.0, 1.0], None, False),  # Z: no down-stroke takes film
        ("dudu", [0.0, 1.0, 0.0, 1.0], True, True),
        ("du", [0.0, 1.0], None, True),
        ("", [], True, False),
    ],
)
def test_the_empty_first_dip(
    directions: str, ratios: list[float], wetting: bool | None, empty: bool
) -> None:
    ways = [{"d": "down", "u": "up"}[w] for w in directions]
    assert first_stroke_took_nothing(ways, np.asarray(ratios), wetting) is empty


def nm(value: float, u: float | None = None) -> Quantity:
    return Quantity(value, u, "nm")


def g(value: float) -> Quantity:
    return Quantity(value, None, "g/mol")


def area(value: float, u: float | None = None) -> Quantity:
    return Quantity(value, u, "nm^2")


TWO = Design(
    films=(
        StackFilm("a", "down", nm(2.0, 0.1), g(300.0), area(0.25, 0.01)),
        StackFilm("b", "up", nm(3.0, 0.2), g(600.0), area(0.50)),
    )
)


def stack(design: Design, ratios: list[float], **more: Any) -> Any:
    n = len(ratios)
    return build_stack(
        RunSheet(film=Film(name="film"), stack=design),
        (["down", "up"] * n)[:n],
        np.asarray(ratios),
        more.pop("random", np.eye(n) * 1e-4),
        more.pop("systematic", np.zeros((n, n))),
        numbers=list(range(1, n + 1)),
        partial=more.pop("partial", [False] * n),
    )


def test_alternating_films_add_up_by_hand() -> None:
    """Ratios 1, 0.9, 1, 0.8: thickness 2 x 2.0 + 3 x 1.7 = 9.1 nm.

    u: ratios 0.01 sqrt(2 x 2^2 + 2 x 3^2); films 2.0 x 0.1 and 1.7 x 0.2, independent of one another.
    Density 2.0/0.25 + 1.7/0.50 = 11.4 nm^-2; mass 2.0 x 300/(N_A 0.25 nm^2) + 1.7 x 600/(N_A 0.5 nm^2), with
    1/N_A nm^-2 g/mol = 0.166054 ng/cm^2 (CODATA 6.02214076e23).
    """
    made = stack(TWO, [1.0, 0.9, 1.0, 0.8])
    assert made.thickness.value == pytest.approx(9.1)
    assert made.thickness.u_random == pytest.approx(0.01 * np.sqrt(26.0))
    assert made.thickness.u_systematic == pytest.approx(np.hypot(0.2, 0.34))
    assert made.surface_density.value == pytest.approx(11.4)
    assert made.surface_density.u_systematic == pytest.approx(2.0 * 0.01 / 0.25**2)
    each = 1e14 * 1e9 / 6.02214076e23
    assert each == pytest.approx(0.166054, abs=1e-6)
    assert made.mass_per_area.value == pytest.approx(each * (2.0 * 1200.0 + 1.7 * 1200.0))
    assert [layer.film for layer in made.ledger] == ["a", "b", "a", "b"]
    assert made.ledger[1].thickness.value == pytest.approx(2.7)
    assert made.ledger[2].total.value == pytest.approx(2.9)
    assert made.notes == ()


def test_one_film_shares_its_thickness_up_and_down() -> None:
    """Four layers of 2.5 ± 0.1 nm: ± 0.4 nm, not 0.2."""
    made = stack(Design(layer_thickness=nm(2.5, 0.1)), [1.0] * 4)
    assert made.thickness.value == pytest.approx(10.0)
    assert made.thickness.u_systematic == pytest.approx(0.4)
    assert made.mass_per_area is None
    assert any("surface density" in note for note in made.notes)


def test_a_film_without_a_thickness_leaves_the_sum_open() -> None:
    """Down-strokes of known, up-strokes of unknown thickness: no sum, but the layers that are known."""
    design = Design(films=(StackFilm("a", "down", nm(2.0)), StackFilm("b", "up")))
    made = stack(design, [1.0, 1.0])
    assert made.thickness is None
    assert made.ledger[0].thickness.value == pytest.approx(2.0)
    assert made.ledger[1].thickness is None
    assert any("no thickness" in note for note in made.notes)


def test_what_cannot_be_judged_or_is_partial_is_noted() -> None:
    made = stack(TWO, [1.0, np.nan, 0.0, 1.0], partial=[False, True, False, True])
    assert made.layers.value == pytest.approx(2.0)
    assert made.layers.u == pytest.approx(0.01 * np.sqrt(3.0))
    assert [layer.faces for layer in made.ledger][1:3] == ["none", "none"]
    assert any("1 strokes could not be judged" in note for note in made.notes)
    assert any(note.startswith("strokes 2, 4 crossed only part") for note in made.notes)


def test_no_strokes_no_layers() -> None:
    made = stack(Design(layer_thickness=nm(2.5)), [])
    assert made.layers.value == 0.0
    assert made.ledger == ()
    assert made.thickness is None


def test_the_film_of_a_direction() -> None:
    sheet = RunSheet(film=Film(name="film"), stack=TWO)
    assert film_numbers(sheet, "down", None, 30.0).name == "a"
    assert film_numbers(sheet, "up", None, 30.0).thickness == nm(3.0, 0.2)
    both = RunSheet(film=Film(name="film"), stack=Design(films=(StackFilm("c", "both"),)))
    assert film_numbers(both, "up", None, 30.0).name == "c"
    none = RunSheet(film=Film(name="film"), stack=Design(films=(StackFilm("c", "down"),)))
    assert film_numbers(none, "up", None, 30.0).name == "film"


def isotherm(**more: Any) -> Any:
    """Area from 0.40 nm^2 at 10 mN/m to 0.20 at 50, modulus 100 to 200 mN/m, rows in no order."""
    curve = SimpleNamespace(
        pressure=np.asarray([50.0, 10.0]),
        area=np.asarray([0.20, 0.40]),
        modulus=np.asarray(more.pop("modulus", [200.0, 100.0])),
    )
    known = {"area_relative_u": 0.03, "pressure_u": 6.0, **more}
    return SimpleNamespace(headline=SimpleNamespace(curve=curve), **known)


def test_area_per_molecule_from_the_isotherm_by_hand() -> None:
    """Halfway, 30 mN/m: 0.30 nm^2, modulus 150. u: 3 % of area, and 6 mN/m of 150: 4 %; together 5 %."""
    component = Component("x", mole_fraction=Quantity(1.0, None, "1"), molar_mass=g(284.0))
    sheet = RunSheet(film=Film(name="film", components=(component,)))
    film = film_numbers(sheet, "down", isotherm(), 30.0)
    assert film.surface_density is not None
    assert film.surface_density.value == pytest.approx(1.0 / 0.3)
    assert film.surface_density.u == pytest.approx(0.05 / 0.3)
    assert film.mass_per_area is not None
    assert film.mass_per_area.value == pytest.approx(284.0 / 0.3 * 0.1660539, rel=1e-6)
    assert film.mass_per_area.u == pytest.approx(0.05 * film.mass_per_area.value)
    exact = film_numbers(sheet, "down", isotherm(area_relative_u=None, pressure_u=None), 30.0)
    assert exact.surface_density is not None
    assert exact.surface_density.u == 0.0
    liquid = film_numbers(sheet, "down", isotherm(modulus=[0.0, 0.0]), 30.0)
    assert liquid.surface_density is not None
    assert liquid.surface_density.u == pytest.approx(0.03 / 0.3)


@pytest.mark.parametrize(
    ("pressure", "known"), [(9.9, False), (10.0, True), (50.0, True), (50.1, False)]
)
def test_the_isotherm_is_not_stretched_beyond_its_ends(pressure: float, known: bool) -> None:
    film = film_numbers(RunSheet(film=Film(name="film")), "up", isotherm(), pressure)
    assert (film.surface_density is not None) is known


def test_molar_mass_of_a_mixture_by_hand() -> None:
    """0.25 x 200 + 0.75 x 400 = 350 g/mol; u = hypot(0.25 x 4, 0.75 x 2)."""
    parts = (
        Component(
            "x", mole_fraction=Quantity(0.25, None, "1"), molar_mass=Quantity(200.0, 4.0, "g/mol")
        ),
        Component(
            "y", mole_fraction=Quantity(0.75, None, "1"), molar_mass=Quantity(400.0, 2.0, "g/mol")
        ),
    )
    sheet = RunSheet(film=Film(name="film", components=parts))
    exact = isotherm(area_relative_u=None, pressure_u=None)
    film = film_numbers(sheet, "down", exact, 30.0)
    assert film.mass_per_area is not None
    assert film.mass_per_area.value == pytest.approx(350.0 / 0.3 * 0.1660539, rel=1e-6)
    assert film.mass_per_area.u == pytest.approx(
        film.mass_per_area.value * np.hypot(1.0, 1.5) / 350.0
    )
    unknown = replace(parts[1], molar_mass=None)
    sheet = RunSheet(film=Film(name="film", components=(parts[0], unknown)))
    assert film_numbers(sheet, "down", exact, 30.0).mass_per_area is None


def test_one_film_named_in_the_stack_takes_the_spread_film_s_numbers() -> None:
    """One entry: what it leaves open comes from the spread film; of two, only what each says."""
    component = Component("x", mole_fraction=Quantity(1.0, None, "1"), molar_mass=g(284.0))
    spread = Film(name="film", components=(component,))
    one = RunSheet(film=spread, stack=Design(films=(StackFilm("a"),)))
    assert film_numbers(one, "down", isotherm(), 30.0).mass_per_area is not None
    two = RunSheet(film=spread, stack=Design(films=(StackFilm("a", "down"), StackFilm("b", "up"))))
    assert film_numbers(two, "down", isotherm(), 30.0).surface_density is None
    own = Design(films=(StackFilm("a", "down", molecular_area=area(0.25)), StackFilm("b", "up")))
    alone = film_numbers(RunSheet(film=spread, stack=own), "down", isotherm(), 30.0)
    assert alone.surface_density is not None
    assert alone.surface_density.value == pytest.approx(4.0)
    assert alone.mass_per_area is None
