"""Score the charge of surface-bound waves on simulated voltammograms.

    python tests/accuracy/evidence_wave_score.py --records 300 --half report

Waves of three shapes (ideal, normal, a spread of formal potentials) of 90 to 160 mV on a curved, sloping
and partly steady baseline, 200 to 1500 rows a sweep, noise 0.2 to 3 % of the larger of peak and
charging current, either sign convention. Seeds come in two halves, as in `evidence_score`.
"""

from __future__ import annotations

import argparse
from dataclasses import dataclass

import numpy as np

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_series import Voltammogram
from transfer.evidence_sweeps import split_sweeps
from transfer.evidence_wave import measure_wave

AREA = 0.2  # cm^2
FARADAY = 96485.33212


@dataclass(frozen=True)
class Cycle:
    """A simulated voltammogram, its scan rate (V/s) and true charge (C)."""

    record: Voltammogram
    rate: float
    charge: float


def simulate(rng: np.random.Generator, *, peak: bool = True) -> Cycle:
    """One cycle; without `peak` the same baseline alone."""
    low, high = -0.1 + rng.uniform(-0.05, 0.05), 0.6 + rng.uniform(-0.1, 0.1)
    rows = int(rng.integers(200, 1500))
    rate = 10 ** rng.uniform(-2.0, -0.3)
    place, width = rng.uniform(0.15, 0.35), rng.uniform(0.09, 0.16)
    charge = 10 ** rng.uniform(-10.5, -9.3) * FARADAY * AREA
    e = np.concatenate([np.linspace(low, high, rows), np.linspace(high, low, rows)])
    way = np.repeat([1.0, -1.0], rows)
    shape = int(rng.integers(3))
    if shape == 0:
        w = width / 1.762747
        wave = 1 / np.cosh((e - place) / w) ** 2 / (2 * w)
    elif shape == 1:
        s = width / 2.354820
        wave = np.exp(-0.5 * ((e - place) / s) ** 2) / s / np.sqrt(2 * np.pi)
    else:
        w = 0.0906 / 1.762747
        wave = np.mean(
            [1 / np.cosh((e - place - d) / w) ** 2 / (2 * w) for d in np.linspace(-0.03, 0.03, 7)],
            axis=0,
        )
    capacity = rng.uniform(1, 8) * 1e-6 * AREA
    x = (e - low) / (high - low)
    current = (
        capacity * rate * (1 + rng.uniform(-0.3, 0.3) * x + rng.uniform(-0.2, 0.2) * x**2) * way
    )
    current = current + rng.uniform(-1, 1) * 0.2 * capacity * rate * (x - 0.5)
    top = charge * rate * float(wave.max())
    if peak:
        current = current + charge * rate * wave * way
    current = current + rng.normal(
        0, rng.uniform(0.002, 0.03) * max(top, capacity * rate), 2 * rows
    )
    return Cycle(Voltammogram(e, current * rng.choice((-1, 1)), "simulated.csv"), rate, charge)


def score(half: str, records: int) -> dict[str, float]:
    """Error of the charge, coverage of its 2u, and how often a peak is seen where none is."""
    first = {"tune": 0, "report": 1}[half]
    errors, pulls = [], []
    missed = invented = bare = 0
    for n in range(records):
        rng = np.random.default_rng(90_000 + 2 * n + first)
        cycle = simulate(rng)
        for sweep in split_sweeps(cycle.record):
            try:
                wave = measure_wave(sweep, Quantity(cycle.rate, None, "V/s"), "")
            except UpstrokeError:
                missed += 1
                continue
            errors.append(wave.charge.value / cycle.charge - 1.0)
            pulls.append((wave.charge.value - cycle.charge) / (wave.charge.u or 1.0))
        for sweep in split_sweeps(simulate(rng, peak=False).record):
            bare += 1
            try:
                measure_wave(sweep, Quantity(cycle.rate, None, "V/s"), "")
            except UpstrokeError:
                continue
            invented += 1
    size = np.abs(errors)
    return {
        "sweeps": float(len(errors)),
        "median_error": float(np.median(size)),
        "error_90": float(np.quantile(size, 0.9)),
        "bias": float(np.median(errors)),
        "inside_2u": float(np.mean(np.abs(pulls) < 2)),
        "missed": missed / max(missed + len(errors), 1),
        "invented": invented / max(bare, 1),
    }


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--records", type=int, default=200)
    parser.add_argument("--half", choices=("tune", "report"), default="tune")
    chosen = parser.parse_args()
    for name, value in score(chosen.half, chosen.records).items():
        print(f"{name:16s} {value:.4f}")


if __name__ == "__main__":
    main()
