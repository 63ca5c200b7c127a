"""Every audit rule says its default, its reason and both examples, and judges the demonstration."""

from pathlib import Path
from types import ModuleType

import pytest

from isotherm.quantity import Quantity
from isotherm.sheet_read import read_sheet
from transfer import audit as audit_module
from transfer.analysis import analyse_log
from transfer.audit import AuditResult, audit
from transfer.audit_finding import judge_between
from transfer.log import read_log

DEMO = Path(__file__).resolve().parents[2] / "demo"


@pytest.fixture(scope="module", params=["good", "failing"])
def judged(request: pytest.FixtureRequest) -> tuple[str, AuditResult]:
    name = request.param
    log = {"good": "build_good.txt", "failing": "build_failing.csv"}[name]
    sheet = read_sheet(DEMO / f"build_{name}.toml")
    return name, audit(analyse_log(read_log(DEMO / log, sheet), sheet), sheet)


@pytest.mark.parametrize("rule", audit_module._RULES, ids=lambda r: r.__name__)
def test_a_rule_says_default_reason_and_examples(rule: ModuleType) -> None:
    text = (rule.check.__doc__ or "").lower()
    for word in ("default", "reason", "pass", "fail"):
        assert word in text, word


@pytest.mark.parametrize(
    ("value", "u", "status"),
    [
        (1.00, 0.01, "pass"),
        (0.90, 0.01, "fail"),
        (0.96, 0.01, "undecided"),
        (0.94, 0.01, "undecided"),
        (1.10, 0.01, "fail"),
    ],
)
def test_a_value_that_straddles_its_limit_is_undecided(value: float, u: float, status: str) -> None:
    finding = judge_between("ratio", Quantity(value, u, "1"), 0.95, 1.05, decide="longer dwells")
    assert finding.status == status


def test_the_demonstration_is_judged(judged: tuple[str, AuditResult]) -> None:
    name, result = judged
    assert result.verdict == {"good": "accept", "failing": "reject"}[name]
    rules = {f.rule for f in result.failed}
    if name == "good":
        assert not rules
    else:
        assert {"transfer ratio", "mean ratio", "layers", "thickness", "sudden change"} <= rules
    assert all(f.decide for f in result.undecided)
