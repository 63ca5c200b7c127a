"""Small dipping logs with known truth, built row by row from a programme of rests, moves and renewals."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from isotherm.quantity import Quantity
from isotherm.sheet import Dipping, RunSheet, Stack, Substrate
from isotherm.source import Source
from transfer.log import DippingLog

WIDTH, THICKNESS = 20.0, 1.0  # mm
PERIMETER = 4.2  # cm
FACE = 0.2  # cm^2
TARGET, MODULUS = 30.0, 180.0  # mN/m


@dataclass
class Programme:
    """Write a run step by step; film in cm^2, immersion of the lower edge in mm (negative in air)."""

    film: float = 300.0
    depth: float = -3.0
    creep: float = 5e-6
    rate: float = 1.0
    seed: int = 1
    noise: float = 0.012
    pressure: float = TARGET
    rows: list[tuple[float, float, float, float]] = field(default_factory=list)
    clock: float = 0.0

    def _coated(self, depth: float) -> float:
        return PERIMETER * depth / 10.0 + FACE if depth > 0 else 0.0

    def _row(self, area: float | None = None, pressure: float | None = None) -> None:
        self.clock += 1.0 / self.rate
        self.film *= 1.0 - self.creep / self.rate
        held = self.pressure if pressure is None else pressure
        seen = self.film * (1.0 - (held - TARGET) / MODULUS) if area is None else area
        self.rows.append((self.clock, self.depth, seen, held))

    def rest(self, seconds: float) -> Programme:
        """Stay."""
        for _ in range(round(seconds * self.rate)):
            self._row()
        return self

    def move(self, to: float, ratio: float = 1.0, speed: float = 0.5) -> Programme:
        """Move the substrate to an immersion, taking `ratio` times what crosses."""
        steps = max(2, round(abs(to - self.depth) / speed * self.rate))
        start = self.depth
        for k in range(1, steps + 1):
            new = start + (to - start) * k / steps
            self.film -= ratio * abs(self._coated(new) - self._coated(self.depth))
            self.depth = new
            self._row()
        return self

    def renew(self, film: float = 300.0) -> Programme:
        """Open the barriers, spread, compress."""
        for _ in range(round(60 * self.rate)):
            self._row(area=500.0, pressure=0.1)
        self.film = film
        steps = round(100 * self.rate)
        for k in range(steps):
            part = (k + 1) / steps
            self._row(area=500.0 + (film - 500.0) * part, pressure=TARGET * part**3)
        return self

    def log(self, *, reads: str = "depth", surface_at: float = 12.0) -> DippingLog:
        """Return the log as recorded."""
        rng = np.random.default_rng(self.seed)
        t, depth, area, pressure = (np.asarray(v) for v in zip(*self.rows, strict=True))
        sign = 1.0 if reads == "depth" else -1.0
        n = t.size
        wander = 0.05 * np.sin(t / 70.0)
        return DippingLog(
            time=t,
            position=surface_at + sign * depth + 0.004 * rng.standard_normal(n),
            area=area * (1.0 - wander / MODULUS) + self.noise * rng.standard_normal(n),
            pressure=pressure + wander + 0.01 * rng.standard_normal(n),
            source=Source("run.csv", "", n),
        )


def sheet(
    *,
    reads: str | None = "depth",
    surface_at: float | None = 12.0,
    modulus: float | None = MODULUS,
    stack: Stack | None = None,
    substrate: Substrate | None = None,
    dipping: Dipping | None = None,
) -> RunSheet:
    """The run sheet that belongs to it."""
    return RunSheet(
        substrate=substrate
        or Substrate(
            width=Quantity(WIDTH, 0.02, "mm"),
            thickness=Quantity(THICKNESS, 0.01, "mm"),
            wetting=None,
        ),
        dipping=dipping
        or Dipping(
            pressure=Quantity(TARGET, None, "mN/m"),
            position_reads=reads,
            surface_at=None if surface_at is None else Quantity(surface_at, 0.02, "mm"),
            modulus=None if modulus is None else Quantity(modulus, 5.0, "mN/m"),
        ),
        stack=stack or Stack(),
    )


def y_build(strokes: int = 6, ratios: list[float] | None = None, **options: float) -> Programme:
    """Alternate down and up strokes with dwells of two minutes."""
    run = Programme(**options)  # type: ignore[arg-type]
    run.rest(150)
    for k in range(strokes):
        ratio = 1.0 if ratios is None else ratios[k]
        run.move(27.0 if k % 2 == 0 else -3.0, ratio).rest(120)
    return run
