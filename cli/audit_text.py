"""The printed form of an audit: one page to file with the sample."""

from __future__ import annotations

from itertools import groupby

from cli.evidence_text import evidence_block
from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    hanging,
    heading,
    join_blocks,
    paragraph,
    source_block,
    table,
)
from cli.transfer_text import summary_block
from transfer.audit import AuditResult
from transfer.audit_finding import Finding

__all__ = ["audit_text"]

RULES = [
    Column("rule"),
    Column("pass", "right"),
    Column("fail", "right"),
    Column("undecided", "right"),
]


def audit_text(result: AuditResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    built = result.result
    blocks = [
        heading(built.title or "Audit", width),
        source_block(built.source, width),
        paragraph(_verdict(result), width),
        _rules(result.findings, width),
    ]
    detail = [*result.failed, *result.undecided]
    if detail:
        blocks.append(_findings(detail, width))
    if result.to_decide:
        blocks.append(f"To decide what is undecided\n{bullets(result.to_decide, width)}")
    blocks.append(summary_block(built, width))
    if result.evidence is not None:
        blocks.append(evidence_block(result.evidence, width))
    blocks.append(paragraph(COVERAGE_NOTE, width))
    warnings = [*built.warnings, *(result.evidence.warnings if result.evidence else ())]
    if warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(warnings, width)}")
    return join_blocks(blocks)


def _verdict(result: AuditResult) -> str:
    said = {"accept": "ACCEPTED", "reject": "REJECTED"}[result.verdict]
    failed, open_ = len(result.failed), len(result.undecided)
    parts = [f"{said}: {len(result.findings)} checks, {failed} failed, {open_} undecided."]
    if result.verdict == "accept" and open_:
        parts.append("Nothing fails, but not everything is shown to pass.")
    return " ".join(parts)


def _rules(findings: tuple[Finding, ...], width: int) -> str:
    rows = []
    for rule, group in groupby(findings, key=lambda f: f.rule):
        statuses = [f.status for f in group]
        counts = [statuses.count(status) for status in ("pass", "fail", "undecided")]
        rows.append([rule, *(str(count) if count else "" for count in counts)])
    return table(RULES, rows, width)


def _findings(findings: list[Finding], width: int) -> str:
    """One line for every rule, limit and status, however many strokes it concerns."""
    groups: dict[tuple[str, str, str], list[Finding]] = {}
    for finding in findings:
        groups.setdefault((finding.status, finding.rule, finding.allowed), []).append(finding)
    lines = []
    for (status, rule, allowed), group in groups.items():
        numbers = [f.stroke for f in group if f.stroke is not None]
        many = "strokes" if len(numbers) > 1 else "stroke"
        where = f"{rule}, {many} {_ranges(numbers)}" if numbers else rule
        found = group[0].found if len(group) == 1 else f"{group[0].found}, …"
        text = f"{status}: {where}: found {found}; allowed {allowed}"
        lines.append(hanging(text, width, indent=2))
    return "\n".join(lines)


def _ranges(numbers: list[int]) -> str:
    """1, 2, 3, 7 as "1–3, 7"."""
    parts: list[list[int]] = []
    for number in sorted(numbers):
        if parts and number == parts[-1][-1] + 1:
            parts[-1].append(number)
        else:
            parts.append([number])
    return ", ".join(f"{p[0]}–{p[-1]}" if len(p) > 1 else str(p[0]) for p in parts)
