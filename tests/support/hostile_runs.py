"""Small runs of every kind, and ways to damage them, to try what breaks a whole command."""

from __future__ import annotations

import random
from dataclasses import dataclass, replace

import numpy as np
from series_films import Lipid

__all__ = ["Run", "damaged", "scrambled", "seed_runs"]

Columns = dict[str, list[float]]
_TIME, _AREA, _PRESSURE = "Time (s)", "Area (cm^2)", "Pressure (mN/m)"

_SHEET = """\
title = "Invented"
[film]
name = "an acid"
molar_mass = "284.48 g/mol"
concentration = "1.00 ± 0.01 mg/mL"
volume = "25.0 ± 0.2 µL"
[subphase]
liquid = "water"
temperature = "20.0 ± 0.2 degC"
[trough]
smallest_area = "60 cm^2"
largest_area = "240 cm^2"
area_uncertainty = "0.3 cm^2"
pressure_uncertainty = "0.1 mN/m"
width = "75 mm"
[substrate]
shape = "plate"
width = "20.0 ± 0.1 mm"
thickness = "1.00 ± 0.02 mm"
[dipping]
pressure = "30 mN/m"
tolerance = "0.2 mN/m"
stroke_length = "20 mm"
speed = "12 mm/min"
dwell_top = "60 s"
dwell_bottom = "20 s"
position_reads = "depth"
surface_at = "5.00 ± 0.05 mm"
modulus = "200 ± 10 mN/m"
[stack]
layers = 4
type = "Y"
first_stroke = "up"
accept = [0.95, 1.05]
layer_thickness = "2.5 ± 0.05 nm"
[target]
phase = "solid"
collapse_margin = "5 mN/m"
guard_band = "2 mN/m"
packing_error = "0.5 %"
loss = "5 %"
"""

_EVIDENCE = """\
[absorbance]
label = "a dye"
points = [
  {layers = 0, value = "0.002 ± 0.001"},
  {layers = 2, value = "0.012 ± 0.001"},
  {layers = 4, value = "0.022 ± 0.001"},
]
[interfacial_capacitance]
permittivity = "2.6 ± 0.05"
electrode_area = "0.500 ± 0.005 cm^2"
points = [
  {stroke = 1, value = "0.460 ± 0.005 µF"},
  {stroke = 2, value = "0.230 ± 0.003 µF"},
  {stroke = 4, value = "0.115 ± 0.001 µF"},
]
[resonator_frequency]
crystal_frequency = "5 MHz"
points = [
  {stroke = 0, value = "0 ± 1 Hz"},
  {stroke = 2, value = "-26 ± 1 Hz"},
  {stroke = 4, value = "-52 ± 1 Hz"},
]
"""

# What instruments, spreadsheets and people leave in a column of numbers.
_ODD = (
    0.0, -0.0, -1.0, 1.0, 1e-300, -1e-300, 1e-12, 1e6, 1e12, -1e12, 1e150, 1e300, -1e300,
    99.99, -999.0, 1e30, 9.96921e36, 3.4028235e38, float("nan"),
)  # fmt: skip
_WORDS = (
    "plate", "rod", "up", "down", "depth", "height", "X", "Y", "Z", "solid", "water", "none", "",
    "nan", "inf", "-1", "0", "1e308", "1e-308", "[film]", "[dipping]", "= ", '"', "±", "mm", "nm",
    "mN/m", "degC", "%", "{", "}", "[", "]", "points", "layers", "stroke", "\n", "#", ",", "10000",
)  # fmt: skip


@dataclass(frozen=True)
class Run:
    """A command, its data as columns, its run sheet, and evidence where it takes any.

    others : exports and sheets of further runs, which stay as they are.
    """

    command: str
    columns: Columns
    sheet: str
    evidence: str = ""
    others: tuple[tuple[str, str], ...] = ()

    def text(self, separator: str = ",", line: str = "\n") -> str:
        """Return the export."""
        rows = [separator.join(self.columns)]
        rows += [
            separator.join("" if v != v else f"{v:.6g}" for v in row)
            for row in zip(*self.columns.values(), strict=True)
        ]
        return line.join(rows) + line


def _isotherm() -> Columns:
    random_ = np.random.default_rng(3)
    area = np.concatenate([np.linspace(240.0, 62.0, 110), np.linspace(62.0, 200.0, 40)])
    x = area / 529.0
    pressure = np.maximum(0.0, 500.0 * (0.25 - x)) + np.maximum(0.0, 3500.0 * (0.20 - x))
    pressure = np.minimum(pressure, 55.0) + random_.normal(0.0, 0.05, area.size)
    return {
        "Time (s)": (np.arange(area.size) * 4.0).tolist(),
        "Area (cm^2)": area.tolist(),
        "Pressure (mN/m)": pressure.tolist(),
    }


def _log() -> Columns:
    random_ = np.random.default_rng(4)
    time, position = [0.0], [25.0]
    for before, after in ((25.0, 2.0), (2.0, 25.0), (25.0, 2.0), (2.0, 25.0)):
        time += [time[-1] + 120.0, time[-1] + 120.0 + abs(after - before) / 0.2]
        position += [before, after]
    time, position = [*time, time[-1] + 100.0], [*position, position[-1]]
    grid = np.arange(0.0, time[-1], 3.0)
    depth = np.interp(grid, time, position)
    wet = 0.42 * np.clip(depth - 5.0, 0.0, None)
    taken = np.cumsum(np.abs(np.diff(wet, prepend=wet[0])))
    return {
        "Time (s)": grid.tolist(),
        "Dipper position (mm)": depth.tolist(),
        "Trough area (cm^2)": (200.0 - taken + random_.normal(0, 0.01, grid.size)).tolist(),
        "Surface pressure (mN/m)": (30.0 + random_.normal(0, 0.03, grid.size)).tolist(),
    }


def _hold() -> Columns:
    random_ = np.random.default_rng(5)
    time = np.arange(150) * 10.0
    area = 110.0 * (1.0 - 4e-4 * np.sqrt(time)) + random_.normal(0.0, 0.02, time.size)
    return {
        "t (s)": time.tolist(),
        "A (cm^2)": area.tolist(),
        "Pressure (mN/m)": (30.0 + random_.normal(0.0, 0.05, time.size)).tolist(),
    }


def _bare() -> Columns:
    random_ = np.random.default_rng(6)
    area = np.linspace(240.0, 60.0, 90)
    return {
        "Time (s)": (np.arange(area.size) * 5.0).tolist(),
        "Area (cm^2)": area.tolist(),
        "Pressure (mN/m)": (0.1 + random_.normal(0.0, 0.03, area.size)).tolist(),
    }


def _waves() -> Columns:
    rng = np.random.default_rng(3)
    t = np.arange(0.0, 400.0, 1.0)
    angle = 2.0 * np.pi * 0.03 * t
    area = 211.6 * np.exp(0.01 * np.sin(angle)) + rng.normal(0.0, 0.01, t.size)
    pressure = 30.0 - np.sin(angle + 0.2) + rng.normal(0.0, 0.03, t.size)
    return {_TIME: t.tolist(), _AREA: area.tolist(), _PRESSURE: pressure.tolist()}


def _loops() -> Columns:
    rng = np.random.default_rng(4)
    down = np.linspace(0.45, 0.21, 200)
    area = np.concatenate([down, down[::-1], down, down[::-1]])
    lag = np.concatenate([np.zeros(200), np.full(200, 0.004)] * 2)
    pressure = np.interp(area + lag, [0.20, 0.215, 0.25, 0.50], [50.0, 26.0, 0.2, 0.0])
    pressure += rng.normal(0.0, 0.03, area.size)
    time = np.arange(area.size) * 2.0
    return {_TIME: time.tolist(), _AREA: (area * 529.0).tolist(), _PRESSURE: pressure.tolist()}


def _fluid() -> Columns:
    rng = np.random.default_rng(1)
    area = np.linspace(1.2, 0.45, 400)
    pressure = np.clip(4.075 / (area - 0.40) - 7.0, 0.0, None) + rng.normal(0.0, 0.03, area.size)
    potential = np.where(area < 1.0, 320.0 - 300.0 * area, 20.0) + rng.normal(0.0, 2.0, area.size)
    return {
        _AREA: (area * 529.0).tolist(),
        _PRESSURE: pressure.tolist(),
        "Surface potential (mV)": potential.tolist(),
    }


def _lipid(film: Lipid, *, seed: int, shrink: float = 0.0) -> Columns:
    """A film with a coexistence, in area per molecule."""
    rng = np.random.default_rng(seed)
    top = film.collapse if film.collapse is not None else film.last
    pressure = np.linspace(0.0, top, 5000)
    area = np.asarray(film.area(pressure)) - shrink
    grid = np.linspace(area[0] * 1.25, area[-1] * 0.985, 250)
    value = np.interp(-grid, -area, pressure, left=0.0, right=top) + rng.normal(0.0, 0.03, 250)
    return {"Area (nm^2)": grid.tolist(), _PRESSURE: value.tolist()}


def _series(command: str) -> Run:
    """Three runs, each with a sheet of its own; the first is the one that will be damaged."""
    runs = []
    for n in range(3):
        film, shrink, sheet = Lipid(), 0.002 * n, _SHEET
        if command == "mixture":
            film = Lipid(omega=0.40 - 0.02 * n, transition=None, collapse=50.0)
            shrink, x = (0.0, 0.015, 0.0)[n], 0.5 * n
            sheet = "".join(
                f'[[film.component]]\nname = "{name}"\nmolar_mass = "700 g/mol"\nmole_fraction = {part}\n'
                for name, part in (("a", 1.0 - x), ("b", x))
                if part > 0
            )
            sheet += '[subphase]\ntemperature = "22.0 ± 0.1 degC"\n'
        elif command == "temperature":
            t = 15 + 5 * n
            film = Lipid(
                transition=5 + 1.3 * (t - 15), gap=0.2 - 0.006 * (t - 15), kelvin=273.15 + t
            )
            sheet = f'[subphase]\ntemperature = "{t} ± 0.1 degC"\n'
        runs.append((_lipid(film, seed=n, shrink=shrink), sheet))
    first, sheet = runs[0]
    others = tuple((Run("", columns, "").text(), own) for columns, own in runs[1:])
    return Run(command, first, sheet, others=others)


def seed_runs() -> list[Run]:
    """One sound run for each command that analyses any; evidence is a second one for the audit's."""
    return [
        Run("isotherm", _isotherm(), _SHEET),
        Run("target", _isotherm(), _SHEET),
        Run("transfer", _log(), _SHEET),
        Run("hold", _hold(), _SHEET),
        Run("check", _bare(), _SHEET),
        Run("evidence", _log(), _SHEET, _EVIDENCE),
        Run("audit", _log(), _SHEET, _EVIDENCE),
        Run("cycles", _loops(), _SHEET),
        Run("oscillation", _waves(), _SHEET),
        Run("fluid", _fluid(), _SHEET),
        Run("potential", _fluid(), _SHEET),
        *(_series(command) for command in ("batch", "replicates", "mixture", "temperature")),
    ]


def _twist(values: list[float], rng: random.Random) -> list[float]:
    """One column, damaged as a whole or in places."""
    out = list(values)
    size = max(len(out), 1)
    act = rng.randrange(13)
    first = rng.randrange(size)
    last = min(size, first + rng.choice((1, 2, 10, size)))
    odd = rng.choice(_ODD)
    if act == 0:
        out[first:last] = [odd] * len(out[first:last])
    elif act == 1:
        out = out[::-1]
    elif act == 2:
        factor = rng.choice((1e-9, 1e-3, 0.1, -1.0, 10.0, 1e3, 1e9, 1e200))
        out = [v * factor for v in out]
    elif act == 3:
        shift = rng.choice((-1e9, -100.0, -30.0, 1e-3, 30.0, 100.0, 1e9))
        out = [v + shift for v in out]
    elif act == 4:
        step = rng.choice((0.1, 1.0, 10.0, 100.0))
        out = [round(v / step) * step if abs(v) < 1e200 else v for v in out]
    elif act == 5:
        rng.shuffle(out)
    elif act == 6:
        spread = 10.0 ** rng.uniform(-4, 4)
        out = [v + rng.gauss(0.0, spread) for v in out]
    elif act == 7:
        out = [out[first]] * size if out else out
    elif act == 8:
        for _ in range(rng.randint(1, 8)):
            out[rng.randrange(size)] = rng.choice(_ODD)
    elif act == 9:
        out = sorted(out, reverse=rng.random() < 0.5)
    elif act == 10:
        jump = rng.choice((-50.0, -1.0, 1.0, 50.0))
        out = out[:first] + [v + jump for v in out[first:]]
    elif act == 11:
        middle = sorted(out)[size // 2] if out else 0.0
        out = [2.0 * middle - v for v in out]
    else:
        out = [rng.uniform(0.0, 100.0) for _ in out]
    return out


def _cut(columns: Columns, rng: random.Random) -> Columns:
    """Rows left out, doubled, or run on."""
    size = len(next(iter(columns.values())))
    rows = list(range(size))
    act = rng.randrange(6)
    if act == 0:
        rows = rows[: rng.randint(0, size)]
    elif act == 1:
        rows = rows[rng.randint(0, max(size - 1, 0)) :]
    elif act == 2:
        rows = rows[:: rng.randint(2, 40)]
    elif act == 3:
        rows = sorted(rows * 2)
    elif act == 4:
        rows = rows + rows[::-1]
    else:
        rows = sorted(rng.sample(rows, rng.randint(0, size)))
    return {name: [values[row] for row in rows] for name, values in columns.items()}


def scrambled(text: str, rng: random.Random) -> str:
    """A run sheet, or evidence, with a few words or numbers replaced."""
    for _ in range(rng.randint(1, 4)):
        at = rng.randint(0, len(text))
        size = rng.choice((0, 1, 1, 3, 10, 60))
        act = rng.randrange(4)
        if act == 0:
            lines = text.split("\n")
            del lines[rng.randrange(len(lines))]
            text = "\n".join(lines)
        elif act == 1:
            digits = [i for i, c in enumerate(text) if c.isdigit()]
            if digits:
                at = rng.choice(digits)
                text = text[:at] + rng.choice(("0", "9", "-1", "e9", "1e-9", ".")) + text[at + 1 :]
        else:
            text = text[:at] + rng.choice(_WORDS) + text[at + size :]
    return text


def damaged(run: Run, rng: random.Random) -> Run:
    """Return the run with its columns, rows, sheet or evidence damaged; the frame mostly stays whole."""
    columns, sheet, evidence = run.columns, run.sheet, run.evidence
    choice = rng.random()
    if evidence and choice < 0.7:
        return replace(run, evidence=scrambled(evidence, rng))
    if choice < 0.25:
        sheet = scrambled(sheet, rng)
    if choice > 0.15:
        columns = dict(columns)
        for _ in range(rng.choice((0, 1, 1, 2, 3))):
            name = rng.choice(list(columns))
            columns[name] = _twist(columns[name], rng)
        if rng.random() < 0.5:
            columns = _cut(columns, rng)
    return replace(run, columns=columns, sheet=sheet)
