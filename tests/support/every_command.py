"""Small runs for every command, with every file it can read, in names and words that would do harm."""

from __future__ import annotations

import contextlib
import csv
import io
import json
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from hostile_runs import Columns, seed_runs
from series_exports import temperature_sheet, write_run
from series_films import Lipid

from cli.main import run

__all__ = ["FORMULA", "MARKUP", "Invocation", "every_command"]

# A browser would run the one, a spreadsheet the other, and a figure would stumble over the third.
MARKUP = "</script><script>alert(1)</script><img src=x onerror=alert(2)>\" onmouseover='alert(3)'"
FORMULA = "=HYPERLINK(1)"
MATHS = r"$\frac{ ^_ \x$"
WORDS = f"{FORMULA} {MARKUP} {MATHS} \x1b[31m\u202e"


@dataclass(frozen=True)
class Invocation:
    """A command with its arguments but the outputs; files: all it reads; late: those named in other files."""

    argv: tuple[str, ...]
    files: tuple[Path, ...]
    late: tuple[Path, ...] = ()

    @property
    def command(self) -> str:
        """Name of the command."""
        return self.argv[0]


def _export(path: Path, columns: Columns) -> Path:
    """Write columns under headers that would do harm."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    names = [f"{FORMULA}{n}{MARKUP}{MATHS}" for n in range(len(columns))]
    writer.writerow(names)
    writer.writerows([f"{v:.7g}" for v in row] for row in zip(*columns.values(), strict=True))
    path.write_text(out.getvalue(), encoding="utf-8")
    return path


def _sheet(path: Path, text: str, roles: dict[str, str]) -> Path:
    """Write a sheet with a title and a film that would do harm, and which column holds what."""
    told = "".join(
        f'[[columns]]\nrole = "{role}"\nindex = {n}\nunit = "{unit}"\n'
        for n, (role, unit) in enumerate(roles.items(), 1)
    )
    text = text.replace('title = "Invented"', f"title = {json.dumps(WORDS)}")
    text = text.replace('name = "an acid"', f"name = {json.dumps(WORDS)}")
    path.write_text(text + told, encoding="utf-8")
    return path


def _evidence(folder: Path) -> tuple[Path, tuple[Path, ...]]:
    """Capacitance after 0, 2 and 4 layers, from raw voltammograms."""
    rng = np.random.default_rng(7)
    rows, raw = ["kind,label,layers,file,scan_rate,electrode_area,roughness,permittivity"], []
    up = np.linspace(0.0, 0.5, 100)
    for layers in (0, 2, 4):
        farads = 1.0 / (1.0 / 8e-7 + 5e6 * layers)
        current = 0.1 * farads * np.repeat([1.0, -1.0], 100) * (1 + 0.01 * rng.normal(size=200))
        path = folder / f"raw{layers}.csv"
        path.write_text(
            "potential (V);current (µA)\n"
            + "".join(f"{e:.4f};{i * 1e6:.6f}\n" for e, i in zip([*up, *up[::-1]], current, strict=True)),
            encoding="utf-8",
        )  # fmt: skip
        raw.append(path)
        label = '"' + WORDS.replace('"', '""') + '"'
        rows.append(f"interfacial_capacitance,{label},{layers},{path.name},0.1 V/s,"
                    "0.2 ± 0.002 cm^2,1.1 ± 0.02,2.6 ± 0.05")  # fmt: skip
    evidence = folder / "evidence.csv"
    evidence.write_text("\n".join(rows).replace("\x1b", "") + "\n", encoding="utf-8")
    return evidence, tuple(raw)


def _mixture_sheet(x: float) -> str:
    parts = {"a": 1.0 - x, MARKUP + FORMULA: x}
    return "".join(
        f'[[film.component]]\nname = {json.dumps(name)}\nmolar_mass = "700 g/mol"\nmole_fraction = {part}\n'
        for name, part in parts.items()
        if part > 0
    ) + '[subphase]\ntemperature = "22.0 ± 0.1 degC"\n'  # fmt: skip


def _written(argv: list[str], path: Path) -> Path:
    """A result written with --json, as another command takes it."""
    with contextlib.redirect_stdout(io.StringIO()):
        assert run([*argv, "--json", str(path)]) == 0
    return path


def every_command(folder: Path) -> dict[str, Invocation]:
    """Write runs for every command that reads any into `folder` and say how to call it.

    Returns
    -------
    dict
        By the command's name.
    """
    sound = {each.command: each for each in seed_runs()}
    sheet = sound["isotherm"].sheet
    three = {"time": "s", "area": "cm^2", "pressure": "mN/m"}
    log = {"time": "s", "dipper_position": "mm", "area": "cm^2", "pressure": "mN/m"}
    two = {"area": "cm^2", "pressure": "mN/m", "potential": "mV"}
    film_sheet = _sheet(folder / "film.toml", sheet, three)
    log_sheet = _sheet(folder / "log.toml", sheet, log)
    fluid_sheet = _sheet(folder / "fluid.toml", sheet, two)
    film = _export(folder / f"{FORMULA}<img src=x onerror=alert(4)>.csv", sound["isotherm"].columns)
    held = _export(folder / "held.csv", sound["hold"].columns)
    bare = _export(folder / "bare.csv", sound["check"].columns)
    build = _export(folder / "build.csv", sound["transfer"].columns)
    waves = _export(folder / "waves.csv", sound["oscillation"].columns)
    loops = _export(folder / "loops.csv", sound["cycles"].columns)
    vapour = _export(folder / "fluid.csv", sound["fluid"].columns)
    known = folder / "known.csv"  # the trace's columns say nothing of the hold's
    known.write_text(sound["hold"].text(), encoding="utf-8")
    evidence, raw = _evidence(folder)
    common = ["-s", str(film_sheet)]
    checked = _written(["check", str(bare), *common], folder / "check.json")
    plan = _written(["target", str(film), *common], folder / "plan.json")
    done = _written(["isotherm", str(film), *common], folder / "film.json")
    own = ["--isotherm", str(film), "--isotherm-sheet", str(film_sheet)]

    def call(
        name: str, files: list[Path], *more: object, late: tuple[Path, ...] = ()
    ) -> Invocation:
        words = tuple(str(word) for word in (*files, *more))
        read = [*files, *(word for word in map(Path, words) if word.is_file())]
        return Invocation((name, *words), tuple(dict.fromkeys(read)), late)

    calls = [
        call("check", [bare], *common),
        call("isotherm", [film], *common),
        call("hold", [held], *common, "--check", checked),
        call("cycles", [loops], *common, "--check", checked),
        call("fluid", [vapour], "-s", fluid_sheet),
        call("potential", [vapour], "-s", fluid_sheet),
        call("oscillation", [waves], *common, *own),
        call("target", [film], *common, "--hold", known, "--check", checked),
        call("transfer", [build], "-s", log_sheet, *own),
        call("audit", [build], "-s", log_sheet, *own, "-e", evidence, "--plan", plan, late=raw),
        call("report", [done], "--title", WORDS, late=(film, film_sheet)),
    ]
    return {each.command: each for each in calls} | _series(folder)


def _series(folder: Path) -> dict[str, Invocation]:
    """Write the runs of the commands that take several, each run with a sheet of its own."""
    calls = {}
    for command in ("batch", "replicates", "mixture", "temperature"):
        home = folder / command
        home.mkdir()
        traces = []
        for n in range(3):
            name, t = f"{FORMULA}{n}<img src=x onerror=alert(5)>", 15 + 5 * n
            film, text, shrink = Lipid(), f"title = {json.dumps(WORDS)}\n", 0.0
            if command == "mixture":
                film = Lipid(omega=0.40 - 0.02 * n, transition=None, collapse=50.0)
                text, shrink = _mixture_sheet(n / 2.0), (0.0, 0.015, 0.0)[n]
            elif command == "temperature":
                film = Lipid(
                    transition=5 + 1.3 * (t - 15), gap=0.2 - 0.006 * (t - 15), kelvin=273.15 + t
                )
                text = temperature_sheet(t)
            traces.append(
                write_run(home, name, film, sheet=text, seed=n, rows=500, shrink=shrink, scale=1 + n / 500)
            )  # fmt: skip
        files = (*traces, *(trace.with_suffix(".toml") for trace in traces))
        calls[command] = Invocation((command, *(str(trace) for trace in traces)), files)
    return calls
