"""Mixtures against closed forms, and the words about them."""

import json
import math
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray
from series_films import Lipid, result_of, sheet_of

from isotherm.errors import UpstrokeError
from isotherm.mixture import analyse_mixture
from isotherm.mixture_figure import figure_mixture
from isotherm.mixture_result import MixtureResult
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet

LECITHIN = Lipid(collapse=58.0)
STEROL = Lipid(omega=0.36, cohesion=300.0, transition=None, collapse=44.0)
VOLUME = Quantity(50.0, 0.4, "µL")
CONCENTRATION = Quantity(1.0, 0.005, "mg/mL")
RELATIVE = math.hypot(0.008, 0.005)
FRACTIONS = (1.0, 0.8, 0.6, 0.4, 0.2, 0.0)
DECAY = 20.0  # mN/m


def sheet(x: float) -> RunSheet:
    return sheet_of({"lecithin": x, "sterol": 1 - x}, volume=VOLUME, concentration=CONCENTRATION)


def series(
    depth: float,
    *,
    rng: np.random.Generator | None = None,
    repeats: int = 1,
    collapse: str = "linear",
) -> MixtureResult:
    """Mixtures with A_ex = depth x (1 - x) exp(-Π/20); errors as the sheets state when `rng` is given."""
    results: list[IsothermResult] = []
    sheets = []
    for x in FRACTIONS:
        solution = 1 + rng.normal(0, 0.005) if rng else 1.0
        for k in range(repeats):

            def area(p: NDArray[np.float64], x: float = x) -> NDArray[np.float64]:
                departure = depth * x * (1 - x) * np.exp(-np.asarray(p) / DECAY)
                return x * LECITHIN.area(p) + (1 - x) * STEROL.area(p) + departure

            level = {
                "linear": 58 * x + 44 * (1 - x),
                "constant": 58.0 if x == 1 else 44.0,
            }[collapse]
            lipid = Lipid(collapse=level, transition=LECITHIN.transition if x == 1 else None)
            results.append(
                result_of(
                    lipid,
                    name=f"x {x:g} run {k}",
                    scale=solution * (1 + rng.normal(0, 0.008)) if rng else 1.0,
                    shift=rng.normal(0, 0.1) if rng else 0.0,
                    noise=0.05 if rng else 0.0,
                    rng=rng,
                    area_relative_u=RELATIVE,
                    other_area=area,
                    points=600,
                )
            )
            sheets.append(sheet(x))
    return analyse_mixture(results, sheets, pressures=(5, 20, 35))


def test_ideal_mixture_has_no_excess() -> None:
    result = series(0.0)
    for group in result.at:
        assert group.verdict == "no departure found"
        for state in group.states[2:]:
            assert state.excess is not None
            assert state.gibbs_excess is not None
            assert state.excess.value == pytest.approx(0.0, abs=4e-4)
            assert state.gibbs_excess.value == pytest.approx(0.0, abs=4.0)


def test_regular_mixture_meets_its_closed_form() -> None:
    """A_ex = d x(1-x) exp(-Π/s), so ΔG_ex = N_A d x(1-x) s (1 - exp(-Π/s))."""
    depth = -0.2
    result = series(depth)
    for group in result.at:
        damp = math.exp(-group.pressure / DECAY)
        omega = 602.214076 * depth * DECAY * (1 - damp)
        if group.pressure < 10:  # the excess fades below 2 u further up
            assert group.verdict == "condensation"
        assert group.interaction is not None
        assert group.interaction.value == pytest.approx(omega, rel=0.01)
        for state in group.states[2:]:
            x = state.fractions[0]
            assert state.excess is not None
            assert state.gibbs_excess is not None
            assert state.gibbs_mixing is not None
            assert state.excess.value == pytest.approx(depth * x * (1 - x) * damp, abs=4e-4)
            assert state.gibbs_excess.value == pytest.approx(omega * x * (1 - x), rel=0.015)
            ideal = 8.314462618 * 295.0 * (x * math.log(x) + (1 - x) * math.log(1 - x))
            assert state.gibbs_mixing.value - state.gibbs_excess.value == pytest.approx(ideal)


def test_expansion_is_called_so() -> None:
    assert all(g.verdict == "expansion" for g in series(0.25).at[:2])


def test_uncertainty_covers_the_truth_and_ideal_films_stay_ideal() -> None:
    inside, energies, calls = [], [], []
    for seed in range(14):
        result = series(0.0, rng=np.random.default_rng(700 + seed))
        for group in result.at:
            calls.append(group.verdict)
            for s in group.states[2:]:
                assert s.excess is not None
                assert s.excess.u is not None
                assert s.gibbs_excess is not None
                assert s.gibbs_excess.u is not None
                inside.append(abs(s.excess.value) < 2 * s.excess.u)
                energies.append(abs(s.gibbs_excess.value) < 2 * s.gibbs_excess.u)
    # 14 independent series: the errors within one share the pure components
    assert np.mean(inside) > 0.85
    assert np.mean(energies) > 0.85
    assert calls.count("no departure found") >= 0.8 * len(calls)


def test_small_negative_areas_are_not_called_condensation_by_sign_alone() -> None:
    group = series(-0.02).at[1]
    assert all(s.excess.value < 0 for s in group.states[2:] if s.excess)
    assert group.verdict == "no departure found"
    assert "these data would show" in group.statement


def test_repeats_tighten_the_excess_but_not_below_the_solution() -> None:
    once = series(-0.2, rng=np.random.default_rng(1)).at[1].states[3]
    often = series(-0.2, rng=np.random.default_rng(1), repeats=6).at[1].states[3]
    assert once.excess is not None
    assert once.excess.u is not None
    assert often.excess is not None
    assert often.excess.u is not None
    assert often.excess.u < once.excess.u
    # concentration, 0.5 %, of the mixture itself stays
    assert often.excess.u > 0.005 * often.area.value


def test_a_common_scale_error_cannot_make_an_excess() -> None:
    """Trough area 5 % wrong for all: A_ex scales, its significance does not change."""
    results, sheets = [], []
    for x in (1.0, 0.5, 0.0):

        def area(p: NDArray[np.float64], x: float = x) -> NDArray[np.float64]:
            return 1.05 * (x * LECITHIN.area(p) + (1 - x) * STEROL.area(p))

        results.append(
            result_of(Lipid(collapse=50.0), name=f"{x}", area_relative_u=0.05, other_area=area)
        )
        exact = {"volume": replace(VOLUME, u=0.0), "concentration": replace(CONCENTRATION, u=0.0)}
        sheets.append(sheet_of({"a": x, "b": 1 - x}, **exact))
    state = analyse_mixture(results, sheets, pressures=[20]).at[0].states[2]
    assert state.excess is not None
    assert state.excess.u is not None
    assert state.area.u == pytest.approx(0.05 * state.area.value, rel=0.02)
    assert state.excess.u < 0.01 * state.area.value


def test_collapse_that_moves_with_composition_means_miscible() -> None:
    (rule,) = (r for r in series(0.0).phase_rule if r.kind == "collapse")
    assert rule.reading == "miscible"
    assert rule.p_constant is not None
    assert rule.p_constant < 1e-4


def test_collapse_that_stays_means_immiscible() -> None:
    (rule,) = (r for r in series(0.0, collapse="constant").phase_rule if r.kind == "collapse")
    assert rule.reading == "immiscible"
    assert "sterol" in rule.statement


@pytest.mark.parametrize(
    ("level", "reading"), [(lambda x: 10.0, "immiscible"), (lambda x: 10 + 8 * (1 - x), "miscible")]
)
def test_transition_of_one_component(level: object, reading: str) -> None:
    assert callable(level)
    results, sheets = [], []
    for x in (1.0, 0.7, 0.5, 0.0):
        lipid = replace(LECITHIN, transition=level(x) if x else None, collapse=58.0)
        results.append(result_of(lipid, name=f"{x}"))
        sheets.append(sheet(x))
    rules = analyse_mixture(results, sheets, pressures=[30]).phase_rule
    (rule,) = (r for r in rules if r.kind == "transition")
    assert rule.reading == reading
    (collapse,) = (r for r in rules if r.kind == "collapse")
    assert collapse.reading == "cannot tell"  # the components do not differ


def test_three_components() -> None:
    films = (LECITHIN, STEROL, Lipid(omega=0.3, transition=None, collapse=50.0))
    weights = [(1, 0, 0), (0, 1, 0), (0, 0, 1), (0.5, 0.25, 0.25), (0.2, 0.4, 0.4)]
    results, sheets = [], []
    for w in weights:

        def area(p: NDArray[np.float64], w: tuple[float, ...] = w) -> NDArray[np.float64]:
            return np.sum([x * f.area(p) for x, f in zip(w, films, strict=True)], axis=0)

        results.append(result_of(Lipid(collapse=44.0), name=str(w), other_area=area))
        sheets.append(sheet_of(dict(zip("abc", w, strict=True))))
    result = analyse_mixture(results, sheets)
    assert result.components == ("a", "b", "c")
    mixed = result.at[-1].states[3]
    assert mixed.excess is not None
    assert mixed.excess.value == pytest.approx(0.0, abs=4e-4)
    assert mixed.gibbs_mixing is not None
    assert mixed.gibbs_excess is not None
    expected = 8.314462618 * 295 * (0.5 * math.log(0.5) + 0.5 * math.log(0.25))
    assert mixed.gibbs_mixing.value - mixed.gibbs_excess.value == pytest.approx(expected)
    assert result.at[0].interaction is None
    figure = figure_mixture(result)
    figure.draw_without_rendering()


def test_uncertain_fractions_reach_the_ideal_area() -> None:
    results, sheets = [], []
    for x in (1.0, 0.5, 0.0):
        mixed = sheet(x)
        if x == 0.5:
            components = tuple(
                replace(c, mole_fraction=Quantity(0.5, 0.02, "1")) for c in mixed.film.components
            )
            mixed = replace(mixed, film=replace(mixed.film, components=components))
        results.append(result_of(Lipid(collapse=44.0) if x else STEROL, name=f"{x}"))
        sheets.append(mixed)
    certain = analyse_mixture(results, [sheet(x) for x in (1.0, 0.5, 0.0)], pressures=[20])
    unsure = analyse_mixture(results, sheets, pressures=[20])
    one, other = certain.at[0].states[2].excess, unsure.at[0].states[2].excess
    assert one is not None
    assert one.u is not None
    assert other is not None
    assert other.u is not None
    pure = [s.area.value for s in certain.at[0].states[:2]]
    added = math.sqrt(other.u**2 - one.u**2)
    assert added == pytest.approx(0.02 * abs(pure[0] - pure[1]), rel=0.01)


def test_refusals() -> None:
    a, b, c = (result_of(Lipid(), name=n) for n in "abc")
    with pytest.raises(UpstrokeError, match="no run of pure sterol"):
        analyse_mixture([a, b], [sheet(1.0), sheet(0.5)])
    with pytest.raises(UpstrokeError, match="only one component"):
        analyse_mixture([a, b], [sheet(1.0), sheet(1.0)])
    with pytest.raises(UpstrokeError, match="no run of a mixture"):
        analyse_mixture([a, b], [sheet(1.0), sheet(0.0)])
    with pytest.raises(UpstrokeError, match=r"add up to 0\.9"):
        analyse_mixture([a, b], [sheet(1.0), sheet_of({"lecithin": 0.5, "sterol": 0.4})])
    with pytest.raises(UpstrokeError, match="names no component"):
        analyse_mixture([a, b], [sheet(1.0), RunSheet()])
    with pytest.raises(UpstrokeError, match="3 runs but 2"):
        analyse_mixture([a, b, c], [sheet(1.0), sheet(0.0)])
    with pytest.raises(UpstrokeError, match="choose pressures between"):
        analyse_mixture([a, b, c], [sheet(1.0), sheet(0.5), sheet(0.0)], pressures=[90])


def test_temperatures_are_compared_and_pressures_left_out_are_named() -> None:
    a, b, c = (result_of(Lipid(), name=n) for n in "abc")
    sheets = [sheet(1.0), sheet(0.5), sheet(0.0)]
    said = analyse_mixture([a, b, replace(c, kelvin=300.0)], sheets, pressures=[20, 90]).warnings
    assert any("differ by 5.0 K" in w for w in said)
    assert any("90 mN/m" in w for w in said)
    cold = analyse_mixture([replace(r, kelvin=None) for r in (a, b, c)], sheets)
    assert cold.at[0].states[2].gibbs_mixing is None


def test_json_rows_and_figure_agree() -> None:
    result = series(-0.2, rng=np.random.default_rng(2))
    data = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert data["schema"] == "upstroke.mixture/1"
    assert data["at"][0]["states"][2]["excess_area"]["value"] == result.rows()[2]["excess_area"]
    figure = figure_mixture(result)
    figure.draw_without_rendering()
    areas = figure.axes[0]
    drawn = areas.containers[0].lines[0]  # type: ignore[attr-defined]
    expected = [s.area.value for s in result.at[0].states]
    np.testing.assert_allclose(np.asarray(drawn.get_ydata()), expected)
