"""Mixtures against arithmetic, closed forms and published signs."""

import math
import os
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray
from series_films import Lipid, result_of, sheet_of

from isotherm.mixture import analyse_mixture
from isotherm.mixture_result import MixtureResult

FloatArray = NDArray[np.float64]


def test_unit_of_the_excess_energy() -> None:
    """1 Å² mN/m per molecule is 6.022 J/mol (arithmetic, Avogadro's number of the SI)."""
    flat = 0.01  # nm^2 = 1 Å^2, at every pressure
    results, sheets = [], []
    for x in (1.0, 0.5, 0.0):

        def area(p: FloatArray, x: float = x) -> FloatArray:
            return Lipid(transition=None).area(p) + (flat if x == 0.5 else 0.0)

        results.append(result_of(Lipid(collapse=40.0), name=f"{x}", other_area=area, points=800))
        sheets.append(sheet_of({"a": x, "b": 1 - x}))
    state = analyse_mixture(results, sheets, pressures=[30]).at[0].states[2]
    assert state.gibbs_excess is not None
    assert state.gibbs_excess.value == pytest.approx(30 * 6.022, rel=0.005)


def test_equimolar_ideal_mixing() -> None:
    """-RT ln 2 = -1.718 kJ/mol at 298.15 K (closed form)."""
    results = [result_of(Lipid(kelvin=298.15), name=n) for n in "abc"]
    sheets = [sheet_of({"a": x, "b": 1 - x}) for x in (1.0, 0.5, 0.0)]
    state = analyse_mixture(results, sheets, pressures=[30]).at[0].states[2]
    assert state.gibbs_mixing is not None
    assert state.gibbs_mixing.value == pytest.approx(-1718.0, abs=2.0)
    assert state.gibbs_mixing.value == pytest.approx(-8.314462618 * 298.15 * math.log(2), abs=1.0)


def published(name: str) -> FloatArray:
    """Digitised published curve as (n, 2): nm^2 and mN/m, largest area first."""
    beside = Path(__file__).resolve().parents[3] / "shared" / "data" / "published-isotherms"
    folder = Path(os.environ.get("UPSTROKE_PUBLISHED_ISOTHERMS", beside))
    if not (folder / name).is_file():
        pytest.skip(f"published isotherm {name} is not here (UPSTROKE_PUBLISHED_ISOTHERMS)")
    data = np.loadtxt(folder / name, delimiter=",", comments="#")
    data = data[np.argsort(-data[:, 0])]
    data[:, 0] /= 100.0
    rising = data[:, 1] >= np.maximum.accumulate(data[:, 1])
    return np.asarray(data[rising])


def with_cholesterol(lecithin: FloatArray, condensed: float) -> MixtureResult:
    """Cholesterol (0.38 nm², nearly incompressible: handbook value, from memory) with a lecithin whose
    molecules beside a cholesterol take at most the area `condensed` (nm^2); one cholesterol reaches one
    lecithin. The rule of the condensing effect as textbooks put it (from memory)."""

    def area_of(x: float) -> object:
        def area(p: FloatArray) -> FloatArray:
            alone = np.interp(p, lecithin[:, 1], lecithin[:, 0])
            touched = min(1.0, (1 - x) / x) if x else 0.0
            beside = np.minimum(alone, condensed * np.exp(-np.asarray(p) / 250.0))
            sterol = 0.38 * np.exp(-np.asarray(p) / 800.0)
            return x * ((1 - touched) * alone + touched * beside) + (1 - x) * sterol

        return area

    fractions = (1.0, 0.85, 0.7, 0.55, 0.4, 0.2, 0.0)
    low = max(1.0, float(lecithin[0, 1]) + 0.1)
    results = [
        result_of(
            Lipid(collapse=None, last=36.0),
            name=f"{x}",
            other_area=area_of(x),
            area_relative_u=0.007,
            lowest=low,
        )
        for x in fractions
    ]
    sheets = [sheet_of({"lecithin": x, "cholesterol": 1 - x}) for x in fractions]
    return analyse_mixture(
        [replace(r, kelvin=310.0) for r in results], sheets, pressures=[5, 15, 30]
    )


def test_cholesterol_condenses_a_fluid_lecithin() -> None:
    """Sign: excess area negative, most so at low pressure, most stable near x(lecithin) 0.5 to 0.6 (Chou
    & Chang, Colloids Surf. B 2000, doi 10.1016/S0927-7765(99)00102-2, DPPC at 37 °C, where it is fluid
    at low pressure). The fluid curve is POPC, Volinsky et al., doi 10.1016/j.bpj.2012.06.017."""
    result = with_cholesterol(published("POPC_isotherm_Volinsky2012.csv"), 0.47)
    low, middle, high = result.at
    assert low.verdict == middle.verdict == "condensation"

    def deepest(group: object) -> float:
        return min(s.excess.value for s in group.states[2:])  # type: ignore[attr-defined]

    assert deepest(low) < deepest(middle) < deepest(high) < 0
    best = min(
        (s for s in high.states if s.gibbs_excess is not None),
        key=lambda s: s.gibbs_excess.value if s.gibbs_excess else 0.0,
    )
    assert 0.45 <= best.fractions[0] <= 0.65


def test_cholesterol_is_additive_with_a_saturated_lecithin() -> None:
    """About additive for a lecithin whose chains are packed already (Demel, Van Deenen & Pethica, BBA
    1967, 11-19, distearoyl lecithin at 22 °C). The packed curve is the condensed branch of DPPC at 25 °C,
    Mansour & Zografi, doi 10.1021/la063053o."""
    curve = published("DPPC_isotherm_MansourZografi2007.csv")
    packed = curve[curve[:, 1] > 14.0]
    result = with_cholesterol(np.vstack([[packed[0, 0] + 0.02, 0.5], packed]), 0.53)
    assert [g.verdict for g in result.at[1:]] == ["no departure found"] * 2
