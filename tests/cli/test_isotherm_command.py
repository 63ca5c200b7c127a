"""`upstroke isotherm` as a person and a script meet it."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from isotherm_results import compression, result

from cli.isotherm_csv import isotherm_csv
from cli.isotherm_text import isotherm_text
from cli.main import run
from isotherm.result import IsothermResult

EXPECTED = """\
Spacer film, run 3

Read 2,412 rows from spacer.txt
  column  header             taken for       unit
       1  Time               time            s
       2  Area per molecule  molecular area  Å²
       3  Surface pressure   pressure        mN/m

Compression 1 (1,203 rows, 0 s to 2410 s, noise 0.05 mN/m)
                                value ± U           random  common  unit
  lift-off area                 0.800 ± 0.016       0.0020   0.016  nm²
  coexistence onset, area       0.600 ± 0.013       0.0040   0.012  nm²
  coexistence onset, pressure    8.00 ± 0.21         0.060    0.20  mN/m
  coexistence end, area         0.300 ± 0.008       0.0060  0.0060  nm²
  coexistence end, pressure      9.00 ± 0.21         0.060    0.20  mN/m
  kink, area                    0.215 ± 0.004       0.0012  0.0043  nm²
  kink, pressure                26.00 ± 0.21         0.060    0.20  mN/m
  collapse                      constant-pressure
  collapse, area                0.195 ± 0.004      0.00040  0.0039  nm²
  collapse, pressure            50.80 ± 0.21         0.060    0.20  mN/m
  highest pressure              51.20 ± 0.21         0.060    0.20  mN/m
  limiting area                 0.236 ± 0.005       0.0010  0.0047  nm²
  largest modulus                 251 ± 10              10       –  mN/m
  largest modulus, at pressure  48.00 ± 0.21         0.060    0.20  mN/m
  zero subtracted               -0.12 ± 0.20         0.020    0.20  mN/m

  phase                              area, nm²  pressure, mN/m  modulus, mN/m
  liquid-expanded               0.800 to 0.600      0.1 to 8.0  28.0 ± 1.1
  liquid-expanded to condensed  0.600 to 0.300      8.0 to 9.0  1.50 ± 0.06
  intermediate                  0.300 to 0.215     9.0 to 26.0  52.0 ± 2.1
  liquid-condensed              0.215 to 0.195    26.0 to 50.8   248 ± 10

  at pressure, mN/m  area, nm²      modulus, mN/m
                 10  0.295 ± 0.006  55.0 ± 2.2
                 30  0.212 ± 0.004   245 ± 10
                 60      –             –

± is the expanded uncertainty U = 2u (k = 2, coverage about 95 %). Its two
parts, same k: random differs from point to point and run to run; common is
shared by the whole run.

Warnings
  - tension of the clean subphase taken for pure water at 20.0 °C
"""


def test_the_printed_table_is_exactly_this(acid: IsothermResult) -> None:
    assert isotherm_text(acid, 80) == EXPECTED


@pytest.mark.parametrize("width", [30, 48, 60, 80, 100])
def test_no_line_is_wider_than_the_terminal(acid_cycle: IsothermResult, width: int) -> None:
    text = isotherm_text(acid_cycle, width)
    assert max(len(line) for line in text.splitlines()) <= width
    for value in ("0.215 ± 0.004", "50.80 ± 0.21", "0.236 ± 0.005"):
        assert value in text  # values are not broken over lines


def test_a_film_that_did_not_collapse_is_said_to() -> None:
    text = isotherm_text(result(replace(compression(), collapse=None)), 80)
    assert "  collapse                      not reached\n" in text


def test_control_characters_of_a_file_stay_out_of_the_terminal(acid: IsothermResult) -> None:
    hostile = replace(acid, title="run \x1b[31m", warnings=("column '\x07'",))
    text = isotherm_text(hostile, 80)
    assert "\x1b" not in text
    assert "\x07" not in text
    assert "run \\x1b[31m" in text


def test_the_csv_opens_as_it_is(acid_cycle: IsothermResult) -> None:
    import pandas as pd

    frame = pd.read_csv(io.BytesIO(isotherm_csv([acid_cycle])))
    down = frame[frame["branch"] == 1]
    curve = acid_cycle.branches[0].curve
    np.testing.assert_allclose(down["area_nm2"], curve.area, rtol=1e-6)
    np.testing.assert_allclose(down["pressure_mN_per_m"], curve.pressure, rtol=1e-6, atol=1e-12)
    np.testing.assert_allclose(down["u_area_nm2"], 0.01 * curve.area, rtol=1e-6)
    assert set(frame["direction"]) == {"compression", "expansion"}
    assert frame["potential_mV"].isna().all()


@pytest.mark.parametrize("name", ["=cmd()", "+1", "-1", "@SUM(A1)", "\tx", "\rx"])
def test_no_csv_cell_is_a_formula(acid: IsothermResult, name: str) -> None:
    hostile = replace(acid, source=replace(acid.source, path=name))
    rows = list(csv.reader(io.StringIO(isotherm_csv([hostile]).decode(), newline="")))
    shown = {"\tx": "\\tx", "\rx": "\\rx"}.get(name, f"'{name}")
    assert rows[1][0] == shown
    assert all(float(row[6]) < 60 for row in rows[1:])  # numbers stay numbers, negative ones too


# ---- the command itself, on an invented export


def pressure_of(area: np.ndarray) -> np.ndarray:
    return np.interp(area, [0.17, 0.195, 0.215, 0.245, 0.40], [46.0, 51.0, 26.0, 0.2, 0.0])


def write_export(path: Path, *, seed: int = 1, rows: int = 900) -> Path:
    rng = np.random.default_rng(seed)
    area = np.linspace(0.40, 0.185, rows)
    pressure = pressure_of(area) + rng.normal(0.0, 0.04, rows)
    lines = [f"{a:.5f};{p:.3f}" for a, p in zip(area, pressure, strict=True)]
    path.write_text("\n".join(["Area (nm^2);Pressure (mN/m)", *lines]) + "\n")
    return path


@pytest.fixture
def export(tmp_path: Path) -> Path:
    return write_export(tmp_path / "run.txt")


def test_one_trace_gives_one_object_with_settings_and_versions(
    export: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    before = export.read_bytes()
    assert run(["isotherm", str(export), "--json", "-", "--at", "10,30"]) == 0
    captured = capsys.readouterr()
    payload = json.loads(captured.out)
    assert captured.err == ""
    assert payload["schema"] == "upstroke.isotherm/1"
    assert payload["settings"]["command"] == "isotherm"
    assert payload["settings"]["at"] == [10, 30]
    assert payload["settings"]["sheet"] is None
    assert set(payload["versions"]) >= {"upstroke", "python", "numpy", "scipy", "pandas"}
    assert payload["source"]["sha256"] == hashlib.sha256(before).hexdigest()
    assert payload["source"]["columns"]["molecular_area"]["unit"] == "nm^2"
    (branch,) = payload["branches"]
    assert branch["direction"] == "compression"
    assert branch["collapse"]["kind"] == "constant-area"
    assert math.isclose(branch["collapse"]["area"]["value"], 0.195, rel_tol=0.01)
    assert [entry["pressure"] for entry in branch["area_at"]] == [10, 30]
    assert export.read_bytes() == before


def test_the_same_input_gives_the_same_bytes(export: Path, tmp_path: Path) -> None:
    outputs = []
    for name in ("a", "b"):
        argv = ["isotherm", str(export), "--json", str(tmp_path / f"{name}.json")]
        argv += ["--csv", str(tmp_path / f"{name}.csv"), "--figure", str(tmp_path / f"{name}.svg")]
        assert run(argv) == 0
        outputs.append([(tmp_path / f"{name}.{s}").read_bytes() for s in ("json", "csv", "svg")])
    assert outputs[0] == outputs[1]


def test_several_traces_give_a_list_in_their_order(
    export: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    other = write_export(tmp_path / "other.txt", seed=2)
    assert run(["isotherm", str(other), str(export), "--json", "-"]) == 0
    payload = json.loads(capsys.readouterr().out)
    assert [one["source"]["path"] for one in payload] == [str(other), str(export)]


def test_a_bad_trace_among_good_ones_ends_the_run_or_is_left_out(
    export: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    missing = tmp_path / "missing.txt"
    out = tmp_path / "out.json"
    argv = ["isotherm", str(export), str(missing), str(export), "--json", str(out)]
    assert run(argv) == 1
    assert "missing.txt" in capsys.readouterr().err
    assert not out.exists()
    assert run([*argv, "--keep-going"]) == 1
    captured = capsys.readouterr()
    assert captured.err.count("\n") == 1
    assert "missing.txt" in captured.err
    assert len(json.loads(out.read_text())) == 2


def test_a_column_option_overrules_the_header(
    export: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    argv = ["isotherm", str(export), "--json", "-"]
    argv += ["--column", "molecular_area=1:nm^2", "--column", "pressure=Pressure (mN/m)"]
    assert run(argv) == 0
    payload = json.loads(capsys.readouterr().out)
    assert payload["source"]["columns"]["molecular_area"]["index"] == 1
    assert payload["settings"]["columns"] == ["molecular_area=1:nm^2", "pressure=Pressure (mN/m)"]


@pytest.mark.parametrize(
    "options",
    [
        ["--at", "10,x"],
        ["--at", "nan"],
        ["--column", "area"],
        ["--column", "weight=1"],
        ["--column", "area="],
        ["--figure", "out.bmp"],
        ["--csv", "-"],
    ],
)
def test_wrong_options_are_status_2(
    export: Path, options: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["isotherm", str(export), *options]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert options[0] in captured.err


def test_the_table_says_what_was_read_and_ends_with_warnings(
    export: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(["isotherm", str(export)]) == 0
    text = capsys.readouterr().out
    assert "Read 900 rows" in text
    assert "molecular area" in text
    assert max(len(line) for line in text.splitlines() if str(export) not in line) <= 80


BAD = {
    "missing": None,
    "empty": b"",
    "binary": bytes(range(256)) * 40,
    "words": b"nothing here\nbut words\n",
    "one column": b"area (nm^2)\n" + b"0.3\n" * 50,
    "constant pressure": b"area (nm^2),pressure (mN/m)\n"
    + b"".join(b"%.3f,5.0\n" % (0.5 - 0.001 * n) for n in range(300)),
    "constant area": b"area (nm^2),pressure (mN/m)\n"
    + b"".join(b"0.3,%.2f\n" % (0.01 * n) for n in range(300)),
    "three points": b"area (nm^2),pressure (mN/m)\n0.3,1\n0.25,10\n0.2,30\n",
}


@pytest.mark.parametrize("case", BAD)
def test_bad_input_is_one_clear_line_and_nothing_is_written(
    case: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "bad.txt"
    if BAD[case] is not None:
        path.write_bytes(BAD[case])
    assert run(["isotherm", str(path), "--json", str(tmp_path / "out.json")]) == 1
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith("upstroke: ")
    assert captured.err.count("\n") == 1
    assert "bad.txt" in captured.err
    assert "unexpected" not in captured.err
    assert not (tmp_path / "out.json").exists()


def test_a_directory_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["isotherm", str(tmp_path)]) == 1
    assert capsys.readouterr().err.startswith("upstroke: ")


def test_a_folder_gives_its_exports_by_name_the_same_at_any_number_of_jobs(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "runs"
    folder.mkdir()
    for number in (3, 1, 2):
        write_export(folder / f"run{number}.txt", seed=number, rows=400)
    (folder / "notes.md").write_text("not an export")
    said = []
    for jobs in ("1", "2"):
        assert run(["isotherm", str(folder), "--json", "-", "--jobs", jobs]) == 0
        said.append(capsys.readouterr().out)
    assert said[0] == said[1]
    paths = [one["source"]["path"] for one in json.loads(said[0])]
    assert paths == [str(folder / f"run{number}.txt") for number in (1, 2, 3)]


def test_an_empty_folder_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["isotherm", str(tmp_path)]) == 1
    assert "holds no export" in capsys.readouterr().err


def test_a_trace_without_any_noise_is_analysed(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "smooth.csv"
    rows = [f"{0.4 - 0.0002 * n:.4f},{0.05 * n:.3f}" for n in range(800)]
    path.write_text("Area (nm^2),Pressure (mN/m)\n" + "\n".join(rows) + "\n")
    assert run(["isotherm", str(path), "--json", "-"]) == 0
    (branch,) = json.loads(capsys.readouterr().out)["branches"]
    assert branch["transitions"] == []
    assert branch["collapse"] is None
