"""From evidence file and ledger to the verdict."""

import json
import math

import numpy as np
import pytest

from isotherm.constants import AVOGADRO, EPSILON_0
from isotherm.errors import UpstrokeError
from isotherm.figures_style import figure_bytes
from isotherm.quantity import Quantity
from tests.transfer.evidence_example import (
    THICKNESS,
    all_kinds,
    expected_rise,
    ledger,
    result_of,
)
from transfer.evidence_figure import draw_evidence
from transfer.evidence_ledger import FilmInputs, LedgerView


def test_thickness_that_agrees(tmp_path):
    result = result_of(tmp_path, THICKNESS)
    kind = result.kinds[0]
    assert kind.consistent
    assert result.joint.agree
    assert kind.layers.value == pytest.approx(20.0, abs=1e-6)
    assert kind.increment.value == pytest.approx(2.5)
    assert kind.intercept.value == pytest.approx(1.2)
    assert kind.implied["layer thickness"].value == pytest.approx(2.5)
    assert kind.bend is None
    # u of the layer count: 1 % of the run sheet's layer thickness rules
    assert kind.layers.u == pytest.approx(20 * 0.01, rel=0.35)


def test_json_is_complete_and_finite(tmp_path):
    text = json.dumps(result_of(tmp_path, THICKNESS).to_json(), allow_nan=False)
    out = json.loads(text)
    entry = out["evidence"][0]
    assert entry["kind"] == "ellipsometric_thickness"
    assert entry["consistent"] is True
    assert set(entry["layers"]) >= {"value", "u", "unit"}
    assert out["evidence_joint"]["disagrees"] == []
    assert len(out["evidence_source"]["sha256"]) == 64


def test_stroke_and_layer_axes_agree(tmp_path):
    by_stroke = THICKNESS.replace("layers", "stroke", 1)
    a, b = result_of(tmp_path, THICKNESS), result_of(tmp_path, by_stroke)
    assert a.kinds[0].layers == b.kinds[0].layers


def test_layers_that_the_log_lacks(tmp_path):
    with pytest.raises(
        UpstrokeError, match="14 layers do not match the log: 12 of its 12"
    ) as caught:
        result_of(tmp_path, THICKNESS, ledger(strokes=12))
    assert "line 5" in str(caught.value)
    with pytest.raises(
        UpstrokeError, match="stroke 14 is not in the log, which has strokes 1 to 12"
    ):
        result_of(tmp_path, THICKNESS.replace("layers", "stroke", 1), ledger(strokes=12))


def test_only_strokes_that_lay_film_count_as_layers(tmp_path):
    view = ledger(strokes=40)
    odd = np.arange(40) % 2 == 0
    view = LedgerView(
        view.strokes,
        np.where(odd, 1.0, 0.0),
        view.covariance,
        view.films,
        view.inputs,
        odd,
    )
    result = result_of(tmp_path, THICKNESS, view)
    assert result.kinds[0].layers.value == pytest.approx(20.0, abs=0.05)


def test_every_kind_expects_what_its_relation_says(tmp_path):
    result = result_of(tmp_path, all_kinds())
    assert result.joint.agree, result.joint.statement
    for kind in result.kinds:
        if kind.layers is not None:
            assert kind.layers.value == pytest.approx(20.0, rel=1e-4), kind.kind
            assert kind.consistent
    assert result.joint.layers.value == pytest.approx(20.0, rel=1e-3)
    assert result.joint.layers.u < min(k.layers.u for k in result.kinds if k.layers)
    molecules = 20 / 0.2e-14 / AVOGADRO  # mol/cm^2
    assert result.joint.surface_density.value == pytest.approx(molecules, rel=1e-3)
    assert result.roughness.value == pytest.approx(1.1)
    assert result.warnings == (
        "Bragg spacing: a spacing counts no layers; it tests the layer thickness",
    )


@pytest.mark.parametrize(
    ("kind", "label"),
    [
        ("charge", "electroactive coverage"),
        ("frequency", "resonator frequency"),
        ("elastance", "interfacial capacitance"),
        ("absorbance", "absorbance"),
    ],
)
@pytest.mark.parametrize("factor", [0.5, 1.6])
def test_the_kind_that_is_off_is_named(tmp_path, kind, label, factor):
    result = result_of(tmp_path, all_kinds({kind: factor}))
    assert result.joint.disagrees == (label,)
    for found in result.kinds:
        assert found.consistent is (found.label != label)
    assert result.joint.layers.value == pytest.approx(20.0, abs=2 * result.joint.layers.u)
    assert label in result.joint.statement


def test_a_bend_is_placed(tmp_path):
    result = result_of(tmp_path, all_kinds(bend_after=("frequency", 8)))
    kind = next(k for k in result.kinds if k.kind == "resonator_frequency")
    assert kind.bend is not None
    assert kind.bend.strokes[0] <= 8 <= kind.bend.strokes[1]
    assert not kind.consistent
    assert "bends after stroke" in kind.reason
    assert result.joint.disagrees == ("resonator frequency",)


def test_a_wrong_ledger_is_named_not_the_evidence(tmp_path):
    # the log says 1.25 layers per stroke; everything on the substrate says 1
    result = result_of(tmp_path, all_kinds(), ledger(ratio=1.25))
    assert result.joint.disagrees == ("transfer ratios",)
    assert result.joint.layers.value == pytest.approx(20.0, rel=0.01)


def test_a_bend_in_most_kinds_is_the_ledgers(tmp_path):
    # nothing went over after layer 10, whatever the log says
    view = ledger(u=0.003)
    rise = 2.5
    text = "kind,layers,value,u,unit,crystal_frequency,faces,overtone\n"
    for n in (0, 3, 6, 9, 12, 15, 18, 20):
        on = min(n, 10)
        text += f"xray_thickness,{n},{rise * on},0.2,nm,,,\n"
        text += f"resonator_frequency,{n},{expected_rise()['frequency'] * on},2,Hz,5 MHz,2,1\n"
    result = result_of(tmp_path, text, view)
    assert result.joint.disagrees == ("transfer ratios",)
    assert "Most kinds bend" in result.joint.statement
    assert result.joint.layers.value == pytest.approx(10.0, abs=0.3)


def test_one_kind_alone_cannot_tell_who_is_wrong(tmp_path):
    result = result_of(tmp_path, THICKNESS, ledger(ratio=1.25))
    assert not result.joint.agree
    assert set(result.joint.undecided) == {"transfer ratios", "ellipsometric thickness"}
    assert not result.kinds[0].consistent
    assert result.joint.layers is None


def test_missing_inputs_are_said_and_the_line_still_drawn(tmp_path):
    text = "kind,layers,value,u,unit,electrode_area,roughness\n" + "".join(
        f"interfacial_capacitance,{n},{c},0.01,µF,0.2 cm^2,1\n"
        for n, c in ((2, 0.9), (4, 0.45), (8, 0.23))
    )
    result = result_of(tmp_path, text)
    kind = result.kinds[0]
    assert kind.layers is None
    assert kind.increment is not None
    assert kind.implied["permittivity"].value > 1
    assert any("permittivity unknown" in w for w in result.warnings)


def test_assumed_roughness_and_electrons_are_said(tmp_path):
    text = "kind,layers,value,u,unit,electrode_area\nelectroactive_coverage,20,3,0.1,µC,0.2 cm^2\n"
    warnings = " ".join(result_of(tmp_path, text).warnings)
    assert "roughness not given, 1 taken" in warnings
    assert "electrons not given, 1 taken" in warnings


def test_a_marker_film_shows_only_its_own_layers(tmp_path):
    marker = FilmInputs("marker", Quantity(3.0, 0.05, "nm"), None, Quantity(0.5, 0.01, "nm^2"))
    spacer = FilmInputs("spacer", Quantity(2.5, 0.05, "nm"), None, Quantity(0.2, 0.002, "nm^2"))
    view = ledger(films=("spacer", "marker"), inputs=(spacer, marker))
    per_layer = 1 / 0.5e-14 / AVOGADRO
    text = "kind,layers,value,u,unit,film\n" + "".join(
        f"electroactive_coverage,{n},{per_layer * n / 2},1e-12,mol/cm^2,marker\n"
        for n in (4, 8, 20)
    )
    result = result_of(tmp_path, text, view)
    assert result.kinds[0].layers.value == pytest.approx(20.0, rel=1e-3)
    both = "kind,layers,value,u,unit\n" + "".join(
        f"xray_thickness,{n},{5.5 * n / 2},0.1,nm\n" for n in (4, 8, 20)
    )
    assert result_of(tmp_path, both, view).kinds[0].layers.value == pytest.approx(20.0, rel=1e-3)
    with pytest.raises(UpstrokeError, match='film "makrer" was not deposited'):
        result_of(tmp_path, text.replace("marker", "makrer"), view)


def test_u_for_some_values_only_is_refused(tmp_path):
    text = THICKNESS.replace("6.2,0.2", "6.2,")
    with pytest.raises(UpstrokeError, match="u for some values and not for others"):
        result_of(tmp_path, text)


def test_u_taken_from_scatter_is_said_and_needs_points(tmp_path):
    bare = THICKNESS.replace(",0.2,nm", ",,nm").replace("16.2", "16.5")
    result = result_of(tmp_path, bare)
    assert any("scatter" in w for w in result.warnings)
    assert result.kinds[0].lack_of_fit is None
    few = "\n".join(bare.splitlines()[:4])
    with pytest.raises(UpstrokeError, match="too few to take it from their scatter"):
        result_of(tmp_path, few)


def test_capacitance_counts_pinholes(tmp_path):
    # C = (1 - f) C_film + f C_bare with f = 2 % and 20 layers: by hand
    rise = 2.5e-9 / (EPSILON_0 * 2.6) * 1e-2  # cm^2/µF
    bare, f = 10.0, 0.02
    film = 1 / (1 / bare + 20 * rise)
    now = (1 - f) * film + f * bare
    text = (
        "kind,layers,value,u,unit,permittivity,roughness\n"
        f"interfacial_capacitance,0,{bare},0.05,µF/cm^2,2.6 ± 0.02,1\n"
        f"interfacial_capacitance,20,{now},0.002,µF/cm^2,,\n"
        "blocking_test,0,100,1,µA,,\nblocking_test,20,3,0.1,µA,,\n"
    )
    result = result_of(tmp_path, text)
    found = {p.source: p for p in result.pinholes}
    capacitance = found["interfacial capacitance"]
    assert capacitance.fraction.value == pytest.approx(f, rel=1e-6)
    assert capacitance.fraction.u < f
    blocking = found["blocking test"]
    assert blocking.fraction.value == pytest.approx(0.03)
    assert blocking.fraction.u == pytest.approx(0.03 * math.hypot(0.01, 0.1 / 3))
    assert "tunnelling" in blocking.note


def test_blocking_by_resistance_is_the_other_way_round(tmp_path):
    text = "kind,layers,value,u,unit\nblocking_test,0,100,1,ohm\nblocking_test,20,5,0.1,kohm\n"
    result = result_of(tmp_path, text + THICKNESS.split("\n", 1)[1])
    assert result.pinholes[0].fraction.value == pytest.approx(0.02)
    with pytest.raises(UpstrokeError, match="no value for the bare electrode"):
        result_of(tmp_path, "kind,layers,value,u,unit\nblocking_test,20,5,0.1,kohm\n")


def test_a_log_without_film_is_said(tmp_path):
    with pytest.raises(UpstrokeError, match="laid down no film"):
        result_of(tmp_path, THICKNESS, ledger(ratio=0.0))


def test_figure_draws_the_result(tmp_path):
    result = result_of(tmp_path, all_kinds(bend_after=("frequency", 8)))
    figure = draw_evidence(result)
    axes = figure.axes
    assert len(axes) == len(result.kinds) + 1
    for axis, kind in zip(axes, result.kinds, strict=False):
        drawn = [
            line.get_xdata() for line in axis.get_lines() if len(line.get_xdata()) == len(kind.x)
        ]
        assert any(np.allclose(x, kind.x) for x in drawn), kind.kind
        assert axis.get_xlabel()
        assert axis.get_ylabel()
    bent = next(a for a, k in zip(axes, result.kinds, strict=False) if k.bend is not None)
    assert any("bends after stroke" in t.get_text() for t in bent.texts)
    assert figure_bytes(figure, "png").startswith(b"\x89PNG")
