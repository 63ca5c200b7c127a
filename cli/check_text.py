"""The printed form of a check before spreading, and its rows."""

from __future__ import annotations

from typing import Any

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    hanging,
    heading,
    join_blocks,
    paragraph,
    plain_number,
    pretty_unit,
    source_block,
    table,
    with_unit,
)
from isotherm.check_result import CheckItem, CheckResult

__all__ = ["check_rows", "check_text"]

ITEMS = [Column("item"), Column("found ± U", "sign"), Column("limit"), Column("verdict")]
WHAT_NOW = {
    "pass": "Nothing speaks against spreading.",
    "undecided": "Not every item can be judged; the notes say what was found.",
    "fail": "Mend what fails before spreading.",
}


def check_text(result: CheckResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [heading(result.title or "Check before spreading", width)]
    blocks += [source_block(source, width) for source in result.sources]
    title = heading(f"Verdict: {result.verdict}", width)
    blocks.append(f"{title}\n{paragraph(WHAT_NOW.get(result.verdict, ''), width)}")
    several = len({item.record for item in result.items}) > 1
    blocks.append(table(ITEMS, [_cells(item) for item in result.items], width))
    blocks.append("\n".join(_note(item, several, width) for item in result.items if item.note))
    blocks.append(
        paragraph(
            "pass: within the limit with U; fail: beyond it with U; undecided: between. "
            f"{COVERAGE_NOTE}",
            width,
        )
    )
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _cells(item: CheckItem) -> list[str]:
    limit = ""
    if item.limit is not None:
        limit = f"{plain_number(item.limit)} {pretty_unit(item.value.unit)}".rstrip()
        limit += f", {item.limit_from}" if item.limit_from else ""
    return [item.name, with_unit(item.value), limit, item.verdict]


def _note(item: CheckItem, several: bool, width: int) -> str:
    where = f" ({item.record})" if several and item.record else ""
    return hanging(f"{item.name}{where}: {item.note}", width, indent=2)


def check_rows(result: CheckResult) -> list[dict[str, Any]]:
    """Return one row for each item; u is the standard uncertainty."""
    return [
        {
            "record": item.record,
            "item": item.name,
            "value": item.value.value,
            "u": item.value.u,
            "unit": item.value.unit,
            "limit": item.limit,
            "limit_from": item.limit_from,
            "verdict": item.verdict,
            "note": item.note,
        }
        for item in result.items
    ]
