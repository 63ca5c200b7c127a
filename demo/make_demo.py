"""Make the demonstration's files. The film, the trough, the people and every run are invented.

Run from the project's top directory: python demo/make_demo.py [FOLDER]
The same files come out on every machine: each run has its own fixed seed.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

HERE = Path(__file__).resolve().parent
MARK = "Invented run for demonstration: no such film was ever spread"

MOLECULES = 6.02214076e23 * 25e-6 * 1.00 / 284.48  # 25 µL of 1.00 mg/mL (g/L), 284.48 g/mol
NM2_PER_CM2 = 1e14

# area per molecule (nm^2) and pressure (mN/m) of the invented film's corners, chosen by hand
CORNERS = ((0.46, 0.0), (0.2445, 0.15), (0.2065, 24.6), (0.1915, 54.0), (0.1795, 47.5))
ROUNDING = 0.0006  # nm^2, width over which the corners are rounded


def film_pressure(area: np.ndarray) -> np.ndarray:
    """Return the invented film's pressure (mN/m) at each area (nm^2): straight stretches, rounded."""
    corner_area, corner_pressure = (np.array(c)[::-1] for c in zip(*CORNERS, strict=True))
    fine = np.linspace(0.17, 0.47, 30001)
    sharp = np.interp(fine, corner_area, corner_pressure)
    step = fine[1] - fine[0]
    kernel = np.exp(-0.5 * (np.arange(-400, 401) * step / ROUNDING) ** 2)
    padded = np.pad(sharp, 400, mode="edge")
    return np.interp(area, fine, np.convolve(padded, kernel / kernel.sum(), mode="valid"))


def film_area(pressure: float) -> float:
    """Return the area (nm^2) at which the invented film has a pressure (mN/m) on the way in."""
    grid = np.linspace(0.1916, 0.2445, 20001)
    return float(np.interp(-pressure, -film_pressure(grid), grid))


def compression(seed: int, rows: int, offset: float, to_cm2: float) -> tuple[np.ndarray, ...]:
    """Return time (s), trough area (cm^2), pressure (mN/m) and temperature (degC) of a compression."""
    rng = np.random.default_rng(seed)
    time = np.linspace(0.0, 1450.0 * (240.0 - to_cm2) / 145.0, rows)
    trough = np.linspace(240.0, to_cm2, rows) + rng.normal(0.0, 0.01, rows)
    pressure = film_pressure(trough * NM2_PER_CM2 / MOLECULES) + offset
    pressure = pressure + rng.normal(0.0, 0.05, rows)
    return time, trough, pressure, 20.0 + 0.05 * np.sin(time / 300.0)


def table(columns: Iterable[np.ndarray], forms: Iterable[str], between: str) -> list[str]:
    """Return rows of text: one form a column."""
    row = between.join(forms)
    return [row.format(*values) for values in zip(*columns, strict=True)]


def with_commas(lines: list[str]) -> list[str]:
    """Write decimal commas."""
    return [line.replace(".", ",") for line in lines]


# --- before the film ---------------------------------------------------------------------------


def bare(seed: int, offset: float) -> list[str]:
    """A bare subphase: closed, then held still for half an hour. Comma-separated."""
    rng = np.random.default_rng(seed)
    closing = np.linspace(240.0, 60.0, 900)
    area = np.concatenate([closing, np.full(1800, 60.0)])
    time = np.arange(area.size) * 1.0
    pressure = offset + 0.05 * (240.0 - area) / 180.0 + 1e-5 * time
    pressure = pressure + rng.normal(0.0, 0.03, area.size)
    head = [f"# {MARK}", "time (s),trough area (cm^2),surface pressure (mN/m)"]
    return head + table((time, area, pressure), ("{:.0f}", "{:.2f}", "{:.3f}"), ",")


# --- isotherms ---------------------------------------------------------------------------------


def first_isotherm() -> list[str]:
    """The first isotherm. Tabs, decimal points, units on their own line."""
    head = [
        MARK,
        "Film:\toctadecanoic acid, 25 uL of 1.00 mg/mL",
        "Subphase:\twater, 20.0 degC",
        "",
        "Time\tTrough area\tSurface pressure\tSubphase temperature",
        "s\tcm^2\tmN/m\tdegC",
    ]
    forms = ("{:.2f}", "{:.2f}", "{:.2f}", "{:.1f}")
    return head + table(compression(20, 3000, 0.18, 95.0), forms, "\t")


def second_isotherm() -> list[str]:
    """Another day, stopped below collapse. Semicolons, decimal commas, columns in another order."""
    time, trough, pressure, celsius = compression(21, 1500, -0.12, 100.0)
    head = [MARK, "Π / mN/m;A / cm²;T / °C;t / s"]
    forms = ("{:.2f}", "{:.2f}", "{:.1f}", "{:.1f}")
    return head + with_commas(table((pressure, trough, celsius, time), forms, ";"))


def unzeroed_isotherm() -> list[str]:
    """The day the probe was not zeroed: it reads 6.4 mN/m too much. Blanks between columns."""
    time, trough, pressure, _ = compression(22, 1500, 6.4, 97.0)
    head = [f"% {MARK}", f"%{'t(s)':>9} {'A(cm^2)':>10} {'Pi(mN/m)':>10}"]
    return head + table((time, trough, pressure), ("{:10.1f}", "{:10.2f}", "{:10.2f}"), " ")


# --- a film held -------------------------------------------------------------------------------


def held(seed: int, pressure: float, root: float, steady: float) -> list[str]:
    """The film held for two hours. Tension instead of pressure, minutes, semicolons.

    pressure : mN/m. root, steady : loss per square root of a second and per second.
    """
    rng = np.random.default_rng(seed)
    time = np.arange(0.0, 7200.0, 4.0)
    start = film_area(pressure) * MOLECULES / NM2_PER_CM2
    wander = np.convolve(rng.normal(0.0, 0.04, time.size + 9), np.ones(10) / 10.0, mode="valid")
    area = start * (1.0 - root * np.sqrt(time) - steady * time) * (1.0 - wander / 390.0)
    area = area + rng.normal(0.0, 0.01, time.size)
    tension = 72.74 - pressure - wander + rng.normal(0.0, 0.03, time.size)
    celsius = np.full(time.size, 20.0)
    head = [MARK, "t [min];A [cm²];γ [mN/m];T [°C]"]
    forms = ("{:.4f}", "{:.3f}", "{:.3f}", "{:.1f}")
    return head + with_commas(table((time / 60.0, area, tension, celsius), forms, ";"))


# --- builds ------------------------------------------------------------------------------------

WIDTH, THICKNESS, LENGTH = 10.0, 0.5, 10.0  # mm, of the gold-coated slide and of what crosses
SPEED = 5.0 / 60.0  # mm/s
TOP, BOTTOM = 60.0, 20.0  # s, dwells
TOUCH, ABOVE = 6.0, 2.0  # mm: reading where the edge touches; how far it is lifted out


@dataclass(frozen=True)
class Build:
    """A build as it went: what the film and the strokes truly did.

    pressure, offset : mN/m, of the film and of the reading. loss : of the film, per s.
    ratios : of each stroke, down first.
    """

    seed: int
    ratios: tuple[float, ...]
    pressure: float = 30.0
    offset: float = 0.0
    loss: float = 1.5e-6

    def run(self, step: float = 2.0) -> tuple[np.ndarray, ...]:
        """Return time (s), depth reading (mm), trough area (cm^2) and pressure reading (mN/m)."""
        rng = np.random.default_rng(self.seed)
        high, deep = TOUCH - ABOVE, TOUCH + LENGTH
        knots_time, knots_depth = [0.0, 90.0], [high, high]
        for number in range(len(self.ratios)):
            to = deep if number % 2 == 0 else high
            moving = abs(to - knots_depth[-1]) / SPEED
            knots_time += [knots_time[-1] + moving, knots_time[-1] + moving]
            knots_time[-1] += BOTTOM if number % 2 == 0 else TOP
            knots_depth += [to, to]
        knots_time[-1] += 60.0
        time = np.arange(0.0, knots_time[-1], step)
        depth = np.interp(time, knots_time, knots_depth)
        wet = 2.0 * (WIDTH + THICKNESS) * np.clip(depth - TOUCH, 0.0, None)
        wet += WIDTH * THICKNESS * (depth > TOUCH)
        crossed = np.abs(np.diff(wet, prepend=wet[0])) / 100.0
        number = np.clip(
            np.searchsorted(np.array(knots_time[1::2]), time, side="right") - 1, 0, None
        )
        ratio = np.asarray(self.ratios)[np.clip(number, 0, len(self.ratios) - 1)]
        start = film_area(self.pressure) * MOLECULES / NM2_PER_CM2
        film = (start - np.cumsum(ratio * crossed)) * np.exp(-self.loss * time)
        wander = np.convolve(rng.normal(0.0, 0.15, time.size + 19), np.ones(20) / 20.0, "valid")
        modulus = 380.0 if self.pressure > 24.5 else 140.0  # mN/m, of CORNERS' two stretches
        area = film * (1.0 - wander / modulus) + rng.normal(0.0, 0.01, time.size)
        reading = self.pressure + self.offset + wander + rng.normal(0.0, 0.04, time.size)
        return time, depth + rng.normal(0.0, 0.003, time.size), area, reading


def _near(seed: int, ratio: float, strokes: int) -> list[float]:
    scatter = np.random.default_rng(seed).normal(0.0, 0.006, strokes)
    return [float(r) for r in ratio + scatter]


GOOD = Build(31, tuple(_near(41, 0.995, 20)))
# from stroke 11 on, film goes over on part of the slide only
FAILING = Build(32, tuple(_near(42, 0.99, 10) + _near(44, 0.66, 10)))
# read as 30 mN/m, truly 23.6 mN/m: below the kink, in the softer phase
UNZEROED = Build(33, tuple(_near(43, 0.93, 20)), pressure=23.6, offset=6.4)


def good_log() -> list[str]:
    """The good build's log. Tabs, decimal points, unit in the header."""
    head = [MARK, "", "Time (s)\tDepth (mm)\tTrough area (cm^2)\tSurface pressure (mN/m)"]
    return head + table(GOOD.run(), ("{:.0f}", "{:.3f}", "{:.3f}", "{:.2f}"), "\t")


def failing_log() -> list[str]:
    """The build that fails half-way. Semicolons, decimal commas, minutes, another order."""
    time, depth, area, pressure = FAILING.run()
    head = [
        f'"{MARK}"',
        "Surface pressure / mN/m;Trough area / cm²;Dipper position / mm;Time / min",
    ]
    forms = ("{:.2f}", "{:.3f}", "{:.3f}", "{:.4f}")
    return head + with_commas(table((pressure, area, depth, time / 60.0), forms, ";"))


def unzeroed_log() -> list[str]:
    """The build with the probe not zeroed. Blanks between columns, height instead of depth."""
    time, depth, area, pressure = UNZEROED.run()
    head = [f"% {MARK}", f"%{'t(s)':>9} {'Height(mm)':>11} {'A(cm^2)':>10} {'Pi(mN/m)':>10}"]
    forms = ("{:10.0f}", "{:11.3f}", "{:10.3f}", "{:10.2f}")
    return head + table((time, 40.0 - depth, area, pressure), forms, " ")


# --- evidence ----------------------------------------------------------------------------------

PER_LAYER = 2.5e-9 / (8.8541878188e-12 * 2.6) * 1e4 / 1e6  # cm^2/µF: d/(eps0 eps_r)
HERTZ = -13.1  # per layer and face, 5 MHz crystal, 231 ng/cm^2 a layer


def evidence(build: Build, seed: int, label: str) -> list[str]:
    """Capacitance of the gold electrode and frequency of a crystal dipped along, in TOML."""
    rng = np.random.default_rng(seed)
    lines = [
        f"# {MARK}. Evidence of {label}.",
        "[interfacial_capacitance]",
        'label = "gold electrode"',
        'permittivity = "2.6 ± 0.05"',
        'electrode_area = "0.500 ± 0.005 cm^2"',
        'roughness = "1.00 ± 0.01"',
        "points = [",
    ]
    layers = np.concatenate([[0.0], np.cumsum(build.ratios)])
    for stroke in range(0, 21, 4):
        value = 0.5 / (1.0 / 9.0 + PER_LAYER * layers[stroke]) * rng.normal(1.0, 0.006)
        lines.append(f'  {{stroke = {stroke}, value = "{value:.5f} ± {0.006 * value:.5f} µF"}},')
    lines += [
        "]",
        "[resonator_frequency]",
        'label = "crystal beside it"',
        'crystal_frequency = "5 MHz"',
        "faces = 1",
        'common_uncertainty = "1 %"',
        "points = [",
    ]
    for stroke in range(4, 21, 4):
        value = HERTZ * layers[stroke] + rng.normal(0.0, 1.0)
        lines.append(f'  {{stroke = {stroke}, value = "{value:.1f} ± 1 Hz"}},')
    return [*lines, "]"]


# --- run sheets --------------------------------------------------------------------------------

FILM = """\
[film]
name = "octadecanoic acid"
molar_mass = "284.48 g/mol"
concentration = "1.00 ± 0.01 mg/mL"
volume = "25.0 ± 0.2 µL"
solvent = "chloroform"

[subphase]
liquid = "water"
temperature = "20.0 ± 0.2 degC"

[trough]
smallest_area = "60 cm^2"
largest_area = "240 cm^2"
area_uncertainty = "0.3 cm^2"
pressure_uncertainty = "0.1 mN/m"
"""
SUBSTRATE = """
[substrate]
shape = "plate"
width = "10.00 ± 0.03 mm"
thickness = "0.500 ± 0.005 mm"
material = "gold on glass, thiol-primed"

[dipping]
pressure = "30 mN/m"
tolerance = "0.2 mN/m"
overshoot = "0.5 mN/m"
stroke_length = "10 mm"
speed = "5 mm/min"
dwell_top = "60 s"
dwell_bottom = "20 s"
"""
STACK = """
[stack]
layers = 20
type = "Y"
first_stroke = "down"
accept = [0.95, 1.05]
layer_thickness = "2.50 ± 0.03 nm"
"""
TARGET = """
[target]
phase = "solid"
collapse_margin = "5 mN/m"
guard_band = "2 mN/m"
packing_error = "0.5 %"
loss = "5 %"
"""
COLUMNS = """
[[columns]]
role = "dipper_position"
header = "Height(mm)"
"""


def sheet(title: str, *, reads: str = "", target: bool = False, stack: bool = True) -> list[str]:
    """A run sheet."""
    head = f'# Run sheet of the demonstration. Invented, like the run it belongs to.\ntitle = "{title}"\n\n'
    body = FILM
    if stack:
        touch = {"depth": f"{TOUCH:.2f}", "height": f"{40.0 - TOUCH:.2f}"}.get(reads)
        body += SUBSTRATE
        if touch:
            body += f'position_reads = "{reads}"\nsurface_at = "{touch} ± 0.05 mm"\n'
        body += STACK
    if target:
        body += TARGET
    if reads == "height":
        body += COLUMNS
    return (head + body).rstrip("\n").split("\n")


Maker = Callable[[], list[str]]

# name -> (lines, encoding)
FILES: dict[str, tuple[Maker, str]] = {
    "bare_subphase.csv": (lambda: bare(24, 0.04), "utf-8"),
    "bare_unzeroed.csv": (lambda: bare(25, 6.4), "utf-8"),
    "spacer_isotherm.txt": (first_isotherm, "utf-8"),
    "second_isotherm.csv": (second_isotherm, "utf-16"),
    "unzeroed_isotherm.dat": (unzeroed_isotherm, "ascii"),
    "held_35.csv": (lambda: held(23, 35.0, 2.0e-4, 0.0), "utf-8-sig"),
    "held_45.csv": (lambda: held(26, 45.0, 0.0, 2.5e-5), "utf-8-sig"),
    "build_good.txt": (good_log, "utf-8"),
    "build_failing.csv": (failing_log, "cp1252"),
    "build_unzeroed.dat": (unzeroed_log, "ascii"),
    "evidence_good.toml": (lambda: evidence(GOOD, 51, "the good build"), "utf-8"),
    "evidence_failing.toml": (lambda: evidence(FAILING, 52, "the build that fails"), "utf-8"),
    "spacer.toml": (lambda: sheet("Spacer film, first isotherm (invented)", target=True), "utf-8"),
    "build_good.toml": (lambda: sheet("Spacer, good build (invented)", reads="depth"), "utf-8"),
    "build_failing.toml": (
        lambda: sheet("Spacer, build that fails half-way (invented)", reads="depth"),
        "utf-8",
    ),
    "build_unzeroed.toml": (
        lambda: sheet("Spacer, probe not zeroed (invented)", reads="height"),
        "utf-8",
    ),
}


def main(folder: Path = HERE) -> None:
    """Write every file of the demonstration into a folder."""
    for name, (lines, encoding) in FILES.items():
        (folder / name).write_bytes(("\n".join(lines()) + "\n").encode(encoding))


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
