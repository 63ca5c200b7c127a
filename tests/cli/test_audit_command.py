"""`upstroke audit` on the demonstration's builds."""

import json
from pathlib import Path

import pytest

from cli.audit_text import audit_text
from cli.main import run
from isotherm.sheet_read import read_sheet
from transfer.analysis import analyse_log
from transfer.audit import AuditResult, audit
from transfer.log import read_log

DEMO = Path(__file__).resolve().parents[2] / "demo"


def _audit(name: str, log: str) -> AuditResult:
    sheet = read_sheet(DEMO / f"build_{name}.toml")
    return audit(analyse_log(read_log(DEMO / log, sheet), sheet), sheet)


@pytest.fixture(scope="module")
def failing() -> AuditResult:
    return _audit("failing", "build_failing.csv")


def test_the_good_build_is_accepted(capsys: pytest.CaptureFixture[str]) -> None:
    good, sheet = str(DEMO / "build_good.txt"), str(DEMO / "build_good.toml")
    evidence = str(DEMO / "evidence_good.toml")
    assert run(["audit", good, "--sheet", sheet, "--evidence", evidence, "--json", "-"]) == 0
    out = json.loads(capsys.readouterr().out)
    assert out["verdict"] == "accept"
    assert out["schema"] == "upstroke.audit/1"
    assert {e["kind"] for e in out["evidence"]}
    assert all(e["consistent"] for e in out["evidence"])
    for name in ("drift", "thickness", "mass_per_area", "surface_density", "findings", "strokes"):
        assert name in out


def test_the_failing_build_is_rejected_with_3(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    log, sheet = str(DEMO / "build_failing.csv"), str(DEMO / "build_failing.toml")
    table = tmp_path / "checks.csv"
    assert run(["audit", log, "--sheet", sheet, "--csv", str(table)]) == 3
    text = capsys.readouterr().out
    assert "REJECTED" in text
    assert "11–20" in text
    rows = table.read_text(encoding="utf-8").splitlines()
    assert rows[0].startswith("stroke,rule,found,allowed,status")
    assert sum(",fail," in row for row in rows) >= 10


def test_findings_name_stroke_rule_found_and_allowed(failing: AuditResult) -> None:
    ratio = [f for f in failing.failed if f.rule == "transfer ratio"]
    assert [f.stroke for f in ratio] == list(range(11, 21))
    assert all(f.allowed == "0.95 to 1.05" for f in ratio)
    assert failing.to_json()["drift"]["changes_after_stroke"] == [10]


@pytest.mark.parametrize("width", [60, 80])
def test_the_page_fits_its_width(failing: AuditResult, width: int) -> None:
    lines = audit_text(failing, width).splitlines()
    assert max(map(len, lines)) <= width
    if width == 80:
        assert len(lines) <= 72  # a page of A4 at ten points holds about as many


def test_a_plan_must_be_a_target(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    plan = tmp_path / "plan.json"
    plan.write_text("[]", encoding="utf-8")
    log, sheet = str(DEMO / "build_good.txt"), str(DEMO / "build_good.toml")
    assert run(["audit", log, "--sheet", sheet, "--plan", str(plan)]) == 1
    assert "is not the result of upstroke target" in capsys.readouterr().err
