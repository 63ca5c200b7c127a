"""A film, a ledger and evidence of every kind that agrees with it."""

import math

import numpy as np

from isotherm.constants import AVOGADRO, EPSILON_0, FARADAY
from isotherm.quantity import Quantity
from transfer.evidence import assess
from transfer.evidence_ledger import FilmInputs, LedgerView
from transfer.evidence_read import read_evidence

FILM = FilmInputs(
    "",
    Quantity(2.5, 0.025, "nm"),
    Quantity(284.48, None, "g/mol"),
    Quantity(0.2, 0.002, "nm^2"),
)


def ledger(strokes=20, ratio=1.0, u=0.01, films=("",), inputs=(FILM,), shared=0.005):
    added = np.full(strokes, ratio)
    return LedgerView(
        strokes=np.arange(1, strokes + 1),
        added=added,
        covariance=np.eye(strokes) * u**2 + shared**2 * np.outer(added, added),
        films=tuple(films[n % len(films)] for n in range(strokes)),
        inputs=inputs,
        lays_film=np.ones(strokes, dtype=bool),
    )


def result_of(tmp_path, text, view=None, name="e.csv"):
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    return assess(read_evidence(path), view or ledger())


THICKNESS = "kind,layers,value,u,unit\n" + "".join(
    f"ellipsometric_thickness,{n},{2.5 * n + 1.2},0.2,nm\n" for n in (2, 6, 10, 14, 20)
)


def expected_rise():
    """Rises per layer written out from the published relations, in SI."""
    molecules = 1.0 / 0.2e-18  # per m^2
    mass = molecules * 284.48e-3 / AVOGADRO  # kg/m^2
    quartz = math.sqrt(2648.0 * 2.947e10)  # kg/(m^2 s)
    return {
        "frequency": -2 * 2 * 5e6**2 * mass / quartz,  # Hz, both faces
        "charge": molecules / AVOGADRO * FARADAY * 0.2e-4 * 1.1 * 1e6,  # µC
        "elastance": 2.5e-9 / (EPSILON_0 * 2.6) / (0.2e-4 * 1.1),  # 1/F
        "absorbance": 2 * molecules / AVOGADRO * 1.2e4 * 0.1,  # 1 L/(mol cm) = 0.1 m^2/mol
    }


def all_kinds(factor=None, bend_after=None):
    factor = factor or {}
    rise = expected_rise()
    layers = (0, 4, 8, 12, 16, 20)

    def value(kind, n):
        reached = n if kind != (bend_after or ("",))[0] else min(n, bend_after[1])
        return rise[kind] * factor.get(kind, 1.0) * reached

    rows = [
        "kind,layers,value,u,unit,crystal_frequency,faces,overtone,electrons,electrode_area,roughness,"
        "permittivity,absorptivity,orientation,fraction"
    ]
    for n in layers:
        if n:
            rows.append(f"electroactive_coverage,{n},{value('charge', n)},0.3,µC,,,,1,0.2 ± 0.002 cm^2,"
                        "1.1 ± 0.02,,,,")  # fmt: skip
        rows.append(f"resonator_frequency,{n},{value('frequency', n)},1,Hz,5 MHz,2,1,,,,,,,")
        c = 1e6 / (1e6 / 4.0 + value("elastance", n))
        rows.append(f"interfacial_capacitance,{n},{c},{0.01 * c},µF,,,,,0.2 ± 0.002 cm^2,1.1 ± 0.02,"
                    "2.6 ± 0.05,,,")  # fmt: skip
        rows.append(
            f"absorbance,{n},{value('absorbance', n)},0.002,1,,2,,,,,,12000 ± 200 L/(mol·cm),1,1"
        )
    rows.append("bragg_spacing,20,5.0,0.02,nm,,,,,,,,,,")
    return "\n".join(rows)
