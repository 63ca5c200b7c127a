"""Small builds made up for the audit: strokes, the sheet and result they lie in, rows of a plan."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import numpy as np

from isotherm.quantity import Quantity
from isotherm.sheet import Dipping, RunSheet, Stack, Trough
from transfer.audit_finding import AuditContext, Finding
from transfer.result import Deposition, Drift, Stroke


def stroke(number: int, direction: str = "down", ratio: float | None = 1.0, **more: Any) -> Stroke:
    """Ten square centimetres coated, ratio ± 0.01 (u), 30 mN/m, 0.1 mm/s, one minute long."""
    taken = Quantity(10.0 * (ratio or 0.0), 0.1, "cm^2")
    told = None if ratio is None else Quantity(ratio, 0.01, "1")
    given: dict[str, Any] = {
        "start_s": 100.0 * number,
        "end_s": 100.0 * number + 60.0,
        "pressure_mean": 30.0,
        "pressure_sd": 0.02,
        "speed_mm_per_s": 0.1,
        "ratio_uncorrected": ratio,
        "budget": {"dwells": 0.002, "contact": 0.009},
        **more,
    }
    return Stroke(number, direction, coated_area=Quantity(10.0, 0.02, "cm^2"), film_removed=taken,
                  ratio=told, **given)  # fmt: skip


def strokes(ways: str, ratio: float = 1.0) -> tuple[Stroke, ...]:
    return tuple(stroke(k, {"d": "down", "u": "up"}[w], ratio) for k, w in enumerate(ways, 1))


def context(made: tuple[Stroke, ...] = (), **more: Any) -> AuditContext:
    """Context of some strokes: `design`, `dipping`, `trough` go into the sheet, the rest into the result."""
    sheet = RunSheet(
        stack=more.pop("design", Stack()),
        dipping=more.pop("dipping", Dipping()),
        trough=more.pop("trough", Trough()),
    )
    plan, evidence = more.pop("plan", ()), more.pop("evidence", None)
    result = {
        "strokes": made,
        "renewals": (),
        "unjudged": (),
        "deposition": Deposition(None, None, None, None, "", False),
        "drift": Drift(None, None, (), len(made)),
        "stack": SimpleNamespace(layers=Quantity(0.0, 0.0, "1"), thickness=None),
        "ratio_covariance": np.eye(len(made)) * 1e-4,
        **more,
    }
    return AuditContext(SimpleNamespace(**result), sheet, plan, evidence)  # type: ignore[arg-type]


def said(findings: list[Finding]) -> list[tuple[int | None, str, str]]:
    return [(f.stroke, f.rule, f.status) for f in findings]


def row(number: int, direction: str | None = "down", area: float = 10.0) -> dict[str, Any]:
    return {"stroke": number, "direction": direction, "film_removed": {"value": area, "u": 0.1}}
