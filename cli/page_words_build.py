"""What a build answers: strokes, layers, verdict and evidence, in facts and tables."""

from __future__ import annotations

from typing import Any

from cli.page_blocks import Fact, Table, quantity_text, told

__all__ = ["audit_answer", "audit_tables", "transfer_answer", "transfer_tables"]


def transfer_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return what the strokes say together."""
    kind = payload["type"] or "cannot be told"
    decided = payload.get("deposition", {}).get("decided", True)
    facts = [Fact("deposition type", kind, "" if decided else "within its uncertainty another")]
    facts.append(Fact("layers", quantity_text(payload["layers"]), f"{_count(payload)} strokes"))
    for label, key in (
        ("thickness", "thickness"),
        ("mass per area", "mass_per_area"),
        ("molecules per area", "surface_density"),
    ):
        if payload.get(key):
            facts.append(Fact(label, quantity_text(payload[key])))
    for way in ("down", "up"):
        mean = payload.get("deposition", {}).get(way)
        if mean:
            facts.append(Fact(f"ratio, {way}-strokes", quantity_text(mean)))
    drift = payload.get("drift") or {}
    if drift.get("slope_per_stroke"):
        changes = drift.get("changes_after_stroke") or []
        remark = f"changes after stroke {told(changes)}" if changes else "no sudden change"
        facts.append(
            Fact(
                "drift of the ratio",
                quantity_text(drift["slope_per_stroke"]) + " per stroke",
                remark,
            )
        )
    return facts


def _count(payload: dict[str, Any]) -> int:
    return len(payload["strokes"])


def transfer_tables(payload: dict[str, Any]) -> list[Table]:
    """Return the strokes and the ledger."""
    rows = tuple(
        (
            f"{s['number']}",
            s["direction"],
            told(s["ratio"]),
            "–" if s["ratio_uncorrected"] is None else f"{s['ratio_uncorrected']:.3f}",
            told(s["coated_area"]),
            f"{s['pressure_mean']:.2f}",
            "; ".join(s["flags"]),
        )
        for s in payload["strokes"]
    )
    columns = ("stroke", "way", "ratio", "raw", "coated", "mean Π, mN/m", "remarks")
    tables = [Table("Strokes", columns, rows)]
    ledger = (payload.get("stack") or {}).get("ledger") or []
    if ledger:
        tables.append(
            Table(
                "Ledger",
                ("after stroke", "film", "turned to the substrate", "layers so far"),
                tuple(
                    (
                        f"{item['stroke']}",
                        told(item["film"]),
                        told(item["faces_substrate"]),
                        told(item["layers_so_far"]),
                    )
                    for item in ledger
                ),
            )
        )
    return tables


def audit_answer(payload: dict[str, Any]) -> list[Fact]:
    """Return the verdict first, then what the strokes and the evidence say."""
    findings = payload.get("findings") or []
    remark = "nothing outside its limits" if not findings else f"{len(findings)} finding(s)"
    facts = [Fact("verdict", told(payload.get("verdict")), remark)]
    if payload.get("strokes"):
        facts += transfer_answer(payload)
    for item in payload.get("evidence") or []:
        agrees = "agrees with the ratios" if item.get("consistent") else "does not agree"
        name = item.get("label") or item.get("kind")
        facts.append(Fact(f"layers by {name}", told(item.get("layers")), agrees))
    joint = payload.get("evidence_joint")
    if joint and joint.get("layers"):
        facts.append(Fact("layers, all together", told(joint["layers"]), told(joint["statement"])))
    return facts


def audit_tables(payload: dict[str, Any]) -> list[Table]:
    """Return the findings, then the strokes."""
    tables = []
    findings = payload.get("findings") or []
    if findings:
        rows = tuple(
            (
                told(f.get("stroke")),
                told(f.get("rule")),
                told(f.get("found")),
                told(f.get("allowed")),
            )
            for f in findings
        )
        tables.append(Table("Findings", ("stroke", "rule", "found", "allowed"), rows))
    evidence = payload.get("evidence") or []
    if evidence:
        lines = tuple(
            (
                told(e.get("label") or e.get("kind")),
                told(e.get("layers")),
                told(e.get("increment_per_layer")),
                told(e.get("expected_per_layer")),
                "yes" if e.get("consistent") else "no",
                told(e.get("reason")),
            )
            for e in evidence
        )
        columns = ("evidence", "layers", "per layer", "expected per layer", "consistent", "because")
        tables.append(Table("Evidence", columns, lines))
    return tables + (transfer_tables(payload) if payload.get("strokes") else [])
