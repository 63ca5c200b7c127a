"""Cautions: what calls for one, what does not, and that all defer to local rules."""

from __future__ import annotations

import pytest

from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet
from transfer.target_cautions import cautions


def texts(body: str) -> str:
    return " ".join(c.text for c in cautions(parse_sheet(body)))


def film(solvent: str) -> str:
    return f'[film]\nname = "x"\nsolvent = "{solvent}"\n'


def test_all_defer_to_local_rules_and_training() -> None:
    last = cautions(RunSheet())[-1]
    assert last.concerns == "general"
    assert "local rules" in last.text
    assert "trained" in last.text
    assert len(cautions(RunSheet())) == 1


@pytest.mark.parametrize("solvent", ["chloroform", "CHCl3", "dichloromethane/methanol 9:1"])
def test_chlorinated_solvents(solvent: str) -> None:
    assert "extraction" in texts(film(solvent))
    assert "chlorinated" in texts(film(solvent))


@pytest.mark.parametrize(
    "solvent", ["hexane", "n-heptane", "toluene", "chloroform/methanol", "ethanol"]
)
def test_flammable_solvents(solvent: str) -> None:
    assert "flammable" in texts(film(solvent))


def test_unknown_solvent_is_never_called_harmless() -> None:
    assert "safety data sheet" in texts(film("ionic liquid 7"))
    unnamed = '[film]\nname = "x"\nvolume = "20 µL"\n'
    assert "does not name it" in texts(unnamed)


@pytest.mark.parametrize(
    "additive",
    ["0.2 mmol/L CdCl2", "cadmium chloride", "Pb(NO3)2", "lead acetate", "1e-4 M BaCl2", "0.1 mM UO2(NO3)2",
     "HgCl2", "CuSO4", "K2Cr2O7 chromate"],
)  # fmt: skip
def test_heavy_metals(additive: str) -> None:
    assert "metal" in texts(f'[subphase]\nadditives = ["{additive}"]\n')


@pytest.mark.parametrize(
    "additive", ["150 mmol/L NaCl", "0.1 mmol/L CaCl2", "phosphate buffer", "MgCl2"]
)
def test_ordinary_salts_call_for_nothing_more(additive: str) -> None:
    assert [
        c.concerns for c in cautions(parse_sheet(f'[subphase]\nadditives = ["{additive}"]\n'))
    ] == ["general"]


def test_azide_and_acid() -> None:
    assert "explosive" in texts('[subphase]\nadditives = ["0.02 % NaN3"]\n')
    assert "corrosive" in texts('[subphase]\nadditives = ["HCl to pH 2"]\n')


@pytest.mark.parametrize(
    "bath",
    [
        "H2SO4/H2O2 3:1, 10 min",
        "peroxide and sulfuric acid",
        "piranha",
        "conc. sulfuric acid, H2O2",
    ],
)
def test_acid_with_peroxide(bath: str) -> None:
    body = f'[substrate]\nshape = "rod"\ndiameter = "3 mm"\ncleaning = "{bath}"\n'
    assert "explosively" in texts(body)
    assert "trained people only" in texts(body)


@pytest.mark.parametrize(
    ("bath", "word"),
    [("chromic acid", "cancer"), ("HF dip", "without pain"), ("UV and ozone, 20 min", "ozone"),
     ("KOH in ethanol", "caustic"), ("oxygen plasma", "plasma"), ("nitric acid", "oxidising")],
)  # fmt: skip
def test_other_cleaning(bath: str, word: str) -> None:
    body = f'[substrate]\nshape = "rod"\ndiameter = "3 mm"\ncleaning = "{bath}"\n'
    assert word in texts(body)


def test_plain_washing_calls_for_nothing_more() -> None:
    body = '[substrate]\nshape = "rod"\ndiameter = "3 mm"\ncleaning = "detergent, then water"\n'
    assert [c.concerns for c in cautions(parse_sheet(body))] == ["general"]


def test_json() -> None:
    rows = [c.to_json() for c in cautions(parse_sheet(film("chloroform")))]
    assert rows[0]["concerns"] == "solvent"
    assert rows[0]["found"] == "chloroform"
