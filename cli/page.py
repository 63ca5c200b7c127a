"""The report page: one HTML file that needs no network, with the question, the answer and its reasons."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import cache
from importlib.resources import files
from typing import TYPE_CHECKING, Any

from cli import __version__
from cli.page_blocks import Table
from cli.page_figure import Picture, picture_of
from cli.page_html import (
    facts_html,
    inputs_html,
    methods_html,
    picture_html,
    safe,
    settings_html,
    table_html,
    warnings_html,
)
from cli.page_methods import methods_for
from cli.page_words import answer_of, kind_of, question_of, tables_of

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["Section", "one_page", "page_bytes", "section_html", "section_of"]

OBTAINED = "How each number was obtained"
COVERAGE = (
    "± is the expanded uncertainty U = 2u (k = 2, coverage about 95 %). Names of phases are customary; "
    "the modulus beside a name is the measurement."
)


@dataclass(frozen=True)
class Section:
    """One result on a page: its JSON form with provenance, its pictures, remarks on its inputs by path."""

    payload: dict[str, Any]
    pictures: tuple[Picture, ...] = ()
    remarks: dict[str, str] = field(default_factory=dict)
    name: str = ""

    @property
    def title(self) -> str:
        """What to call it: the run's own title, else its file."""
        payload = self.payload
        path = (payload.get("source") or {}).get("path") or payload.get("path") or ""
        file = str(path).replace("\\", "/").rpartition("/")[2]
        return str(self.name or payload.get("title") or file or kind_of(payload).capitalize())


def section_of(
    payload: dict[str, Any],
    figure: Figure | None = None,
    pictures: Sequence[Picture] = (),
    caption: str = "The result drawn, with what was found on it.",
) -> Section:
    """Put a result and its drawings together."""
    drawn = () if figure is None else (picture_of(figure, caption),)
    return Section(payload, (*pictures, *drawn))


def one_page(
    payload: dict[str, Any] | list[dict[str, Any]],
    figure: Callable[[], Figure] | None = None,
    pictures: Sequence[Sequence[Picture]] = (),
) -> bytes:
    """Return the page of one command.

    Parameters
    ----------
    payload : dict or list of dict
        The JSON form with provenance of the result or results.
    figure : callable, optional
        Draws the command's own figure; with several results it shows them all.
    pictures : sequence of sequences of Picture, optional
        Pictures of each result, put before the figure.
    """
    payloads = payload if isinstance(payload, list) else [payload]
    own = [tuple(p) for p in pictures] or [()] * len(payloads)
    sections = [Section(one, drawn) for one, drawn in zip(payloads, own, strict=True)]
    shared: tuple[Picture, ...] = ()
    if figure is not None:
        shared = (picture_of(figure(), "The result drawn, with what was found on it."),)
    if len(sections) == 1:
        sections = [Section(sections[0].payload, (*sections[0].pictures, *shared))]
        return page_bytes(sections, sections[0].title)
    kind = kind_of(payloads[0])
    return page_bytes(sections, f"{len(sections)} results: {kind}", shared)


def page_bytes(
    sections: Sequence[Section], title: str, shared: Sequence[Picture] = (), lead: str = ""
) -> bytes:
    """Return a page of one or more results.

    Parameters
    ----------
    sections : sequence of Section
        In the order they are read; with more than one, a list of contents goes before them.
    title : str
        Heading of the page.
    shared : sequence of Picture
        Drawings of all results together, put before them.
    lead : str
        HTML put under the heading.
    """
    several = len(sections) > 1
    parts = [lead]
    if several:
        items = "".join(
            f'<li><a href="#part-{n}">{safe(s.title)}</a></li>' for n, s in enumerate(sections, 1)
        )
        parts.append(f'<nav aria-label="Contents"><ol>{items}</ol></nav>')
    for n, picture in enumerate(shared, 1):
        parts.append(picture_html(picture, f"all-{n}", only_on_screen=False))
    for n, section in enumerate(sections, 1):
        parts.append(_article(section, n, several=several))
    kinds = dict.fromkeys(kind_of(s.payload) for s in sections)
    if several:
        used = dict.fromkeys(method for kind in kinds for method in methods_for(kind))
        parts.append(f"<section><h2>{OBTAINED}</h2>{methods_html(used)}</section>")
    script, style = _script(), _asset("page.css")
    # only this very script may run, whatever a file name, a title or a header tries
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    policy = (
        f"default-src 'none'; script-src 'sha256-{digest}'; style-src 'unsafe-inline'; img-src data:; "
        "base-uri 'none'; form-action 'none'"
    )
    html = f"""<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="{policy}">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="generator" content="upstroke {__version__}">
<link rel="icon" href="data:,">
<title>{safe(title)}</title>
<style>
{style}</style>
</head>
<body>
<a class="skip" href="#main">To the content</a>
<header>
<p>upstroke {safe(", ".join(kinds))}</p>
<h1>{safe(title)}</h1>
</header>
<main id="main">
{"".join(parts)}
</main>
<footer>
<p>{safe(COVERAGE)}</p>
<p>Made by upstroke {__version__}. This page is one file and loads nothing.</p>
</footer>
<script>{script}</script>
</body>
</html>
"""
    return html.encode("utf-8", "backslashreplace")


def section_html(payload: dict[str, Any]) -> str:
    """Return what a page says of one result, without pictures."""
    return _article(Section(payload), 1, several=False)


def _article(section: Section, number: int, *, several: bool) -> str:
    payload = section.payload
    level = 3 if several else 2

    def head(text: str) -> str:
        return f"<h{level}>{text}</h{level}>"

    wide = any(not picture.narrow for picture in section.pictures)
    pictures = "".join(
        picture_html(p, f"p{number}-{n}", only_on_screen=p.narrow and wide)
        for n, p in enumerate(section.pictures, 1)
    )
    parts = [
        f'<article id="part-{number}" aria-label="{safe(section.title)}">',
        f'<h2 class="title">{safe(section.title)}</h2>' if several else "",
        head("Question"),
        f'<p class="question">{safe(question_of(payload))}</p>',
        head("Answer"),
        facts_html(answer_of(payload)),
        warnings_html(_warnings(payload), level),
        head("Figure") + pictures if pictures else "",
        head("In numbers"),
        *(table_html(table) for table in tables_of(payload)),
        "" if several else head(OBTAINED) + methods_html(methods_for(kind_of(payload))),
        head("What it was made from"),
        inputs_html(_inputs(payload, section.remarks)),
        *(table_html(table) for table in _columns(payload)),
        settings_html(payload),
        "</article>",
    ]
    return "\n".join(part for part in parts if part)


def _columns(payload: dict[str, Any]) -> list[Table]:
    """What each column of the inputs was taken for."""
    tables = []
    for source in [payload.get("source"), *(payload.get("sources") or [])]:
        known = source.get("columns") if isinstance(source, dict) else None
        if not isinstance(source, dict) or not isinstance(known, dict) or not known:
            continue
        rows = sorted(
            (
                int(c.get("index") or 0),
                str(c.get("header")),
                role.replace("_", " "),
                str(c.get("unit")),
            )
            for role, c in known.items()
        )
        cells = tuple((f"{n}", *rest) for n, *rest in rows)
        caption = f"Columns of {source.get('path')}"
        tables.append(Table(caption, ("column", "header", "taken for", "unit"), cells))
    return tables


def _warnings(payload: dict[str, Any]) -> list[str]:
    """Every warning of a result, its own first, then those of its parts."""
    found = list(payload.get("warnings") or [])
    for branch in payload.get("branches") or []:
        name = f"{branch['direction']} {branch['cycle']}"
        found += [f"{name}: {text}" for text in branch.get("warnings") or []]
    for hold in payload.get("holds") or []:
        found += [f"hold {hold['number']}: {text}" for text in hold.get("warnings") or []]
    return [str(text) for text in dict.fromkeys(found)]


def _inputs(payload: dict[str, Any], remarks: dict[str, str]) -> list[tuple[str, str, str]]:
    """Every file a result names with its hash, each once."""
    found: dict[tuple[str, str], str] = {}

    def walk(value: Any) -> None:
        if isinstance(value, dict):
            if isinstance(value.get("path"), str) and isinstance(value.get("sha256"), str):
                rows = value.get("rows")
                remark = remarks.get(value["path"]) or (f"{rows:,} rows" if rows else "")
                key = (value["path"], value["sha256"])
                found[key] = found.get(key) or remark
            for item in value.values():
                walk(item)
        elif isinstance(value, list):
            for item in value:
                walk(item)

    for key in ("source", "sources", "settings", "evidence_source", "runs"):
        walk(payload.get(key))
    return [(path, digest, remark) for (path, digest), remark in found.items()]


@cache
def _asset(name: str) -> str:
    return files("cli").joinpath(name).read_text(encoding="utf-8")


def _script() -> str:
    return "\n" + _asset("page.js")
