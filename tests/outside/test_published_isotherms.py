"""Published isotherms, digitised, called as a person reads them.

The curves are in the open NMRlipids Databank; the readings are by eye: a few per cent in area,
2 mN/m in pressure. The folder is beside the checkout or named by UPSTROKE_PUBLISHED_ISOTHERMS.
"""

import os
from pathlib import Path

import pytest

from isotherm.analysis import analyse
from isotherm.result import Branch
from isotherm.sheet import RunSheet
from isotherm.trace_read import read_trace

BESIDE = Path(__file__).resolve().parents[3] / "shared" / "data" / "published-isotherms"
FOLDER = Path(os.environ.get("UPSTROKE_PUBLISHED_ISOTHERMS", BESIDE))
pytestmark = pytest.mark.skipif(
    not FOLDER.is_dir(),
    reason="the published isotherms are not here; name their folder in UPSTROKE_PUBLISHED_ISOTHERMS",
)


def _read(name: str) -> Branch:
    result = analyse(read_trace(FOLDER / name, RunSheet()))
    assert len(result.branches) == 1
    return result.headline


@pytest.mark.parametrize(
    ("name", "lowest", "highest"),
    [
        ("DPPC_isotherm_LeeLinChang2006.csv", 9, 12),  # doi 10.1016/j.jcis.2005.09.050, 298 K
        ("DPPC_isotherm_MansourZografi2007.csv", 9, 12),  # doi 10.1021/la063053o, 298 K
        ("DPPC_isotherm_Shapovalov1998.csv", 3, 6),  # doi 10.1016/S0040-6090(98)00721-4, 294 K
    ],
)
def test_dppc_has_one_coexistence(name: str, lowest: float, highest: float) -> None:
    branch = _read(name)
    assert [t.kind for t in branch.transitions] == ["coexistence"]
    coexistence = branch.transitions[0]
    assert coexistence.onset is not None
    assert coexistence.end is not None
    assert lowest <= coexistence.onset.pressure.value <= highest
    assert 0.60 < coexistence.onset.area.value < 0.75
    assert 0.43 < coexistence.end.area.value < 0.56
    names = [p.name for p in branch.phases]
    assert names[:2] == ["liquid-expanded", "coexistence"]
    assert names[2] in ("liquid-condensed", "solid")
    # general literature, from memory: 0.44 to 0.48 nm^2 at 30 mN/m; these curves read 0.43 to 0.45
    at_30 = next(a for a in branch.area_at if a.pressure == 30.0)
    assert at_30.area is not None
    assert 0.42 < at_30.area.value < 0.48


def test_dppc_2006_collapses_near_70() -> None:
    branch = _read("DPPC_isotherm_LeeLinChang2006.csv")
    assert branch.collapse is not None
    assert branch.collapse.kind == "constant-pressure"
    assert branch.collapse.pressure.value == pytest.approx(70.0, abs=2.0)


@pytest.mark.parametrize(
    "name", ["DPPC_isotherm_MansourZografi2007.csv", "DPPC_isotherm_Shapovalov1998.csv"]
)
def test_other_dppc_curves_stop_before_collapse(name: str) -> None:
    assert _read(name).collapse is None


def test_popc_is_expanded_and_collapses_near_42() -> None:
    # doi 10.1016/j.bpj.2012.06.017, 298 K
    branch = _read("POPC_isotherm_Volinsky2012.csv")
    assert branch.transitions == ()
    assert branch.collapse is not None
    assert branch.collapse.kind == "constant-pressure"
    assert branch.collapse.pressure.value == pytest.approx(42.0, abs=2.0)


def test_popc_at_310_K_stops_before_collapse() -> None:
    # doi 10.1016/j.bbamem.2016.09.015
    branch = _read("POPC_isotherm_Olzynska2016_310K.csv")
    assert branch.transitions == ()
    assert branch.collapse is None
    assert branch.highest_pressure.value == pytest.approx(41.2, abs=1.0)


def test_dppe_lifts_off_sharply_and_yields() -> None:
    # doi 10.1073/pnas.0934731100, 303 K
    branch = _read("DPPE_isotherm.csv")
    assert branch.transitions == ()
    assert branch.lift_off is not None
    assert branch.lift_off.value == pytest.approx(0.50, rel=0.04)
    assert branch.collapse is not None
    assert 52.0 <= branch.collapse.pressure.value <= 61.0
