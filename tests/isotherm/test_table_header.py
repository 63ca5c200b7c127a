"""Header cells: name, unit and role as the trade writes them."""

from __future__ import annotations

import time

import pytest
from hypothesis import given
from hypothesis import strategies as st

from isotherm.table_cell import parse_cell
from isotherm.table_words import roles_of

_CELLS = [
    ("Surface pressure (mN/m)", "pressure", "mN/m"),
    ("Surface Pressure (Π) [mN/m]", "pressure", "mN/m"),
    ("π/mN m-1", "pressure", "mN m-1"),
    ("Pi (mN·m⁻¹)", "pressure", "mN·m⁻¹"),
    ("SurfPress_mN/m", "pressure", "mN/m"),
    ("SurfacePressure", "pressure", None),
    ("surface_pressure_mN_per_m", "pressure", "mN per m"),
    ("pressure_mN_m", "pressure", "mN/m"),
    ("Pressure, mN/m", "pressure", "mN/m"),
    ("Surf. press. [dyn/cm]", "pressure", "dyn/cm"),
    ("Oberflächendruck in mN/m", "pressure", "mN/m"),
    ("Oberflaechendruck / (mN/m)", "pressure", "mN/m"),
    ("Pression de surface (mN/m)", "pressure", "mN/m"),
    ("Presión superficial (mN/m)", "pressure", "mN/m"),
    ("Pressure (filtered)", "pressure", None),
    ("p [mN/m]", "pressure", "mN/m"),
    ("Surface tension (mN/m)", "tension", "mN/m"),
    ("γ (mN/m)", "tension", "mN/m"),
    ("σ / mN/m", "tension", "mN/m"),
    ("Oberflächenspannung [mN/m]", "tension", "mN/m"),
    ("Tension superficielle (mN/m)", "tension", "mN/m"),
    ("Tension (V)", "potential", "V"),
    ("A / Å^2 molecule^-1", "molecular_area", "Å^2 molecule^-1"),
    ("Area per molecule / Å²", "molecular_area", "Å²"),
    ("Area/molecule (Å2)", "molecular_area", "Å2"),
    ("Mma (Å²/molec.)", "molecular_area", "Å²/molec."),
    ("Mean molecular area [nm^2]", "molecular_area", "nm^2"),
    ("A (Å²)", "molecular_area", "Å²"),
    ("Area (A^2)", "molecular_area", "A^2"),
    ("Area (nm²)", "molecular_area", "nm²"),
    ("Area (cm²/molecule)", "molecular_area", "cm²/molecule"),
    ("Molekülfläche (nm²)", "molecular_area", "nm²"),
    ("Fläche pro Molekül [Å²]", "molecular_area", "Å²"),
    ("Aire par molécule (Å²)", "molecular_area", "Å²"),
    ("Área por molécula (Å²)", "molecular_area", "Å²"),
    ("Trough area (cm^2)", "area", "cm^2"),
    ("A (cm²)", "area", "cm²"),
    ("area_cm2", "area", "cm2"),
    ("Area cm2", "area", "cm2"),
    ("Area [mm^2]", "area", "mm^2"),
    ("Area (m2)", "area", "m2"),
    ("Fläche in cm²", "area", "cm²"),
    ("Surface (cm²)", "area", "cm²"),
    ("Area (cmÂ²)", "area", "cmÂ²"),
    ("cm^2", "area", "cm^2"),
    ("Time [s]", "time", "s"),
    ("t/s", "time", "s"),
    ("time_s", "time", "s"),
    ("Elapsed time (min)", "time", "min"),
    ("Zeit (s)", "time", "s"),
    ("Time (hh:mm:ss)", "time", None),
    ("s", "time", "s"),
    ("T (°C)", "temperature", "°C"),
    ("Temperature C", "temperature", "C"),
    ("temperature_degC", "temperature", "degC"),
    ("Temp. (K)", "temperature", "K"),
    ("Dipper position (mm)", "dipper_position", "mm"),
    ("Immersion depth [mm]", "dipper_position", "mm"),
    ("Barrier A (mm)", "barrier_position", "mm"),
    ("Barrier A", "barrier_position", None),
    ("Left barrier position (cm)", "barrier_position", "cm"),
    ("ΔV (mV)", "potential", "mV"),
    ("dV [V]", "potential", "V"),
    ("Surface potential (mV)", "potential", "mV"),
]


@pytest.mark.parametrize(("text", "role", "unit"), _CELLS)
def test_name_unit_and_role(text: str, role: str, unit: str | None) -> None:
    cell = parse_cell(text)
    assert cell.roles == (role,)
    assert cell.unit == unit
    assert cell.text == text


@pytest.mark.parametrize(
    "text",
    [
        "Barrier speed (mm/min)", "Target pressure (mN/m)", "Pressure setpoint (mN/m)", "Relative area (%)",
        "Pressure std (mN/m)", "Pressure (kPa)", "Room temperature (°C)", "Index", "A", "t",
        "Compression modulus (mN/m)",
        "Δγ (mN/m)", "Area change (cm²)", "Humidity (%)", "Cycle", "Sollwert Druck (mN/m)", "",
    ],
)  # fmt: skip
def test_columns_that_play_no_role(text: str) -> None:
    assert parse_cell(text).roles == ()


def test_columns_that_could_be_two_things() -> None:
    assert parse_cell("Position (mm)").roles == ("barrier_position", "dipper_position")
    assert parse_cell("mN/m").roles == ("pressure", "tension")


@pytest.mark.parametrize(
    ("text", "unknown"),
    [("Pressure (furlong)", "furlong"), ("Pressure/foo", "foo"), ("Area [acre]", "acre")],
)
def test_what_stands_for_a_unit_and_is_none(text: str, unknown: str) -> None:
    assert parse_cell(text).unknown == unknown


@given(st.text(max_size=300))
def test_any_text_is_a_header_cell(text: str) -> None:
    cell = parse_cell(text)
    assert isinstance(roles_of(cell.name, cell.unit), tuple)


@pytest.mark.parametrize(
    "text",
    ["(" * 50_000, "/" * 50_000, "_" * 50_000, " " * 50_000 + "x", "a_" * 25_000,
     "A (" * 20_000, "in " * 20_000,
     "²" * 50_000, "mN/" * 20_000, "'" * 50_000, "[(" * 25_000 + ")]" * 25_000],
)  # fmt: skip
def test_hostile_headers_take_no_time(text: str) -> None:
    begin = time.perf_counter()
    parse_cell(text)
    assert time.perf_counter() - begin < 0.5
