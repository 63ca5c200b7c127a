"""Evidence files, good and bad."""

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from transfer.evidence_read import read_evidence
from transfer.evidence_series import Impedance, Voltammogram

CSV = """# a sample's evidence
kind,layers,value,u,unit,crystal_frequency,faces
ellipsometric_thickness,4,101,2,Å,,
ellipsometric_thickness,8,20.3,0.2,nm,,
resonator_frequency,4,-0.41,0.003,kHz,5 MHz,2
resonator_frequency,8,-820,3,Hz,,
absorbance,8,0.050,0.001,1,,
"""

TOML = """
title = "one electrode"
[electrode]
area = "0.196 ± 0.004 cm^2"
roughness = "1.15 ± 0.05"
[interfacial_capacitance]
permittivity = "2.6 ± 0.1"
points = [
  {layers = 0, value = "4.10 ± 0.05 µF"},
  {layers = 4, value = "0.90 ± 0.02 µF"},
]
[[electroactive_coverage]]
electrons = 1
points = [{stroke = 4, value = "12.0 ± 0.3 µC"}]
"""


def write(folder, name, text):
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def test_csv(tmp_path):
    found = read_evidence(write(tmp_path, "e.csv", CSV))
    assert [s.kind for s in found.series] == [
        "ellipsometric_thickness",
        "resonator_frequency",
        "absorbance",
    ]
    thickness, resonator, absorbance = found.series
    assert [p.value.value for p in thickness.points] == pytest.approx([10.1, 20.3])
    assert [p.value.u for p in thickness.points] == pytest.approx([0.2, 0.2])
    assert [p.value.value for p in resonator.points] == pytest.approx([-410.0, -820.0])
    assert resonator.quantity("crystal_frequency").value == pytest.approx(5e6)
    assert resonator.settings["faces"] == 2
    assert absorbance.points[0].value.unit == "1"
    assert "line 3" in thickness.points[0].where


def test_toml(tmp_path):
    found = read_evidence(write(tmp_path, "e.toml", TOML))
    capacitance, coverage = found.series
    assert capacitance.quantity("electrode_area").value == pytest.approx(0.196)
    assert capacitance.quantity("roughness").u == pytest.approx(0.05)
    assert capacitance.points[1].value.value == pytest.approx(0.90e-6)
    assert coverage.points[0].axis == "stroke"
    assert coverage.points[0].value.unit == "C"
    assert "line 9" in capacitance.points[0].where
    assert "line 14" in coverage.points[0].where


def test_semicolons_and_decimal_commas(tmp_path):
    text = "kind;layers;value;u;unit\nxray_thickness;4;10,1;0,2;nm\n"
    found = read_evidence(write(tmp_path, "e.csv", text))
    assert found.series[0].points[0].value.value == pytest.approx(10.1)


def test_reading_changes_nothing(tmp_path):
    path = write(tmp_path, "e.csv", CSV)
    before = path.read_bytes(), sorted(p.name for p in tmp_path.iterdir())
    read_evidence(path)
    assert (path.read_bytes(), sorted(p.name for p in tmp_path.iterdir())) == before


def cycle_text(sep=",", head="potential (V),current (µA)"):
    potential = np.concatenate([np.linspace(0, 0.5, 60), np.linspace(0.5, 0, 60)])
    current = np.repeat([1.0, -1.0], 60)
    rows = [f"{e:.4f}{sep}{i:.3f}" for e, i in zip(potential, current, strict=True)]
    return "\n".join(["instrument said hello", head.replace(",", sep), *rows])


@pytest.mark.parametrize(
    ("sep", "head"),
    [
        (",", "potential (V),current (µA)"),
        ("\t", "E/V,I/µA"),
        (";", "Potential [V],Current [uA]"),
    ],
)
def test_raw_voltammograms(tmp_path, sep, head):
    write(tmp_path, "a.csv", cycle_text(sep, head))
    text = "kind,layers,file,scan_rate\ninterfacial_capacitance,2,a.csv,50 mV/s\n"
    found = read_evidence(write(tmp_path, "e.csv", text))
    record = found.series[0].points[0].records[0]
    assert isinstance(record.curve, Voltammogram)
    assert record.scan_rate.value == pytest.approx(0.05)
    assert len(record.curve.potential) == 120
    assert record.curve.current[0] == pytest.approx(1e-6)


def test_records_of_one_state_make_one_point(tmp_path):
    write(tmp_path, "a.csv", cycle_text())
    write(tmp_path, "b.csv", cycle_text())
    text = (
        "kind,layers,file,scan_rate\ninterfacial_capacitance,2,a.csv,50 mV/s\n"
        "interfacial_capacitance,2,b.csv,0.1 V/s\n"
    )
    found = read_evidence(write(tmp_path, "e.csv", text))
    assert [len(p.records) for p in found.series[0].points] == [2]


def test_scan_rate_from_the_time_column(tmp_path):
    potential = np.concatenate([np.linspace(0, 0.5, 101), np.linspace(0.5, 0, 101)[1:]])
    rows = "\n".join(f"{0.1 * n:.2f},{1e3 * e:.3f},1.0" for n, e in enumerate(potential))
    write(tmp_path, "a.csv", f"time (s),potential (mV),current (nA)\n{rows}\n")
    text = "kind,layers,file\ninterfacial_capacitance,2,a.csv\n"
    found = read_evidence(write(tmp_path, "e.csv", text))
    assert found.series[0].points[0].records[0].scan_rate.value == pytest.approx(0.05)


def test_impedance(tmp_path):
    f = np.geomspace(1, 1e4, 30)
    rows = "\n".join(f"{x:.5g}\t50\t{1e5 / x:.6g}" for x in f)
    write(tmp_path, "z.txt", f"Freq (Hz)\tRe Z (ohm)\t-Im Z (ohm)\n{rows}\n")
    text = (
        "[interfacial_capacitance]\nfrequency = '100 Hz'\npoints = [{layers = 2, file = 'z.txt'}]\n"
    )
    found = read_evidence(write(tmp_path, "e.toml", text))
    record = found.series[0].points[0].records[0]
    assert isinstance(record.curve, Impedance)
    assert np.all(record.curve.imaginary < 0)
    assert record.frequency.value == pytest.approx(100.0)


HEAD = "kind,layers,value,u,unit\n"
BAD_CSV = {
    "unit missing": (HEAD + "ellipsometric_thickness,4,10.1,0.2,\n", "no unit", "line 2"),
    "unit of something else": (
        HEAD + "ellipsometric_thickness,4,10.1,0.2,mN/m\n",
        "not a unit of",
        "line 2",
    ),
    "unknown unit": (HEAD + "ellipsometric_thickness,4,10.1,0.2,quux\n", "unknown unit", "line 2"),
    "unknown kind": (
        HEAD + "elipsometric_thickness,4,10.1,0.2,nm\n",
        "unknown kind",
        "did you mean",
    ),
    "unknown column": ("kind,layer,value,u,unit\n", "unknown column", "did you mean 'layers'"),
    "negative charge": (HEAD + "electroactive_coverage,4,-3,0.2,µC\n", "negative charge", "line 2"),
    "no layers": (
        "kind,value,u,unit\nabsorbance,0.1,0.01,1\n",
        "neither layers nor stroke",
        "line 2",
    ),
    "half a layer": (HEAD + "absorbance,2.5,0.1,0.01,1\n", "'layers' is 2.5", "whole number"),
    "negative layers": (HEAD + "absorbance,-2,0.1,0.01,1\n", "'layers' is -2", "whole number"),
    "no value": (HEAD + "absorbance,2,,,\n", "no value", "line 2"),
    "no number": (HEAD + "absorbance,2,much,0.1,1\n", "not a quantity", "line 2"),
    "u of zero": (HEAD + "absorbance,2,0.1,0,1\n", "not above zero", "line 2"),
    "mixed units": (
        HEAD + "electroactive_coverage,2,3,0.1,µC\nelectroactive_coverage,4,3e-10,1e-11,mol/cm^2\n",
        "mixes values",
        "line 3",
    ),
    "setting changes": (
        "kind,layers,value,u,unit,faces\nabsorbance,2,0.1,0.01,1,2\nabsorbance,4,0.2,0.01,1,1\n",
        "'faces' is 1 here",
        "line 3",
    ),
    "setting of another kind": (
        "kind,layers,value,u,unit,overtone\nabsorbance,2,0.1,0.01,1,3\n",
        "not a setting of absorbance",
        "line 2",
    ),
    "empty": ("", "empty", ""),
    "header only": (HEAD, "no evidence", ""),
    "no file": (
        "kind,layers,file\nelectroactive_coverage,2,gone.csv\n",
        "no such file",
        "line 2",
    ),
    "raw file of a kind without": (
        "kind,layers,file\nabsorbance,2,gone.csv\n",
        "not read from raw files",
        "line 2",
    ),
}


@pytest.mark.parametrize("case", BAD_CSV)
def test_bad_csv_is_one_clear_line(tmp_path, case):
    text, what, also = BAD_CSV[case]
    with pytest.raises(UpstrokeError) as caught:
        read_evidence(write(tmp_path, "e.csv", text))
    message = str(caught.value)
    assert what in message
    assert also in message
    assert "e.csv" in message
    assert "\n" not in message


BAD_TOML = {
    "not toml": ("[absorbance\n", "not TOML", "line 1"),
    "unknown kind": ("[absorbence]\npoints = []\n", "unknown kind", "did you mean 'absorbance'"),
    "unknown key": (
        "[absorbance]\nface = 2\npoints = [{layers = 2, value = '0.1'}]\n",
        "unknown key",
        "did you mean 'faces'",
    ),
    "unknown point key": (
        "[absorbance]\npoints = [{layer = 2, value = '0.1'}]\n",
        "unknown key 'layer'",
        "did you mean 'layers'",
    ),
    "no points": ("[absorbance]\nfaces = 2\n", "has no points", "points ="),
    "bare number": (
        "[xray_thickness]\npoints = [{layers = 2, value = 5.0}]\n",
        "no unit",
        "line 2",
    ),
    "setting without unit": (
        "[resonator_frequency]\ncrystal_frequency = 5e6\npoints = [{layers = 2, value = '-40 Hz'}]\n",
        "without a unit",
        "line 2",
    ),
    "three faces": (
        "[absorbance]\nfaces = 3\npoints = [{layers = 2, value = '0.1'}]\n",
        "'absorbance.faces' is 3",
        "line 2",
    ),
    "electrode": ("[electrode]\nsize = '1 cm^2'\n", "unknown key 'electrode.size'", "line 2"),
}


@pytest.mark.parametrize("case", BAD_TOML)
def test_bad_toml_is_one_clear_line(tmp_path, case):
    text, what, also = BAD_TOML[case]
    with pytest.raises(UpstrokeError) as caught:
        read_evidence(write(tmp_path, "e.toml", text))
    message = str(caught.value)
    assert what in message
    assert also in message
    assert "\n" not in message


def test_voltammogram_without_units_is_said(tmp_path):
    write(tmp_path, "a.csv", cycle_text(head="potential,current"))
    text = "kind,layers,file,scan_rate\nelectroactive_coverage,2,a.csv,50 mV/s\n"
    with pytest.raises(UpstrokeError, match="no column is the potential"):
        read_evidence(write(tmp_path, "e.csv", text))


def test_missing_scan_rate_is_said(tmp_path):
    write(tmp_path, "a.csv", cycle_text())
    text = "kind,layers,file\nelectroactive_coverage,2,a.csv\n"
    with pytest.raises(UpstrokeError, match="no scan rate"):
        read_evidence(write(tmp_path, "e.csv", text))


def test_other_suffix_is_said(tmp_path):
    with pytest.raises(UpstrokeError, match=r"\.csv or \.toml"):
        read_evidence(write(tmp_path, "e.json", "{}"))
