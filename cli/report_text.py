"""The printed form of a dossier, and its rows."""

from __future__ import annotations

from typing import Any

from cli.page_blocks import Fact
from cli.render import Column, bullets, heading, join_blocks, paragraph, table
from cli.report_join import Dossier, Entry

__all__ = ["report_rows", "report_text"]

FACTS = [Column(""), Column("")]


def report_text(dossier: Dossier, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [heading(dossier.title, width)]
    if dossier.together:
        blocks.append(f"{heading('Together', width)}\n{_facts(dossier.together, width)}")
    for entry in dossier.entries:
        title = heading(f"{entry.kind.capitalize()}: {entry.title}", width)
        blocks.append(f"{title}\n{_facts(entry.answer, width)}\n{paragraph(_inputs(entry), width)}")
    blocks.append(paragraph("± is the expanded uncertainty U = 2u (coverage about 95 %).", width))
    if dossier.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(dossier.warnings, width)}")
    return join_blocks(blocks)


def _facts(facts: tuple[Fact, ...], width: int) -> str:
    return table(FACTS, [[f.label, _value(f)] for f in facts], width)


def _value(fact: Fact) -> str:
    return f"{fact.value} ({fact.remark})" if fact.remark else fact.value


def _inputs(entry: Entry) -> str:
    counts: dict[str, int] = {}
    for item in entry.inputs:
        counts[item.state] = counts.get(item.state, 0) + 1
    said = ", ".join(f"{number} {state}" for state, number in counts.items())
    warned = len(entry.payload.get("warnings") or [])
    return f"From {entry.path}; its inputs: {said or 'none named'}; {warned} warning(s)."


def report_rows(dossier: Dossier) -> list[dict[str, Any]]:
    """Return one row a fact."""
    return [
        {
            "kind": entry.kind,
            "title": entry.title,
            "result": str(entry.path),
            "what": fact.label,
            "value": fact.value,
            "remark": fact.remark,
        }
        for entry in dossier.entries
        for fact in entry.answer
    ]
