"""Run sheets: what is read, what is refused and in which words, and the sheet to fill in."""

from __future__ import annotations

import contextlib
import dataclasses
import re
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from isotherm import sheet as sheet_types
from isotherm.errors import UpstrokeError
from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet, read_sheet
from isotherm.sheet_schema import ROLES, SECTIONS
from isotherm.sheet_template import template

_WHOLE = """
title = "Spacer film, run 3"
[film]
name = "octadecanoic acid"
molar_mass = "284.48 g/mol"
concentration = "1.00 ± 0.01 mg/mL"
volume = "50 ± 0.5 µL"
purity = 0.99
solvent = "chloroform"
[subphase]
liquid = "water"
temperature = "20.0 ± 0.2 degC"
additives = ["0.2 mmol/L CdCl2"]
ph = 5.6
[trough]
smallest_area = "60 cm^2"
area_uncertainty = "0.3 cm^2"
width = "7.5 cm"
[substrate]
shape = "table"
thickness = "1.00 ± 0.02 mm"
wetting = false
[[substrate.profile]]
height = "0 mm"
width = "18 mm"
[[substrate.profile]]
height = "2 cm"
width = "20 mm"
[dipping]
pressure = "30 mN/m"
position_reads = "depth"
speed = "6 mm/min"
[stack]
layers = 20
type = "Y"
first_stroke = "up"
accept = [0.9, 1.1]
layer_thickness = "25 ± 0.5 Å"
[[stack.film]]
name = "octadecanoic acid"
strokes = "up"
[[stack.film]]
name = "octadecylamine"
strokes = "down"
molar_mass = "269.5 g/mol"
[target]
packing_error = "0.5 %"
[[columns]]
role = "pressure"
header = "Pi 2"
unit = "mN/m"
"""


def test_a_whole_sheet() -> None:
    sheet = parse_sheet(_WHOLE, "run.toml")
    assert sheet.title == "Spacer film, run 3"
    assert sheet.path == "run.toml"
    assert sheet.film.components[0].molar_mass is not None
    assert sheet.film.components[0].molar_mass.value == 284.48
    assert sheet.film.components[0].mole_fraction.value == 1.0
    assert sheet.film.concentration is not None
    assert (sheet.film.concentration.value, sheet.film.concentration.u) == (1.0, 0.01)
    assert sheet.film.purity is not None
    assert sheet.film.purity.value == 0.99
    assert sheet.subphase.temperature is not None
    assert sheet.subphase.temperature.unit == "degC"
    assert sheet.trough.width is not None
    assert sheet.trough.width.value == 75.0
    assert sheet.substrate is not None
    assert [p.height for p in sheet.substrate.profile] == [0.0, 20.0]
    assert sheet.substrate.wetting is False
    assert sheet.dipping.speed is not None
    assert sheet.dipping.speed.value == pytest.approx(0.1)
    assert sheet.stack.accept == (0.9, 1.1)
    assert sheet.stack.accept_given
    assert sheet.stack.layer_thickness is not None
    assert (sheet.stack.layer_thickness.value, sheet.stack.layer_thickness.u) == (2.5, 0.05)
    assert [film.strokes for film in sheet.stack.films] == ["up", "down"]
    assert sheet.target.packing_error is not None
    assert sheet.target.packing_error.value == 0.005
    assert sheet.columns[0].header == "Pi 2"


def test_an_empty_text_is_the_empty_sheet() -> None:
    assert parse_sheet("") == RunSheet()
    assert not parse_sheet("").stack.accept_given


def test_an_amount_concentration_keeps_its_kind() -> None:
    sheet = parse_sheet('[film]\nconcentration = "1 mM"\nvolume = "0.05 mL"')
    assert sheet.film.concentration is not None
    assert sheet.film.concentration.unit == "mmol/L"


def test_a_mixture() -> None:
    sheet = parse_sheet(
        '[[film.component]]\nname = "a"\nmole_fraction = 0.25\n'
        '[[film.component]]\nname = "b"\nmole_fraction = "75 ± 1 %"\nmolar_mass = "300 g/mol"'
    )
    assert [c.mole_fraction.value for c in sheet.film.components] == [0.25, 0.75]
    assert sheet.film.components[1].mole_fraction.u == 0.01


# the sheet, and what its refusal must say; the line is that of the key
_REFUSED = [
    ('[film]\nvolum = "3 µL"', ["line 2", "film.volum", "did you mean 'volume'"]),
    ('[flim]\nname = "a"', ["line 1", "flim", "did you mean 'film'"]),
    ('[film]\ntemperature = "20 degC"', ["film.temperature", "subphase.temperature"]),
    ('[film]\nqqq = 1', ["film.qqq", "known here", "volume"]),
    ('volume = "3 µL"', ["unknown key 'volume'", "film.volume"]),
    ('[film]\nvolume = "0 µL"', ["line 2", "film.volume", "0 µL", "above 0 µL"]),
    ('[film]\nvolume = "-3 µL"', ["film.volume", "-3 µL", "above 0"]),
    ('[film]\nvolume = 50', ["film.volume", "50 without a unit", 'volume = "50']),
    ('[film]\nvolume = "50"', ["film.volume", "no unit"]),
    ('[film]\nvolume = "50 mg"', ["film.volume", "not a unit of volume"]),
    ('[film]\nvolume = "50 furlong"', ["line 2", "film.volume", "unknown unit 'furlong'"]),
    ('[film]\nvolume = true', ["film.volume", "True", "allowed"]),
    ('[film]\nvolume = ["50 µL"]', ["film.volume", "allowed"]),
    ('[film]\nvolume = 1979-05-27', ["film.volume"]),
    ('[film]\nconcentration = "0 mg/mL"', ["film.concentration", "above 0"]),
    ('[film]\npurity = 1.2', ["film.purity", "1.2", "at most 1"]),
    ('[film]\npurity = "120 %"', ["film.purity", "1.2", "at most 1"]),
    ('[film]\npurity = nan', ["film.purity", "nan"]),
    ('[film]\nname = 3', ["film.name", "3", "text in double quotes"]),
    ('film = 3', ["'film' is a number, not a table", "[film]"]),
    ('[[film]]\nname = "a"', ["'film' is a list, not a table"]),
    ('[film.component]\nname = "a"', ["'film.component' is one table", "[[film.component]]"]),
    ('[[film.component]]\nname = "a"', ["film.component[1]", "lacks 'mole_fraction'"]),
    ('[[film.component]]\nname = "a"\nmole_fraction = 0.3', ["add up to 0.3", "make 1"]),
    ('[[film.component]]\nname = "a"\nmole_fraction = 0', ["film.component[1].mole_fraction", "above 0"]),
    ('[film]\nmolar_mass = "1 g/mol"\n[[film.component]]\nname = "a"\nmole_fraction = 1', ["both given"]),
    ('[subphase]\ntemperature = "400 degC"', ["subphase.temperature", "at most 150 degC"]),
    ('[trough]\nsmallest_area = "90 cm^2"\nlargest_area = "80 cm^2"', ["smallest_area", "not below"]),
    ('[substrate]\nshape = "cone"', ["substrate.shape", '"cone"', '"plate", "rod", "table"']),
    ('[substrate]\nwetting = "yes"', ["substrate.wetting", "true or false"]),
    ('[[substrate.profile]]\nheight = "3 mm"\nwidth = "3 mm"', ["heights", "lowest first"]),
    ('[stack]\nlayers = 2.5', ["stack.layers", "2.5", "whole number"]),
    ('[stack]\nlayers = 0', ["stack.layers", "at least 1"]),
    ('[stack]\nlayers = true', ["stack.layers"]),
    ('[stack]\naccept = [1.05, 0.95]', ["stack.accept", "lower first"]),
    ('[stack]\naccept = [1.05]', ["stack.accept", "two numbers"]),
    ('[stack]\naccept = "0.9 to 1"', ["stack.accept"]),
    ('[stack]\ntype = "W"', ["stack.type", '"W"', '"Y", "X", "Z", "XY"']),
    ('[stack]\ndrift_limit = inf', ["stack.drift_limit"]),
    ('[[columns]]\nrole = "presure"\nindex = 1', ["columns[1].role", '"presure"', '"pressure"']),
    ('[[columns]]\nrole = "pressure"', ["neither of 'header' and 'index'"]),
    ('[[columns]]\nrole = "pressure"\nindex = 1\nheader = "p"', ["both of 'header' and 'index'"]),
    ('[[columns]]\nrole = "pressure"\nindex = 0', ["columns[1].index", "at least 1"]),
    ('[[columns]]\nrole = "time"\nindex = 1\n[[columns]]\nrole = "time"\nindex = 2', ["'time'", "2 columns"]),
    ('[film\nvolume = "3 µL"', ["line 1, column", "not TOML"]),
    ('[film]\nvolume = 50 µL', ["line 2, column", "not TOML", "double quotes"]),
    ('[film]\nvolume = "3 µL"\nvolume = "4 µL"', ["line 3", "not TOML"]),
    ("a = " + "[" * 4000, ["not a run sheet"]),
    ("a = " + "9" * 5000, ["not a run sheet"]),
]  # fmt: skip


@pytest.mark.parametrize(("text", "words"), _REFUSED)
def test_refusals_name_key_found_and_allowed(text: str, words: list[str]) -> None:
    with pytest.raises(UpstrokeError) as caught:
        parse_sheet(text, "run.toml")
    message = str(caught.value)
    assert message.startswith("run.toml")
    assert "\n" not in message
    assert len(message) < 400
    for word in words:
        assert word in message


def test_reading_the_file(tmp_path: Path) -> None:
    path = tmp_path / "run.toml"
    path.write_bytes('[film]\r\nname = "Säure"\r\n'.encode("utf-8-sig"))
    assert read_sheet(path).film.name == "Säure"
    path.write_bytes('[film]\nname = "Säure"\n'.encode("utf-16"))
    assert read_sheet(path).film.name == "Säure"
    path.write_bytes(b"  \n")
    with pytest.raises(UpstrokeError, match="sheet is empty"):
        read_sheet(path)
    path.write_bytes(b"# \n" * 400_000)
    with pytest.raises(UpstrokeError, match="1200000 bytes"):
        read_sheet(path)
    with pytest.raises(UpstrokeError, match="no such file"):
        read_sheet(tmp_path / "none.toml")


def test_every_key_fills_a_field_and_every_field_has_a_key() -> None:
    classes = {
        "film": sheet_types.Film, "film.component": sheet_types.Component, "subphase": sheet_types.Subphase,
        "trough": sheet_types.Trough, "substrate": sheet_types.Substrate,
        "substrate.profile": sheet_types.ProfilePoint, "dipping": sheet_types.Dipping,
        "stack": sheet_types.Stack, "stack.film": sheet_types.StackFilm, "target": sheet_types.Target,
        "check": sheet_types.Check, "columns": sheet_types.ColumnHint,
    }  # fmt: skip
    # made from the other keys, or the name of a child table
    derived = {"components", "accept_given", "films", "profile"}
    assert {section.path for section in SECTIONS} == set(classes)
    for section in SECTIONS:
        fields = {field.name for field in dataclasses.fields(classes[section.path])} - derived
        keys = {key.name for key in section.keys}
        if section.path == "film":
            keys.remove("molar_mass")  # of the one component
        assert keys == fields


def test_every_example_is_read_as_it_stands() -> None:
    for section in SECTIONS:
        for key in section.keys:
            heading = f"[[{section.path}]]" if section.many else f"[{section.path}]"
            others = "".join(
                f"{other.name} = {other.example}\n"
                for other in section.keys
                if other.required and other.name != key.name
            )
            text = f"{heading}\n{others}{key.name} = {key.example}\n"
            if section.path in ("film.component", "substrate.profile", "columns"):
                continue  # these only make sense in numbers: a mixture, a profile, header or index
            parse_sheet(text)


def test_the_template_says_nothing_until_something_is_filled_in() -> None:
    empty, filled = parse_sheet(template()), RunSheet()
    assert dataclasses.replace(empty, substrate=None) == filled
    assert empty.substrate is None


def test_the_template_is_toml_with_every_setting_switched_on() -> None:
    import tomllib

    lines = []
    for line in template().splitlines():
        lines.append(re.sub(r"^# (?=\[|\w+ = )", "", line))
    document = tomllib.loads("\n".join(lines))
    for section in SECTIONS:
        at = document
        for part in section.path.split("."):
            at = at[part]
            at = at[0] if isinstance(at, list) else at
        assert {key.name for key in section.keys} <= set(at)


def test_the_template_is_readable() -> None:
    text = template()
    assert max(map(len, text.splitlines())) <= 100
    assert "hazardous waste" in text
    assert "gloves" in text
    for role in ROLES:
        assert role in text


@given(st.text(max_size=200))
def test_any_text_is_a_sheet_or_refused(text: str) -> None:
    with contextlib.suppress(UpstrokeError):
        parse_sheet(text)


_LINES = st.sampled_from(
    [
        "[film]", "[[film.component]]", "[stack]", "[[stack.film]]", "[[columns]]", "[substrate]",
        "title = 3",
        'name = "a"', 'volume = "1 µL"', 'volume = "1 ± µL"', "mole_fraction = 0.5", "mole_fraction = 1e400",
        "layers = 3", "layers = -3", 'role = "time"', "index = 99999999999999999999", 'shape = "rod"',
        "accept = [1, 2]", "accept = [[]]", "component = 3", "film = {}", "profile = [1]", "columns = [3]",
    ]
)  # fmt: skip


@given(st.lists(_LINES, max_size=12).map("\n".join))
def test_any_pile_of_lines_is_a_sheet_or_refused(text: str) -> None:
    with contextlib.suppress(UpstrokeError):
        parse_sheet(text)
