"""Ratios, corrections and their uncertainty on logs of known truth."""

from dataclasses import replace

import numpy as np
import pytest

from isotherm.quantity import Quantity
from isotherm.sheet import ProfilePoint, RunSheet, Substrate
from tests.transfer.dipping_example import FACE, sheet, y_build
from transfer.analysis import analyse_log
from transfer.geometry import substrate_geometry


def test_ratios_are_within_their_uncertainty():
    truth = [1.0, 0.97, 0.9, 1.02, 0.5, 0.0]
    result = analyse_log(y_build(6, truth, creep=1e-5).log(), sheet())
    for stroke, true in zip(result.strokes, truth, strict=True):
        assert abs(stroke.ratio.value - true) < 3 * stroke.ratio.u
        assert stroke.ratio.u < 0.01
        assert stroke.ratio.u == pytest.approx(
            np.hypot(stroke.ratio.u_random, stroke.ratio.u_systematic)
        )


def test_creep_is_found_and_taken_out():
    result = analyse_log(y_build(6, creep=2e-5).log(), sheet())
    assert all(c.rate.value == pytest.approx(2e-5, abs=4 * c.rate.u + 1e-7) for c in result.creep)
    raw = np.mean([s.ratio_uncorrected for s in result.strokes])
    corrected = np.mean([s.ratio.value for s in result.strokes])
    assert raw > 1.02
    assert corrected == pytest.approx(1.0, abs=0.003)


def test_modulus_from_the_dwells_agrees_with_the_truth():
    result = analyse_log(y_build(8, noise=0.003).log(), sheet(modulus=None))
    assert result.compressibility_from == "dwells"
    true = 1 / 180
    assert abs(result.compressibility.value - true) < 3 * result.compressibility.u
    assert any("film modulus" in w for w in result.warnings)


def test_contact_is_found_where_transfer_starts_and_said():
    result = analyse_log(y_build(6).log(), sheet(surface_at=None))
    assert result.contact.at_from == "data"
    assert abs(result.contact.at.value - 12.0) < 3 * result.contact.at.u
    assert result.contact.at.u < 0.2
    assert any("surface contact found" in w for w in result.warnings)


def test_a_sheet_that_puts_the_surface_elsewhere_is_contradicted():
    result = analyse_log(y_build(6).log(), sheet(surface_at=16.0))
    assert any("transfer starts at" in w for w in result.warnings)


def test_plate_area_by_hand():
    geometry = substrate_geometry(sheet())
    # 2 (20 + 1) mm = 4.2 cm around, 2.7 cm deep, lower face 20 x 1 mm = 0.2 cm^2
    assert geometry.coated(np.asarray([27.0]))[0] == pytest.approx(4.2 * 2.7 + 0.2)
    assert geometry.coated(np.asarray([-1.0]))[0] == 0.0
    assert geometry.face == pytest.approx(FACE)


def test_rod_area_by_hand():
    rod = RunSheet(substrate=Substrate(shape="rod", diameter=Quantity(8.0, 0.05, "mm")))
    geometry = substrate_geometry(rod)
    assert geometry.coated(np.asarray([10.0]))[0] == pytest.approx(np.pi * 0.8 + np.pi * 0.16)
    # d area / d diameter = pi L + pi d / 2 (cm)
    expected = (np.pi * 1.0 + np.pi * 0.8 / 2) * 0.005
    assert geometry.u_coated(-1.0, 10.0) == pytest.approx(expected)


def test_a_table_of_widths_integrates_to_the_trapezium():
    table = RunSheet(
        substrate=Substrate(
            shape="table",
            thickness=Quantity(1.0, None, "mm"),
            profile=(ProfilePoint(0.0, 10.0), ProfilePoint(10.0, 20.0)),
        )
    )
    geometry = substrate_geometry(table)
    faces = 2 * 0.5 * (1.0 + 2.0) * 1.0
    edges = 2 * 0.1 * np.hypot(1.0, 0.5)
    found = geometry.coated(np.asarray([10.0]))[0]
    assert found == pytest.approx(faces + edges + 0.1 * 1.0, rel=1e-6)


def test_a_table_of_one_width_is_a_plate():
    table = RunSheet(
        substrate=Substrate(
            shape="table",
            thickness=Quantity(1.0, None, "mm"),
            profile=(ProfilePoint(0.0, 20.0), ProfilePoint(50.0, 20.0)),
        )
    )
    depths = np.linspace(-5, 40, 40)
    plate = substrate_geometry(sheet()).coated(depths)
    assert np.allclose(substrate_geometry(table).coated(depths), plate)


def test_profile_shows_where_a_stroke_failed():
    run = y_build(2)
    run.move(14.0).move(27.0, 0.0).rest(120).move(-3.0).rest(120)
    result = analyse_log(run.log(), sheet())
    failed = result.strokes[2]
    assert any("transfer fails from" in f for f in failed.flags)
    good = [w for w in failed.profile if w.to_mm < 13]
    bad = [w for w in failed.profile if w.from_mm > 15]
    assert all(abs(w.ratio.value - 1.0) < 4 * w.ratio.u + 0.02 for w in good)
    assert all(abs(w.ratio.value) < 4 * w.ratio.u + 0.02 for w in bad)
    assert not any("fail" in f or "uneven" in f for f in result.strokes[0].flags)


def test_dimensions_widen_all_strokes_together():
    log = y_build(4).log()
    exact, loose = (
        analyse_log(
            log,
            sheet(
                substrate=Substrate(
                    width=Quantity(20.0, u, "mm"), thickness=Quantity(1.0, None, "mm")
                )
            ),
        )
        for u in (None, 0.4)
    )
    assert any("no uncertainty: taken as exact" in w for w in exact.warnings)
    for a, b in zip(exact.strokes, loose.strokes, strict=True):
        assert a.ratio.u_random == pytest.approx(b.ratio.u_random)
        assert b.ratio.u_systematic > 0.018
    n = len(loose.strokes)
    mean_u = np.sqrt(loose.ratio_covariance.sum()) / n
    assert mean_u > 0.018  # what is common is not averaged away


def test_json_holds_no_nan_and_the_contract_fields():
    import json

    result = analyse_log(y_build(4).log(), sheet())
    out = json.loads(json.dumps(result.to_json(), allow_nan=False))
    assert out["schema"] == "upstroke.transfer/1"
    for key in ("source", "warnings", "creep", "renewals", "strokes", "type", "layers"):
        assert key in out
    assert set(out["strokes"][0]) >= {
        "number",
        "direction",
        "start_s",
        "end_s",
        "coated_area",
        "film_removed",
        "ratio",
        "ratio_uncorrected",
        "pressure_mean",
        "pressure_sd",
        "speed_mm_per_s",
        "flags",
    }
    assert set(out["creep"][0]) >= {"from_s", "to_s", "rate", "u"}
    assert out["strokes"][0]["speed_mm_per_s"] == pytest.approx(0.5, rel=0.03)


def test_cost_grows_linearly_with_rows():
    """Growth, not seconds: ten times the rate must not cost more than some twenty times the time."""
    import time

    def seconds(rate: float) -> float:
        log = y_build(4, rate=rate).log()
        best = np.inf
        for _ in range(3):
            start = time.process_time()
            analyse_log(log, sheet())
            best = min(best, time.process_time() - start)
        return float(best)

    seconds(1.0)
    assert seconds(40.0) < 20 * seconds(4.0)


def test_two_logs_in_one_scale():
    """Area and substrate scaled together leave the ratio as it is."""
    log = y_build(4).log()
    bigger = replace(log, area=log.area * 2.0)
    wide = Substrate(width=Quantity(41.0, None, "mm"), thickness=Quantity(1.0, None, "mm"))
    one = analyse_log(log, sheet(substrate=replace(wide, width=Quantity(20.0, None, "mm"))))
    two = analyse_log(bigger, sheet(substrate=wide))
    for a, b in zip(one.strokes, two.strokes, strict=True):
        # the lower face does not scale with the perimeter: 0.20 -> 0.41 cm^2, not 0.40
        assert b.ratio.value == pytest.approx(a.ratio.value, abs=0.002)
