"""What a stack should show, as designed, as built and along the substrate."""

import math
from types import SimpleNamespace

import numpy as np
import pytest

from isotherm.constants import AVOGADRO, EPSILON_0
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet, Stack, StackFilm
from transfer.evidence_from_result import ledger_from_result
from transfer.evidence_ledger import FilmInputs, LedgerView
from transfer.expected import expected_build, expected_design
from transfer.expected_figure import draw_along
from transfer.expected_stack import design_films, expected_stack
from transfer.result import Deposition, ProfileWindow

SPACER = FilmInputs(
    "spacer",
    Quantity(2.5, 0.05, "nm"),
    Quantity(284.48, 0.01, "g/mol"),
    Quantity(0.2, 0.004, "nm^2"),
    Quantity(2.6, 0.1, "1"),
    Quantity(12000.0, 200.0, "L/mol/cm"),
)
CRYSTAL = Quantity(5e6, None, "Hz")


def view(added, covariance=None, films=None, inputs=(SPACER,)):
    n = len(added)
    return LedgerView(
        np.arange(1, n + 1),
        np.asarray(added, dtype=float),
        np.zeros((n, n)) if covariance is None else covariance,
        films or ("spacer",) * n,
        inputs,
        np.ones(n, dtype=bool),
    )


def test_design_by_hand():
    found = expected_design((SPACER,), 20, crystal_frequency=CRYSTAL)
    assert found.thickness.value == pytest.approx(50.0)
    assert found.thickness.u == pytest.approx(1.0)
    density = 20 / 0.2e-14 / AVOGADRO
    assert found.surface_density.value == pytest.approx(density)
    assert found.mass_per_area.value == pytest.approx(density * 284.48 * 1e9)
    assert found.mass_per_area.u == pytest.approx(found.mass_per_area.value * 0.02, rel=1e-3)
    assert found.absorbance.value == pytest.approx(2 * 12000 * 1e3 * density)
    shift = -2 * 2 * 25e12 * density * 284.48 / math.sqrt(2.648 * 2.947e11)
    assert found.frequency_shift.value == pytest.approx(shift)
    capacitance = EPSILON_0 * 2.6 / 50e-9 * 1e6 / 1e4  # µF/cm^2
    assert found.capacitance.value == pytest.approx(capacitance)
    assert found.capacitance.u == pytest.approx(capacitance * math.hypot(0.02, 0.1 / 2.6))


def test_what_is_not_known_is_left_out():
    bare = FilmInputs("spacer", Quantity(2.5, 0.05, "nm"))
    found = expected_design((bare,), 4)
    assert found.thickness.value == pytest.approx(10.0)
    assert found.mass_per_area is None
    assert found.absorbance is None
    assert found.capacitance is None
    assert found.frequency_shift is None


def test_build_adds_random_and_common_parts():
    added = np.full(10, 0.97)
    covariance = np.eye(10) * 0.02**2 + 0.01**2
    found = expected_build(view(added, covariance))
    assert found.layers.value == pytest.approx(9.7)
    assert found.thickness.value == pytest.approx(9.7 * 2.5)
    strokes = 2.5 * math.sqrt(10 * 0.02**2 + 100 * 0.01**2)
    assert found.thickness.u_random == pytest.approx(strokes)
    assert found.thickness.u_systematic == pytest.approx(9.7 * 0.05)


def test_alternating_films_add_their_own():
    other = FilmInputs("marker", Quantity(3.0, 0.05, "nm"), None, Quantity(0.5, 0.01, "nm^2"))
    found = expected_design((SPACER, other), 5)
    assert found.thickness.value == pytest.approx(3 * 2.5 + 2 * 3.0)
    assert found.mass_per_area is None
    built = expected_build(
        view([1, 1, 1], films=("spacer", "marker", "spacer"), inputs=(SPACER, other))
    )
    assert built.thickness.value == pytest.approx(8.0)


def stroke(number, direction, ratio, shallow=0.0, deep=30.0, profile=(), counted=True):
    return SimpleNamespace(
        number=number,
        direction=direction,
        ratio=None
        if ratio is None
        else Quantity.combine(ratio, "1", u_random=0.01, u_systematic=0.0),
        shallow=shallow,
        deep=deep,
        profile=profile,
        counted=counted,
    )


def transfer_result(strokes, type_="Y"):
    """As much of a transfer result as the ledger looks at."""
    return SimpleNamespace(
        strokes=tuple(strokes),
        ratio_covariance=np.diag([np.nan if s.ratio is None else 1e-4 for s in strokes]),
        deposition=Deposition(type_, None, None, None, "", True),
        pressure_target=30.0,
    )


SHEET = RunSheet(
    stack=Stack(
        layers=4,
        type="Y",
        first_stroke="up",
        films=(
            StackFilm(
                "spacer",
                "both",
                Quantity(2.5, 0.05, "nm"),
                Quantity(284.48, None, "g/mol"),
                Quantity(0.197, None, "nm^2"),
            ),
        ),
        area_in_film=Quantity(0.182, None, "nm^2"),
        permittivity=Quantity(2.6, 0.1, "1"),
    )
)


def test_ledger_from_a_transfer_result():
    result = transfer_result([stroke(1, "down", 0.1, counted=False), stroke(2, "up", 1.0),
                              stroke(3, "down", None), stroke(4, "up", 0.9)])  # fmt: skip
    ledger = ledger_from_result(result, SHEET)
    assert ledger.added == pytest.approx([0.1, 1.0, 0.5, 0.9])
    assert ledger.covariance[2, 2] == pytest.approx(1 / 12)
    assert np.all(np.isfinite(ledger.covariance))
    assert list(ledger.lays_film) == [False, True, True, True]
    assert "stroke 3 could not be judged" in ledger.warnings[0]
    assert ledger.film("spacer").molecular_area.value == pytest.approx(0.197)
    assert ledger.film("spacer").molar_mass.value == pytest.approx(284.48)
    assert ledger.film("spacer").permittivity.value == pytest.approx(2.6)


def test_only_up_strokes_lay_a_z_film():
    result = transfer_result([stroke(n, "up" if n % 2 else "down", 1.0 if n % 2 else 0.0)
                              for n in range(1, 7)], "Z")  # fmt: skip
    assert list(ledger_from_result(result, SHEET).lays_film) == [True, False] * 3


def test_along_the_substrate():
    profile = (
        ProfileWindow(0.0, 10.0, Quantity(0.5, 0.02, "1")),
        ProfileWindow(10.0, 30.0, Quantity(1.0, 0.02, "1")),
    )
    result = transfer_result(
        [
            stroke(1, "down", 1.0),
            stroke(2, "up", 0.9, profile=profile),
            stroke(3, "down", 1.0, deep=15.0),
        ]
    )
    found = expected_stack(result, SHEET)
    along = found.along
    low, high = along.height < 9.0, along.height > 16.0
    np.testing.assert_allclose(along.layers[low], 2.5, atol=1e-12)
    np.testing.assert_allclose(along.layers[high], 2.0, atol=1e-12)
    np.testing.assert_allclose(along.thickness, along.layers * 2.5)
    assert np.all(along.u_thickness >= along.layers * 0.05 * (1 - 1e-9))
    per_layer = 284.48 / AVOGADRO / 0.197e-14 * 1e9  # ng/cm^2
    np.testing.assert_allclose(along.mass, along.layers * per_layer, rtol=1e-9)
    assert found.designed.layers.value == 4
    assert found.contraction.ratio.value == pytest.approx(0.197 / 0.182)
    assert found.to_json()["along_substrate"]["height_mm"][0] > 0


def test_design_follows_type_and_first_stroke():
    films = (StackFilm("a", "up"), StackFilm("b", "down"))

    def order(kind, first):
        sheet = RunSheet(stack=Stack(type=kind, first_stroke=first, films=films))
        return tuple(film.name for film in design_films(sheet, None, 30.0))

    assert order("Y", "up") == ("a", "b")
    assert order("Y", "down") == ("b", "a")
    assert order("X", "down") == ("b",)
    assert order("Z", "up") == ("a",)


def test_figure_along_the_substrate_draws_the_columns():
    result = transfer_result([stroke(1, "down", 1.0), stroke(2, "up", 0.9, deep=15.0)])
    along = expected_stack(result, SHEET).along
    figure = draw_along(along, designed_layers=4)
    for axis, column in zip(figure.axes, (along.layers, along.thickness, along.mass), strict=True):
        drawn = axis.get_lines()[0]
        np.testing.assert_allclose(drawn.get_xdata(), column)
        np.testing.assert_allclose(drawn.get_ydata(), along.height)
