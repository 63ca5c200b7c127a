"""The reader against things outside the project: published curves, CODATA units, pandas and NumPy."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import scipy.constants as codata
from make_exports import EXPORTS

from isotherm.table import read_table
from isotherm.text_clock import clock_seconds
from isotherm.trace_read import read_trace
from isotherm.units import conversion

_BESIDE = Path(__file__).resolve().parents[3] / "shared" / "data" / "published-isotherms"
_PUBLISHED = Path(os.environ.get("UPSTROKE_PUBLISHED_ISOTHERMS", str(_BESIDE)))
# Points digitised from published figures, as collected in the open NMRlipids Databank; the papers' DOIs
# are in the first line of each file.
_FILES = (
    "DPPC_isotherm_LeeLinChang2006.csv",
    "DPPC_isotherm_MansourZografi2007.csv",
    "DPPC_isotherm_Shapovalov1998.csv",
    "DPPE_isotherm.csv",
    "POPC_isotherm_Olzynska2016_310K.csv",
    "POPC_isotherm_Volinsky2012.csv",
)


@pytest.mark.parametrize("name", _FILES)
def test_published_isotherms_read_as_they_stand(name: str) -> None:
    path = _PUBLISHED / name
    if not path.exists():
        pytest.skip(
            f"{path} is absent: set UPSTROKE_PUBLISHED_ISOTHERMS to the folder that holds it"
        )
    plain = np.loadtxt(path, delimiter=",", encoding="utf-8")
    trace = read_trace(path)
    # Å² to nm²: 1 Å is 0.1 nm
    assert trace.area == pytest.approx(plain[:, 0] / 100.0)
    assert trace.pressure == pytest.approx(plain[:, 1])
    assert any("APL in Å²" in warning for warning in trace.warnings)


@pytest.mark.parametrize(
    ("text", "dimension", "si", "fixed"),
    [
        ("Å", "length", codata.angstrom, 1e-3),
        ("in", "length", codata.inch, 1e-3),
        ("µm", "length", codata.micron, 1e-3),
        ("min", "time", codata.minute, 1.0),
        ("h", "time", codata.hour, 1.0),
        ("dyn/cm", "pressure", codata.dyn / codata.centi, 1e-3),
        ("erg/cm^2", "pressure", codata.erg / codata.centi**2, 1e-3),
        ("mN/m", "pressure", codata.milli, 1e-3),
        ("Å^2", "molecular_area", codata.angstrom**2, 1e-18),
        ("m^2/mol", "molecular_area", 1.0 / codata.N_A, 1e-18),
        ("L", "volume", codata.liter, 1e-9),
        ("µL", "volume", codata.micro * codata.liter, 1e-9),
    ],
)
def test_units_agree_with_codata(text: str, dimension: str, si: float, fixed: float) -> None:
    # scipy.constants: CODATA and the SI brochure
    assert conversion(text, dimension).scale(1.0) == pytest.approx(si / fixed, rel=1e-12)


def test_zero_celsius_agrees_with_codata() -> None:
    kelvin = codata.convert_temperature(25.0, "Celsius", "Kelvin")
    assert conversion("K", "temperature")(float(kelvin)) == pytest.approx(25.0)


@pytest.mark.parametrize(
    ("name", "options"),
    [
        ("comma.csv", {}),
        ("semicolon_comma.csv", {"sep": ";", "decimal": ","}),
        ("tab_comma.txt", {"sep": "\t", "decimal": ","}),
        ("utf16.csv", {"sep": ";", "decimal": ",", "encoding": "utf-16"}),
        ("quoted_comma.csv", {"decimal": ","}),
        ("crlf.csv", {}),
    ],
)
def test_pandas_told_what_is_what_reads_the_same(name: str, options: dict[str, str]) -> None:
    path = EXPORTS / "good" / name
    frame = pd.read_csv(path, **options)  # type: ignore[call-overload]
    table = read_table(path)
    for role, column in table.source.columns.items():
        assert table.values[role] == pytest.approx(
            frame.iloc[:, column.index - 1].to_numpy(dtype=float)
        )


def test_clock_times_agree_with_pandas() -> None:
    cells = ["2031-02-27T23:59:58.25", "2031-02-28T12:00:00", "2031-03-01T00:00:00.5"]
    stamps = pd.to_datetime(pd.Series(cells), format="ISO8601")
    expected = (stamps - stamps.iloc[0]).dt.total_seconds().to_numpy()
    read = clock_seconds(cells, where="time")
    assert read - read[0] == pytest.approx(expected)
