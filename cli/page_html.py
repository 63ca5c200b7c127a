"""Parts of a report page as HTML. Everything that came from a file is escaped here and nowhere else."""

from __future__ import annotations

import json
import re
from collections.abc import Iterable, Sequence
from html import escape
from typing import Any

from cli.page_blocks import Fact, Table, told
from cli.page_figure import Picture
from cli.page_methods import Method
from cli.terminal import printable

__all__ = [
    "facts_html",
    "inputs_html",
    "methods_html",
    "picture_html",
    "safe",
    "settings_html",
    "table_html",
    "warnings_html",
]

SHORT = 26  # signs of a cell that is not broken

HINT = (
    "Move over the figure, touch it, or give it the focus and use the arrow keys: left and right from "
    "point to point, up and down from curve to curve."
)


def safe(text: Any) -> str:
    """Return text that is text wherever it stands in a page: no markup, no control characters."""
    return escape(printable(str(text)), quote=True)


def facts_html(facts: Sequence[Fact]) -> str:
    """Return the answer."""
    parts = []
    for fact in facts:
        remark = f'<span class="remark">{safe(fact.remark)}</span>' if fact.remark else ""
        parts.append(
            f'<div class="fact"><dt>{safe(fact.label)}</dt><dd>{safe(fact.value)}{remark}</dd></div>'
        )
    return f'<dl class="facts">{"".join(parts)}</dl>' if parts else ""


def table_html(table: Table) -> str:
    """Return a table, in a frame of its own that scrolls where the page is too narrow."""
    if not table.rows:
        return ""
    head = "".join(f'<th scope="col">{safe(c)}</th>' for c in table.columns)
    body = []
    for row in table.rows:
        first = f'<th scope="row">{safe(row[0])}</th>'
        body.append(f"<tr>{first}{''.join(_cell(c) for c in row[1:])}</tr>")
    return (
        f'<div class="scroll" role="region" tabindex="0" aria-label="{safe(table.caption)}"><table>'
        f"<caption>{safe(table.caption)}</caption><thead><tr>{head}</tr></thead>"
        f"<tbody>{''.join(body)}</tbody></table></div>"
    )


def _cell(text: str) -> str:
    # a number and its uncertainty stay on one line
    kind = ' class="short"' if len(text) <= SHORT else ""
    return f"<td{kind}>{safe(text)}</td>"


def picture_html(picture: Picture, name: str, *, only_on_screen: bool) -> str:
    """Return a figure with what can be read off it.

    Parameters
    ----------
    picture : Picture
    name : str
        Unique in the page; goes before every name inside the drawing.
    only_on_screen : bool
        Whether another figure shows the same on paper.
    """
    kind = "narrow" if picture.narrow else "wide"
    kind += " cursor" if picture.cursor else ""
    kind += " on-screen" if only_on_screen else ""
    # `<` cannot stand in a script element: `</script` would end it
    data = json.dumps(picture.data(), ensure_ascii=True, separators=(",", ":"))
    data = data.replace("<", "\\u003c")
    caption = safe(picture.caption)
    plot = (
        f'<div class="plot" tabindex="0" role="group" aria-label="{caption} Use the arrow keys." '
        f'data-points="{name}-points" data-said="{name}-said">{_named(picture.svg, name, caption)}</div>'
    )
    if not picture.narrow:
        plot = f'<div class="scroll">{plot}</div>'
    said = f'<output id="{name}-said" aria-live="polite">{HINT}</output>' if picture.series else ""
    return (
        f'<figure class="{kind}">{plot}{said}<figcaption>{caption}</figcaption>'
        f'<script type="application/json" id="{name}-points">{data}</script></figure>'
    )


def _named(svg: str, name: str, caption: str) -> str:
    """Give the drawing a role and a name, and its parts names of their own in the page."""
    for before in (' id="', ' href="#', "url(#"):
        svg = svg.replace(before, f"{before}{name}-")
    return svg.replace("<svg", f'<svg role="img" aria-label="{caption}"', 1)


def warnings_html(warnings: Sequence[str], level: int) -> str:
    """Return what was assumed, or that nothing was."""
    if not warnings:
        return '<p class="note">No warnings.</p>'
    items = "".join(f"<li>{safe(text)}</li>" for text in warnings)
    return (
        f'<div class="warnings" role="note" aria-label="Warnings"><h{level}>Warnings</h{level}>'
        f"<ul>{items}</ul></div>"
    )


def methods_html(methods: Iterable[Method]) -> str:
    """Return how the numbers were obtained, with the sources."""
    parts = [
        f"<dt>{safe(m.name)}</dt><dd>{_formulae(safe(m.text))} "
        f'<span class="from">Source: {_formulae(safe(m.source))}</span></dd>'
        for m in methods
    ]
    return (
        "<details open><summary>Relations and sources</summary>"
        f'<dl class="methods">{"".join(parts)}</dl></details>'
    )


def _formulae(escaped: str) -> str:
    """Set A_t and x^1.256 as print does."""
    low = re.sub(r"(?<=\w)_([A-Za-z0-9]+)", r"<sub>\1</sub>", escaped)
    return re.sub(r"\^(-?[\d.]*\d|x)", r"<sup>\1</sup>", low)


def inputs_html(inputs: Sequence[tuple[str, str, str]]) -> str:
    """Return the files that were read, each with its hash and a remark."""
    if not inputs:
        return ""
    items = []
    for path, digest, remark in inputs:
        said = f", {safe(remark)}" if remark else ""
        items.append(f"<li><b>{safe(path)}</b>{said}<br>SHA-256 <code>{safe(digest)}</code></li>")
    return f'<p class="caption">Inputs</p><ul class="inputs">{"".join(items)}</ul>'


def settings_html(payload: dict[str, Any]) -> str:
    """Return settings and versions."""
    rows = [
        (key.replace("_", " "), told(value))
        for key, value in (payload.get("settings") or {}).items()
        if not isinstance(value, dict) and not _of_dicts(value)
    ]
    versions = payload.get("versions") or {}
    rows += [(f"version of {name}", told(value)) for name, value in versions.items()]
    shown = tuple(row for row in rows if row[1] != "–")
    return table_html(Table("Settings and versions", ("what", "value"), shown))


def _of_dicts(value: Any) -> bool:
    return isinstance(value, list) and bool(value) and isinstance(value[0], dict)
