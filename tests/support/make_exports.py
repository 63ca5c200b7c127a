"""Write the example exports under tests/data/exports: one invented run in every dress the reader must know.

Run as a script to write the files again. Every file in `good` holds the run of `invented_run` (or says in
`good/partial.txt` which rows it lacks); every file in `bad` is refused with the words in `bad/expected.toml`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

__all__ = ["EXPORTS", "InventedRun", "invented_run", "main"]

EXPORTS = Path(__file__).resolve().parent.parent / "data" / "exports"


@dataclass(frozen=True)
class InventedRun:
    """time s, area cm^2, molecular_area nm^2, pressure mN/m, temperature degC; each (40,)."""

    time: NDArray[np.float64]
    area: NDArray[np.float64]
    molecular_area: NDArray[np.float64]
    pressure: NDArray[np.float64]
    temperature: NDArray[np.float64]


def invented_run() -> InventedRun:
    """A compression of a film nobody spread: 40 rows, rounded as an instrument would."""
    time = np.arange(40) * 15.0
    area = np.round(240.0 - 4.5 * np.arange(40) + 0.03 * np.sin(np.arange(40)), 2)
    molecular = np.round(area / 240.0 * 0.80, 4)
    pressure = np.round(45.0 / (1.0 + np.exp((area - 110.0) / 14.0)) + 0.05, 2)
    temperature = np.round(20.0 + 0.05 * np.cos(np.arange(40) / 7.0), 1)
    return InventedRun(time, area, molecular, pressure, temperature)


def _rows(
    columns: Iterable[Iterable[object]],
    delimiter: str,
    *,
    decimal: str = ".",
    end: str = "\n",
    tail: str = "",
) -> str:
    lines = []
    for row in zip(*columns, strict=True):
        cells = [
            str(cell).replace(".", decimal) if not isinstance(cell, str) else cell for cell in row
        ]
        lines.append(delimiter.join(cells) + tail)
    return end.join(lines) + end


def _listed(*columns: NDArray[np.float64]) -> list[list[float]]:
    return [column.tolist() for column in columns]


def _texts() -> dict[str, bytes]:
    """Every good text export by file name."""
    run = invented_run()
    three = _listed(run.time, run.area, run.pressure)
    two = _listed(run.area, run.pressure)
    molecule = _listed(run.molecular_area * 100.0, run.pressure)
    molecule[0] = [round(value, 2) for value in molecule[0]]
    clock = [
        f"{9 + int(t) // 3600:02d}:{int(t) % 3600 // 60:02d}:{int(t) % 60:02d}" for t in run.time
    ]
    files: dict[str, str] = {}
    files["comma.csv"] = "Time (s),Trough area (cm^2),Surface pressure (mN/m)\n" + _rows(three, ",")
    files["comma_spaces.csv"] = "Time [s], Area [cm²], Pressure [mN/m]\n" + _rows(three, ", ")
    files["semicolon_comma.csv"] = "Zeit (s);Fläche (cm²);Oberflächendruck (mN/m)\n" + _rows(
        three, ";", decimal=","
    )
    files["tab.txt"] = "t / s\tA / cm^2\tπ / mN m^-1\n" + _rows(three, "\t")
    files["tab_comma.txt"] = "Temps (s)\tSurface (cm²)\tPression de surface (mN/m)\n" + _rows(
        three, "\t", decimal=","
    )
    files["blanks.dat"] = "time(s)  trough area(cm2)  pressure(dyn/cm)\n" + _rows(three, "   ")
    files["blanks_units_line.dat"] = (
        "  Time    Area    Pressure\n   s      cm^2     mN/m\n" + _rows(three, "  ")
    )
    files["blanks_single.dat"] = "Time s Area cm^2 Pressure mN/m\n" + _rows(three, " ")
    files["two_lines.csv"] = "Time;Area;Surface pressure\n[s];[cm^2];[mN/m]\n" + _rows(three, ";")
    files["three_lines.csv"] = "Time\tArea\tPi\ns\tcm^2\tmN/m\nrun 1\trun 1\trun 1\n" + _rows(
        three, "\t"
    )
    files["comma_in_header.csv"] = "Area, cm^2;Pressure, mN/m\n" + _rows(two, ";")
    files["comma_split_units.csv"] = "Area, cm^2, Pressure, mN/m\n" + _rows(two, ",")
    files["underscores.csv"] = "time_s,area_cm2,pressure_mN_per_m\n" + _rows(three, ",")
    files["camel.csv"] = "ElapsedTime(s),TroughArea(cm2),SurfacePressure(mN/m)\n" + _rows(
        three, ","
    )
    files["upper.csv"] = "TIME (SEC),AREA (CM2),SURFACE PRESSURE (MN/M)\n" + _rows(three, ",")
    files["quoted.csv"] = '"Time (s)","Area (cm²)","Pressure (mN/m)"\n' + "".join(
        f'"{t}","{a}","{p}"\n' for t, a, p in zip(*three, strict=True)
    )
    files["quoted_comma.csv"] = '"Time (s)","Area (cm²)","Pressure (mN/m)"\n' + "".join(
        f'"{t}","{a}","{p}"\n'.replace(".", ",") for t, a, p in zip(*three, strict=True)
    )
    files["preamble.txt"] = (
        "Trough run, invented\nOperator: nobody\nBarrier speed: 10 mm/min\nDate: 2031-05-06\nSteps 1 2 3\n\n"
        "Max area 243 cm2\nMin area 60 cm2\nTarget pressure 30 mN/m\n\n"
        "Time (s)\tArea (cm²)\tPressure (mN/m)\n" + _rows(three, "\t")
    )
    files["preamble_table.csv"] = (
        "probe;plate\nwidth;19,62\nperimeter;39,24\ncalibration 1;0,51\n\nZeit;Fläche;Druck\ns;cm²;mN/m\n"
        + _rows(three, ";", decimal=",")
    )
    files["preamble_numbers.txt"] = (
        "Calibration\n1 0.5 0.2\n2 0.7 0.1\n3 0.9 0.4\n\nTime (s)  Area (cm^2)  Pressure (mN/m)\n"
        + _rows(three, "  ")
    )
    files["preamble_long.txt"] = (
        "".join(f"note {i}: nothing happened, 12 readings, 3 alarms\n" for i in range(3000))
        + "Time (s),Area (cm^2),Pressure (mN/m)\n"
        + _rows(three, ",")
    )
    files["comment_header.dat"] = "# invented run\n# time(s) area(cm^2) pressure(mN/m)\n" + _rows(
        three, " "
    )
    files["percent_header.dat"] = "% Area (cm^2), Pressure (mN/m)\n" + _rows(two, ",")
    files["dashes.txt"] = (
        "Time (s) | Area (cm2) | Pressure (mN/m)\n---------+------------+------\n"
        + _rows(three, " | ")
    )
    files["molecular.csv"] = "Area per molecule (Å²),Surface pressure (mN/m)\n" + _rows(
        molecule, ","
    )
    files["molecular_ascii.csv"] = "Mma [A^2/molecule];Pi [mN/m]\n" + _rows(
        molecule, ";", decimal=","
    )
    files["molecular_nm.txt"] = "A (nm2)\tΠ (N/m)\n" + _rows(
        _listed(run.molecular_area, np.round(run.pressure / 1000.0, 6)), "\t"
    )
    files["molecular_reversed.csv"] = "APL (Å^2),pi (mN/m)\n" + _rows(
        [column[::-1] for column in molecule], ","
    )
    files["free_text.csv"] = (
        "# Invented film. APL in Å², π in mN/m. Points off a figure.\n" + _rows(molecule, ",")
    )
    files["trailing.csv"] = "Time (s);Area (cm^2);Pressure (mN/m);\n" + _rows(three, ";", tail=";")
    files["trailing_rows.csv"] = "Time (s);Area (cm^2);Pressure (mN/m)\n" + _rows(
        three, ";", tail=";"
    )
    files["blank_lines.csv"] = "\n\nTime (s),Area (cm^2),Pressure (mN/m)\n\n" + _rows(
        three, ",", end="\n\n"
    )
    header = "Time (s),Area (cm^2),Pressure (mN/m)\n"
    lines = _rows(three, ",").splitlines(keepends=True)
    files["repeated_header.csv"] = header + header.join(
        "".join(lines[i : i + 10]) for i in range(0, 40, 10)
    )
    files["footer.csv"] = header + "".join(lines) + "\nEnd of run\nMean;3;4\nChecksum: 1234\n"
    files["footer_statistics.txt"] = (
        header.replace(",", "\t")
        + _rows(three, "\t")
        + ("\nMean\t292.5\t152.25\nMax\t585\t240.0\n")
    )
    files["crlf.csv"] = (header + "".join(lines)).replace("\n", "\r\n")
    files["old_line_ends.csv"] = (header + "".join(lines)).replace("\n", "\r")
    files["no_last_newline.csv"] = (header + "".join(lines)).rstrip("\n")
    files["state_column.csv"] = "Time (s);State;Area (cm^2);Pressure (mN/m)\n" + _rows(
        [three[0], ["closing"] * 40, three[1], three[2]], ";"
    )
    files["more_columns.csv"] = (
        "Index,Time (min),Barrier speed (mm/min),Trough area (mm^2),Target pressure (mN/m),Surface pressure "
        "(mN/m),Air temperature (degC),Subphase temperature (K)\n"
        + _rows(
            [
                list(range(40)), (run.time / 60.0).tolist(), [10.0] * 40,
                np.round(run.area * 100.0, 1).tolist(),
                [30.0] * 40, three[2], [23.4] * 40, np.round(run.temperature + 273.15, 2).tolist(),
            ],
            ",",
        )
    )  # fmt: skip
    files["clock.csv"] = "Clock time;Area (cm^2);Pressure (mN/m)\n" + _rows(
        [clock, three[1], three[2]], ";", decimal=","
    )
    files["clock_date.csv"] = "Timestamp,Area (cm^2),Pressure (mN/m)\n" + _rows(
        [[f"2031-05-06T{c}" for c in clock], three[1], three[2]], ","
    )
    files["clock_german.txt"] = "Datum Uhrzeit\tFläche [cm²]\tDruck [mN/m]\n" + _rows(
        [[f"06.05.2031 {c}" for c in clock], three[1], three[2]], "\t", decimal=","
    )
    files["date_and_clock.csv"] = "Date,Time,Area (cm^2),Pressure (mN/m)\n" + _rows(
        [["2031-05-06"] * 40, clock, three[1], three[2]], ","
    )
    files["exponent.txt"] = "Area (m^2)\tPressure (mN/m)\n" + "".join(
        f"{a / 1e4:.6E}\t{p:.4E}\n" for a, p in zip(*two, strict=True)
    )
    files["thousands.txt"] = "Time (s)\tArea (mm^2)\tPressure (mN/m)\n" + "".join(
        f"{t}\t{a * 100:,.1f}\t{p}\n" for t, a, p in zip(*three, strict=True)
    )
    files["true_minus.csv"] = header + "".join(lines)
    files["no_unit_pressure.csv"] = "Time (s),Area (cm^2),Surface pressure\n" + "".join(lines)
    files["mojibake.csv"] = "Time (s),Area (cmÂ²),Surface pressure (mN/m)\n" + "".join(lines)
    files["per_mole.csv"] = "Molecular area (m^2/mol);Pressure (mN/m)\n" + "".join(
        f"{a * 1e-18 * 6.02214076e23:.6e};{p}\n"
        for a, p in zip(run.molecular_area.tolist(), two[1], strict=True)
    )
    files["shuffled.csv"] = header + "".join(
        lines[i] for i in np.random.default_rng(4).permutation(40).tolist()
    )
    files["wide_gap.txt"] = (
        "Time (s)        Surface Pressure (mN/m)    Trough Area (cm^2)\n"
        + _rows([three[0], three[2], three[1]], "\t\t".replace("\t", "      "))
    )
    files["rows_named.dat"] = '"Time (s)" "Area (cm^2)" "Pressure (mN/m)"\n' + "".join(
        f'"{i}" {t} {a} {p}\n' for i, (t, a, p) in enumerate(zip(*three, strict=True), 1)
    )
    files["rows_counted.csv"] = "Time (s),Area (cm^2),Pressure (mN/m)\n" + _rows(
        [list(range(40)), *three], ","
    )
    files["index_column.csv"] = ",Time (s),Area (cm^2),Pressure (mN/m)\n" + _rows(
        [list(range(40)), *three], ","
    )
    files["latex.csv"] = "$t$ (s),$A$ (\\AA$^2$),$\\Pi$ (mN m$^{-1}$)\n" + _rows(
        [three[0], *molecule], ","
    )
    files["dotted_names.csv"] = "Time.s,Area.cm2,Pressure.mN.m\n" + _rows(three, ",")
    files["markup.csv"] = "Area (Å<sup>2</sup>),Pressure (mN/m)\n" + _rows(molecule, ",")
    files["words_for_units.csv"] = (
        "Area per molecule (square ångström),Pressure (mN per m)\n" + _rows(molecule, ",")
    )
    out = {name: text.encode("utf-8") for name, text in files.items()}
    german = files["semicolon_comma.csv"]
    out["bom.csv"] = b"\xef\xbb\xbf" + german.encode("utf-8")
    out["utf16.csv"] = german.encode("utf-16")
    out["utf16_big_endian.csv"] = b"\xfe\xff" + german.encode("utf-16-be")
    out["utf16_no_mark.csv"] = german.encode("utf-16-le")
    out["latin1.csv"] = german.encode("latin-1")
    out["latin1_angstrom.csv"] = files["molecular.csv"].encode("latin-1")
    return out


def _partial() -> dict[str, bytes]:
    """Good exports that lack some rows of the run."""
    run = invented_run()
    three = _listed(run.time, run.area, run.pressure)
    lines = _rows(three, ",").splitlines()
    for row, cell in (
        (3, ""),
        (7, "-"),
        (11, "NaN"),
        (15, "n/a"),
        (19, "#N/A"),
        (23, "inf"),
        (27, "overload"),
    ):
        time, area, _ = lines[row].split(",")
        lines[row] = f"{time},{area},{cell}"
    header = "Time (s),Area (cm^2),Pressure (mN/m)\n"
    gaps = header + "\n".join(lines) + "\n"
    return {"missing.csv": gaps.encode(), "missing_semicolon.csv": gaps.replace(",", ";").encode()}


def _bad() -> dict[str, tuple[bytes, list[str]]]:
    """Every bad export: its bytes and words its refusal must have."""
    run = invented_run()
    three = _listed(run.time, run.area, run.pressure)
    two = _rows(_listed(run.area, run.pressure), ",")
    rows = _rows(three, ",")
    four = _rows([*three, three[2]], ",")
    molecule = _rows(_listed(run.molecular_area, run.pressure), ",")
    head = "Area per molecule (nm^2),Pressure (mN/m)\n"
    flat = _rows([[0.5] * 40, run.pressure.tolist()], ",")
    level = _rows([run.molecular_area.tolist(), [12.5] * 40], ",")
    negative = _rows([(run.molecular_area - 0.3).round(4).tolist(), run.pressure.tolist()], ",")
    texts: dict[str, tuple[str, list[str]]] = {
        "empty.csv": ("", ["empty"]),
        "only_blank.csv": ("\n  \n\n", ["empty"]),
        "prose.txt": ("There is nothing here\nbut words, and the year 2031.\n", ["no rows of numbers"]),
        "one_column.csv": ("Pressure (mN/m)\n" + "\n".join(map(str, three[2])) + "\n", ["one column"]),
        "no_header.csv": (two, ["no header", "[[columns]]", "index"]),
        "no_pressure.csv": ("Time (s),Area per molecule (nm^2)\n" + molecule, ["pressure", "[[columns]]"]),
        "no_area.csv": ("Time (s),Pressure (mN/m)\n" + two, ["area", "[[columns]]"]),
        "two_pressures.csv": (
            "Time (s),Area (cm^2),Pressure 1 (mN/m),Pressure 2 (mN/m)\n" + four,
            ["2 columns", "Pressure 1", "Pressure 2", "[[columns]]", 'role = "pressure"'],
        ),
        "two_areas.csv": (
            "Area (nm^2/molecule),Mean molecular area (nm^2),Pressure (mN/m)\n" + rows,
            ["2 columns", "molecular area", "[[columns]]"],
        ),
        "unknown_unit.csv": (
            "Area per molecule (nm^2),Pressure (furlong)\n" + molecule, ["unknown unit", "furlong"]
        ),
        "unknown_area_unit.csv": ("Area (acre),Pressure (mN/m)\n" + two, ["unknown unit", "acre"]),
        "no_area_unit.csv": ("Area,Pressure (mN/m)\n" + two, ["no unit", "[[columns]]", "unit ="]),
        "bulk_pressure.csv": ("Area per molecule (nm^2),Pressure (kPa)\n" + molecule, ["pressure"]),
        "no_amounts.csv": ("Area (cm^2),Pressure (mN/m)\n" + two, ["volume", "concentration", "molar_mass"]),
        "no_width.csv": ("Barrier position (mm),Pressure (mN/m)\n" + two, ["width"]),
        "tension_no_temperature.csv": (
            "Area per molecule (nm^2),Surface tension (mN/m)\n" + molecule,
            ["tension", "temperature"],
        ),
        "constant_area.csv": (head + flat, ["area is the same"]),
        "constant_pressure.csv": (head + level, ["pressure is the same"]),
        "negative_area.csv": (head + negative, ["not above zero", "line"]),
        "too_few.csv": (head + "\n".join(molecule.splitlines()[:7]) + "\n", ["7 usable rows", "at least 8"]),
        "all_missing.csv": (head + "\n".join(f"{a},-" for a in run.molecular_area) + "\n", ["0 usable rows"]),
        "columns_change.csv": (
            head + molecule + "Pressure (mN/m),Area per molecule (nm^2)\n" + molecule,
            ["columns change", "line 42"],
        ),
    }  # fmt: skip
    out = {name: (text.encode("utf-8"), words) for name, (text, words) in texts.items()}
    out["binary.dat"] = (bytes(range(256)) * 20, ["binary"])
    out["picture.csv"] = (b"\x89PNG\r\n\x1a\n" + bytes(200), ["picture"])
    out["old_workbook.xls"] = (
        b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600),
        ["old binary workbook"],
    )
    out["damaged.xlsx"] = (b"PK\x03\x04" + b"xl/workbook.xml" * 30, ["damaged workbook"])
    out["archive.csv"] = (b"PK\x03\x04" + bytes(100), ["archive"])
    out["compressed.csv"] = (b"\x1f\x8b\x08" + bytes(100), ["compressed"])
    return out


def _write(folder: Path, files: dict[str, bytes], log: Callable[[str], None]) -> None:
    folder.mkdir(parents=True, exist_ok=True)
    for name, data in files.items():
        (folder / name).write_bytes(data)
        log(f"{folder.name}/{name}")


def main(log: Callable[[str], None] = print) -> None:
    """Write every example file."""
    partial, bad = _partial(), _bad()
    _write(EXPORTS / "good", _texts(), log)
    _write(EXPORTS / "good", partial, log)
    (EXPORTS / "good" / "partial.txt").write_text("\n".join(partial) + "\n", encoding="utf-8")
    _write(EXPORTS / "bad", {name: data for name, (data, _) in bad.items()}, log)
    lines = [f'"{name}" = {[*words]!r}' for name, (_, words) in bad.items()]
    (EXPORTS / "bad" / "expected.toml").write_text("\n".join(lines) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
