"""Score the evidence module on simulated samples: is the bad kind named, is a good set left alone?

    python tests/accuracy/evidence_score.py --sets 400 --half report

Every set is a build with known layers, an evidence file as a laboratory would write it, and at most one
bad kind. The simulator shares no code with the analysis: it writes text and knows the physics from
formulas of its own. Seeds come in two halves; methods were worked on with `tune`, figures are quoted
from `report`.
"""

from __future__ import annotations

import argparse
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from isotherm.quantity import Quantity
from transfer.evidence import assess
from transfer.evidence_kinds import KINDS as EVIDENCE_KINDS
from transfer.evidence_ledger import FilmInputs, LedgerView
from transfer.evidence_read import read_evidence
from transfer.evidence_result import EvidenceResult

KINDS = (
    "absorbance",
    "resonator_frequency",
    "ellipsometric_thickness",
    "xray_thickness",
    "electroactive_coverage",
    "interfacial_capacitance",
    "bragg_spacing",
)
FAULTS = ("scale", "bend", "outlier", "scatter")
NAVOGADRO, FARADAY, EPS0 = 6.02214076e23, 96485.33212, 8.8541878188e-12


@dataclass(frozen=True)
class Sample:
    """A simulated evidence set and the truth behind it."""

    text: str
    ledger: LedgerView
    kinds: tuple[str, ...]
    bad: str
    fault: str
    factor: float
    layers: float
    surface_density: float


def simulate(rng: np.random.Generator, fault: str) -> Sample:
    """One build with evidence; `fault` is "" or one of FAULTS."""
    n = int(rng.integers(8, 31))
    true_added = 1.0 + rng.normal(0.0, 0.02, n)
    u_random = rng.uniform(0.005, 0.03)
    u_shared = rng.uniform(0.003, 0.015)
    read = true_added * (1.0 + rng.normal(0.0, u_shared)) + rng.normal(0.0, u_random, n)
    covariance = np.eye(n) * u_random**2 + np.outer(read, read) * u_shared**2
    true_layers = np.concatenate(([0.0], np.cumsum(true_added)))

    def shared(value: float, relative: float) -> tuple[float, str]:
        u = value * relative
        return float(rng.normal(value, u)), f"{value:.6g} ± {u:.3g}"

    thickness_u = rng.uniform(0.01, 0.04)
    area_u = rng.uniform(0.01, 0.03)
    thickness = float(rng.normal(2.5, 2.5 * thickness_u))
    area = float(rng.normal(0.2, 0.2 * area_u))
    molar_mass = 312.5
    absorptivity, absorptivity_text = shared(1.2e4, rng.uniform(0.02, 0.06))
    permittivity, permittivity_text = shared(2.6, rng.uniform(0.03, 0.18))
    electrode, electrode_text = shared(0.2, rng.uniform(0.01, 0.03))
    roughness, roughness_text = shared(1.2, rng.uniform(0.01, 0.04))
    density = 1e14 / (NAVOGADRO * area)  # mol/cm^2
    rise = {
        "absorbance": 2 * absorptivity * 1e3 * density,
        "resonator_frequency": -2 * 2 * 25e12 * molar_mass * density / np.sqrt(2.648 * 2.947e11),
        "ellipsometric_thickness": thickness,
        "xray_thickness": thickness,
        "electroactive_coverage": FARADAY * density * electrode * roughness * 1e6,  # µC
        "interfacial_capacitance": thickness * 1e-9 / (EPS0 * permittivity) * 1e-2,  # cm^2/µF
        "bragg_spacing": 2 * thickness,
    }
    count = int(rng.integers(3, 7))
    kinds = tuple(rng.permutation(KINDS)[:count])
    bad = str(rng.choice(kinds)) if fault else ""
    if fault in ("bend", "outlier", "scatter") and bad == "bragg_spacing":
        bad = next(k for k in kinds if k != "bragg_spacing")
    factor = float(np.exp(rng.choice((-1, 1)) * rng.uniform(0.2, 0.7))) if fault == "scale" else 1.0
    rows = ["kind,layers,value,u,unit,absorptivity,crystal_frequency,faces,electrons,electrode_area,"
            "roughness,permittivity"]  # fmt: skip
    for kind in kinds:
        points = (
            int(rng.integers(6, 11)) if kind == bad and fault == "bend" else int(rng.integers(3, 9))
        )
        if kind == bad and fault in ("outlier", "scatter"):
            points = max(points, 5)
        chosen = np.unique(np.round(np.linspace(rng.integers(0, 3), n, min(points, n))).astype(int))
        if kind == "bragg_spacing":
            chosen = chosen[chosen > 3][:3]
        on = true_layers[chosen]
        if kind == bad and fault == "bend":
            start = true_layers[int(rng.integers(chosen[2], chosen[-3] + 1))]
            on = np.minimum(on, start) + rng.uniform(0.0, 0.5) * np.maximum(on - start, 0.0)
        base = {"ellipsometric_thickness": 1.5, "interfacial_capacitance": 0.05}.get(kind, 0.0)
        value = (
            rise[kind] * (factor if kind == bad else 1.0) * (on if kind != "bragg_spacing" else 1.0)
        )
        value = base + value
        relative = rng.uniform(0.02, 0.15) if kind != "bragg_spacing" else 0.005
        u = np.full(len(chosen), relative * abs(rise[kind]))
        if kind == "interfacial_capacitance":  # bridges and potentiostats are good to so much of C
            u = rng.uniform(0.005, 0.03) * np.abs(value)
        spread = u * (rng.uniform(5.0, 8.0) if kind == bad and fault == "scatter" else 1.0)
        value = value + rng.normal(0.0, spread)
        if kind == bad and fault == "outlier":
            at = int(rng.integers(len(chosen)))
            shift = rng.choice((-1, 1)) * rng.uniform(8.0, 20.0) * u[at]
            # an inverse capacitance cannot be pushed to zero or below
            turned = kind == "interfacial_capacitance" and value[at] + shift < 0.5 * value[at]
            value[at] += abs(shift) if turned else shift
        for layers, v, s in zip(chosen, value, u, strict=True):
            rows.append(_row(kind, int(layers), float(v), float(s), electrode_text, roughness_text,
                             absorptivity_text, permittivity_text))  # fmt: skip
    ledger = LedgerView(
        strokes=np.arange(1, n + 1),
        added=read,
        covariance=covariance,
        films=("",) * n,
        inputs=(
            FilmInputs(
                "",
                Quantity(2.5, 2.5 * thickness_u, "nm"),
                Quantity(molar_mass, 0.05, "g/mol"),
                Quantity(0.2, 0.2 * area_u, "nm^2"),
            ),
        ),
        lays_film=np.ones(n, dtype=bool),
    )
    total = float(true_layers[-1])
    return Sample("\n".join(rows), ledger, kinds, bad, fault, factor, total, total * density)


def _row(kind, layers, v, s, electrode, roughness, absorptivity, permittivity):  # type: ignore[no-untyped-def]
    absorb = crystal = faces = electrons = area = rough = perm = ""
    unit = {"absorbance": "1", "resonator_frequency": "Hz", "electroactive_coverage": "µC"}.get(
        kind, "nm"
    )
    if kind == "absorbance":
        absorb, faces = f"{absorptivity} L/(mol·cm)", "2"
    elif kind == "resonator_frequency":
        crystal, faces = "5 MHz", "2"
    elif kind == "electroactive_coverage":
        electrons, area, rough = "1", f"{electrode} cm^2", roughness
        v = max(v, 1e-9)
    elif kind == "interfacial_capacitance":
        # 1/C of true area into C per geometric area, as a bench would have it
        r = float(roughness.split()[0])
        rough, perm, unit = roughness, permittivity, "µF/cm^2"
        v = max(v, 1e-3)
        v, s = r / v, r * s / v**2
    cells = (
        kind,
        layers,
        f"{v:.8g}",
        f"{s:.4g}",
        unit,
        absorb,
        crystal,
        faces,
        electrons,
        area,
        rough,
        perm,
    )
    return ",".join(map(str, cells))


def run(sample: Sample, folder: Path) -> EvidenceResult:
    """Write the file, read it, assess it."""
    path = folder / "evidence.csv"
    path.write_text(sample.text, encoding="utf-8")
    return assess(read_evidence(path), sample.ledger)


def seeds(half: str, sets: int) -> list[int]:
    """Seeds of one half: even numbers for tuning, odd for reporting."""
    first = {"tune": 0, "report": 1}[half]
    return list(range(70_000 + first, 70_000 + first + 2 * sets, 2))


def score(half: str, sets: int) -> dict[str, float]:
    """Rates over `sets` good and `sets` bad samples."""
    false_alarms = inside = inside_density = 0
    named = dict.fromkeys(FAULTS, 0)
    only = 0
    tried = dict.fromkeys(FAULTS, 0)
    by_size: dict[str, list[bool]] = {}
    estimates = 0
    with tempfile.TemporaryDirectory() as folder:
        for number, seed in enumerate(seeds(half, sets)):
            rng = np.random.default_rng(seed)
            good = simulate(rng, "")
            result = run(good, Path(folder))
            alarm = bool(result.joint.disagrees or result.joint.undecided)
            alarm = alarm or not all(k.consistent for k in result.kinds)
            false_alarms += alarm
            if result.joint.layers is not None and result.joint.layers.u:
                estimates += 1
                inside += abs(result.joint.layers.value - good.layers) <= 2 * result.joint.layers.u
                gamma = result.joint.surface_density
                if gamma is not None and gamma.u:
                    inside_density += abs(gamma.value - good.surface_density) <= 2 * gamma.u
            fault = FAULTS[number % len(FAULTS)]
            bad = simulate(rng, fault)
            result = run(bad, Path(folder))
            hit = EVIDENCE_KINDS[bad.bad].words in result.joint.disagrees
            tried[fault] += 1
            named[fault] += hit
            only += hit and len(result.joint.disagrees) == 1
            if fault == "scale":
                kind = next(k for k in result.kinds if k.kind == bad.bad)
                relative = kind.ratio.u / kind.ratio.value if kind.ratio and kind.ratio.u else 1.0
                size = abs(np.log(bad.factor)) / relative
                key = "<4" if size < 4 else "4-6" if size < 6 else "6-10" if size < 10 else ">10"
                by_size.setdefault(key, []).append(hit)
    out = {
        "false_alarm_rate": false_alarms / sets,
        "layers_inside_2u": inside / max(estimates, 1),
        "density_inside_2u": inside_density / max(estimates, 1),
        "named_all": sum(named.values()) / sets,
        "named_alone": only / sets,
    }
    out |= {f"named_{f}": named[f] / max(tried[f], 1) for f in FAULTS}
    out |= {f"scale_size_{k}": float(np.mean(v)) for k, v in sorted(by_size.items())}
    out |= {f"scale_size_{k}_sets": float(len(v)) for k, v in sorted(by_size.items())}
    return out


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("--sets", type=int, default=200)
    parser.add_argument("--half", choices=("tune", "report"), default="tune")
    chosen = parser.parse_args()
    for name, value in score(chosen.half, chosen.sets).items():
        print(f"{name:28s} {value:.3f}")


if __name__ == "__main__":
    main()
