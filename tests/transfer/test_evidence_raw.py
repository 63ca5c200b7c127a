"""Evidence from raw voltammograms, and from values no instrument gives."""

import json
import math

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from tests.transfer.evidence_example import THICKNESS, expected_rise, result_of
from transfer.evidence_figure import draw_evidence


def write_cycle(path, rate, charge, capacitance, seed):
    """A voltammogram of a surface-bound wave on a capacitive background, as a potentiostat exports it."""
    rng = np.random.default_rng(seed)
    up = np.linspace(0.0, 0.5, 400)
    potential = np.concatenate([up, up[::-1]])
    way = np.repeat([1.0, -1.0], 400)
    width = 0.1 / (2 * math.acosh(math.sqrt(2)))
    wave = charge / (2 * width) / np.cosh((potential - 0.25) / width) ** 2
    current = way * rate * (capacitance * (1 + 0.1 * potential) + wave)
    current += rng.normal(0, 0.005 * np.abs(current).max(), 800)
    rows = "\n".join(f"{e:.5f};{i * 1e6:.6f}" for e, i in zip(potential, current, strict=True))
    path.write_text(f"potential (V);current (µA)\n{rows}\n", encoding="utf-8")


def test_raw_voltammograms_to_coverage(tmp_path):
    rates = (0.05, 0.1, 0.2)
    points = []
    for n in (2, 6, 12, 20):
        charge = expected_rise()["charge"] * 1e-6 * n
        for rate in rates:
            write_cycle(tmp_path / f"l{n}_{rate}.csv", rate, charge, 2e-7, seed=n)
        files = ", ".join(f'"l{n}_{rate}.csv"' for rate in rates)
        scan = ", ".join(f'"{rate} V/s"' for rate in rates)
        points.append(f"  {{layers = {n}, files = [{files}], scan_rates = [{scan}]}},")
    text = (
        '[electrode]\narea = "0.2 ± 0.002 cm^2"\nroughness = "1.1 ± 0.02"\n'
        "[electroactive_coverage]\nelectrons = 1\npoints = [\n" + "\n".join(points) + "\n]\n"
    )
    result = result_of(tmp_path, text, name="e.toml")
    kind = result.kinds[0]
    assert kind.consistent, kind.reason
    assert abs(kind.layers.value - 20.0) < 2 * kind.layers.u
    assert kind.layers.u < 1.0
    checks = kind.details["scan_rate_checks"]
    assert len(checks) == 4
    assert all(check["linear"] for check in checks)
    assert len(kind.details["waves"]) == 4 * 3 * 2
    assert len(result.raw_files) == 12
    json.dumps(result.to_json(), allow_nan=False)


def test_raw_voltammograms_to_capacitance(tmp_path):
    rows = ["kind,layers,file,scan_rate,electrode_area,roughness,permittivity"]
    for n in (0, 4, 10, 20):
        c = 1.0 / (1 / 8e-7 + expected_rise()["elastance"] * n)
        for rate in (0.05, 0.1, 0.2):
            write_cycle(tmp_path / f"l{n}_{rate}.csv", rate, 0.0, c / 1.025, seed=n)
            rows.append(f"interfacial_capacitance,{n},l{n}_{rate}.csv,{rate} V/s,"
                        "0.2 ± 0.002 cm^2,1.1 ± 0.02,2.6 ± 0.05")  # fmt: skip
    result = result_of(tmp_path, "\n".join(rows))
    kind = result.kinds[0]
    assert kind.consistent, kind.reason
    assert abs(kind.layers.value - 20.0) < 2 * kind.layers.u
    assert result.pinholes[0].fraction.value == pytest.approx(0.0, abs=0.01)


WILD = {
    "one value in another unit": THICKNESS.replace("26.2", "1e5"),
    "values that differ by 30 decades": THICKNESS.replace("6.2,0.2", "1e-9,1e-12").replace(
        "26.2", "1e12"
    ),
    "value far below its u": "kind,layers,value,u,unit\nabsorbance,8,1e-300,0.001,1\n",
    "two values at one number of layers": "kind,layers,value,u,unit\nxray_thickness,4,1e12,0.1,nm\n"
    "xray_thickness,4,10,0.1,nm\n",
    "blank only": "kind,layers,value,u,unit\nxray_thickness,0,1,0.1,nm\n",
    "u of a capacitance as large as it": "kind,layers,value,u,unit\n"
    "interfacial_capacitance,0,2,0.1,µF/cm^2\ninterfacial_capacitance,4,0.1,4,µF/cm^2\n",
    "falling thickness": "kind,layers,value,u,unit\n"
    + "".join(f"xray_thickness,{n},{40 - n},0.1,nm\n" for n in (2, 4, 8)),
    "scan rate next to nothing": "kind,layers,file,scan_rate\nelectroactive_coverage,2,a.csv,1e-300 V/s\n",
}


@pytest.mark.parametrize("case", WILD)
def test_wild_values_end_in_a_line_or_in_finite_numbers(tmp_path, case):
    (tmp_path / "a.csv").write_text("potential (V),current (A)\n0,1\n1,1\n0,1\n", encoding="utf-8")
    message, result = "", None
    try:
        result = result_of(tmp_path, WILD[case])
    except UpstrokeError as error:
        message = str(error)
    if result is None:
        assert "e.csv" in message
        assert "\n" not in message
    else:
        json.dumps(result.to_json(), allow_nan=False)
        draw_evidence(result)
