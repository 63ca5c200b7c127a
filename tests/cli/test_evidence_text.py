"""The printed form of evidence and expected numbers."""

import numpy as np

from cli.evidence_text import evidence_text, expected_block
from isotherm.quantity import Quantity
from transfer.evidence import assess
from transfer.evidence_ledger import FilmInputs, LedgerView
from transfer.evidence_read import read_evidence
from transfer.expected import contraction, expected_build, expected_design
from transfer.expected_stack import ExpectedStack

FILM = FilmInputs(
    "",
    Quantity(2.5, 0.025, "nm"),
    Quantity(284.48, None, "g/mol"),
    Quantity(0.2, 0.002, "nm^2"),
    Quantity(2.6, 0.05, "1"),
)
LEDGER = LedgerView(
    np.arange(1, 21), np.ones(20), np.eye(20) * 1e-4, ("",) * 20, (FILM,), np.ones(20, dtype=bool)
)


def result_of(tmp_path, factor):
    rows = ["kind,layers,value,u,unit"]
    for n in (2, 6, 10, 14, 20):
        rows.append(f"xray_thickness,{n},{2.5 * n},0.1,nm")
        rows.append(f"ellipsometric_thickness,{n},{2.5 * n * factor},0.2,nm")
    path = tmp_path / "e.csv"
    path.write_text("\n".join(rows), encoding="utf-8")
    return assess(read_evidence(path), LEDGER)


def test_the_verdict_is_in_the_text_and_fits_the_terminal(tmp_path):
    text = evidence_text(result_of(tmp_path, 1.3), 80)
    assert "Disagrees with the rest: ellipsometric thickness" in text
    assert "< 0.001  disagrees" in text
    assert "X-ray thickness" in text
    assert "best estimate" in text
    assert max(map(len, text.splitlines())) <= 80


def test_agreement_is_said(tmp_path):
    text = evidence_text(result_of(tmp_path, 1.0), 80)
    assert "All kinds agree with the transfer ratios." in text
    assert "disagrees" not in text


def test_expected_numbers(tmp_path):
    expected = ExpectedStack(
        expected_design((FILM,), 20),
        expected_build(LEDGER),
        None,
        contraction(
            Quantity(0.197, None, "nm^2"), Quantity(0.182, None, "nm^2"), Quantity(1.0, 0.01, "1")
        ),
    )
    text = expected_block(expected, 80)
    assert "50.0 ± 1.0" in text
    assert "transfer ratio of 1.082" in text
    assert "absorbance" not in text  # nothing said about it in the sheet
    assert max(map(len, text.splitlines())) <= 80
    assert expected_block(ExpectedStack(None, None, None, None), 80) == ""
