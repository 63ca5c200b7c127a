"""Whatever bytes come in, the outcome is a result or a refusal in one line, soon and in little memory."""

from __future__ import annotations

import contextlib
import random
import time
import tracemalloc
from pathlib import Path

import numpy as np
import pytest
from hostile_inputs import mutated, piled, seed_inputs
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from isotherm.errors import UpstrokeError
from isotherm.sheet import RunSheet
from isotherm.sheet_read import parse_sheet, read_sheet
from isotherm.table import read_table
from isotherm.trace_read import read_trace

_QUIET = settings(
    max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
_SHEET = parse_sheet(
    '[film]\nmolar_mass = "300 g/mol"\nconcentration = "1 mg/mL"\nvolume = "50 µL"\n[trough]\nwidth = "75 mm"'
)


def _outcome(path: Path, data: bytes) -> None:
    """Read `data` in every way; anything but a result or a refusal raises."""
    path.write_bytes(data)
    for read in (
        lambda: read_table(path),
        lambda: read_table(path, needs=("time", "dipper_position", "area", "pressure")),
        lambda: read_trace(path),
        lambda: read_trace(path, _SHEET),
        lambda: read_sheet(path),
    ):
        try:
            result = read()
        except UpstrokeError as error:
            if "\n" in str(error) or not str(error):
                raise AssertionError(repr(str(error))) from error
            continue
        if isinstance(result, RunSheet):
            continue
        lines = getattr(result, "lines", None)
        if lines is not None:
            for values in result.values.values():
                assert len(values) == len(lines)
        else:
            assert np.isfinite(result.area).all()
            assert np.isfinite(result.pressure).all()
            assert (result.area > 0).all()


@_QUIET
@given(st.binary(max_size=400))
def test_any_bytes(tmp_path: Path, data: bytes) -> None:
    _outcome(tmp_path / "input", data)


@_QUIET
@given(st.text(alphabet="0123456789.,;\t \n\r-+eE\"'#/()[]ÅµΠmNcs²^:nai_", max_size=300))
def test_any_text(tmp_path: Path, text: str) -> None:
    _outcome(tmp_path / "input", text.encode())


@_QUIET
@given(st.integers(0, 2**32))
def test_mutated_exports(tmp_path: Path, seed: int) -> None:
    rng = random.Random(seed)
    _outcome(tmp_path / "input", mutated(rng, seed_inputs()) if rng.random() < 0.7 else piled(rng))


_LARGE = {
    "one long line of digits": b"1" * 3_000_000,
    "one long row": b"1.5," * 700_000,
    "one long row of blanks": b" " * 3_000_000,
    "only separators": b";;;;;;;;\n" * 300_000,
    "only newlines": b"\n" * 3_000_000,
    "only quotes": b'"' * 3_000_000,
    "open quote before rows": b'"' + b"1.5,2.5\n" * 400_000,
    "text with numbers": b"note 12, 3 of 4 at 5.5 mN/m and 20 degC\n" * 75_000,
    "a header of many cells": b"Area (cm^2)," * 100_000 + b"\n" + b"1,2\n" * 100_000,
    "many columns": (b"1.5," * 1500 + b"\n") * 500,
    "changing widths": b"".join(b"1.5," * (i % 40) + b"2\n" for i in range(40_000)),
    "brackets": b"(" * 1_000_000 + b"\n1,2\n" * 10,
    "a million commas and one row": b"," * 1_000_000 + b"\n1,2\n3,4\n",
    "repeated headers": b"Area (cm^2),Pressure (mN/m)\n1.5,2.5\n" * 60_000,
    "alternating text": b"1.5,2.5\nhello world\n" * 100_000,
    "every cell missing": b"Area (cm^2),Pressure (mN/m)\n" + b"-,n/a\n" * 300_000,
    "clock times": b"Time,Area (cm^2),Pressure (mN/m)\n" + b"09:15:00,1.5,2.5\n" * 100_000,
    "utf-16": ("Area (cm^2),Pressure (mN/m)\n" + "1.5,2.5\n" * 200_000).encode("utf-16"),
    "lone carriage returns": b"Area (cm^2),Pressure (mN/m)\r" + b"1.5,2.5\r" * 300_000,
    "nulls after a text head": b"Area (cm^2),Pressure (mN/m)\n" + b"1.5,2.5\n" * 10_000 + b"\0" * 2_000_000,
    "invalid utf-8 after the head": b"Area (cm^2),Pressure (mN/m)\n"
    + b"1.5,2.5\n" * 30_000
    + b"\xff" * 2_000_000,
}  # fmt: skip


@pytest.mark.parametrize("name", sorted(_LARGE))
def test_large_hostile_files_take_little_time(name: str, tmp_path: Path) -> None:
    path = tmp_path / "input"
    path.write_bytes(_LARGE[name])
    import pandas  # noqa: F401 - its own import is not what is measured

    begin = time.process_time()
    with contextlib.suppress(UpstrokeError):
        read_trace(path, _SHEET)
    # 0.01 to 2 s when this was written
    assert time.process_time() - begin < 10.0


@pytest.mark.parametrize(
    ("name", "times"),
    [
        ("a header of many cells", 30),
        ("clock times", 30),
        ("invalid utf-8 after the head", 10),
        ("lone carriage returns", 30),
        ("many columns", 10),
        ("one long row", 10),
        ("utf-16", 10),
    ],
)
def test_large_hostile_files_take_little_memory(name: str, times: int, tmp_path: Path) -> None:
    """Peak of allocated memory against the size of the file; arrays of 8 bytes for cells of 3 take some."""
    path = tmp_path / "input"
    path.write_bytes(_LARGE[name])
    import pandas  # noqa: F401 - its own import is not what is measured

    tracemalloc.start()
    try:
        with contextlib.suppress(UpstrokeError):
            read_trace(path, _SHEET)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    assert peak < times * len(_LARGE[name])
