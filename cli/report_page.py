"""The dossier's page: every result in full, drawn again where its files are unchanged."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from cli.page import Section, page_bytes
from cli.page_figure import Picture, picture_of
from cli.page_html import facts_html, warnings_html
from cli.page_plots import isotherm_picture, result_pictures
from cli.report_join import UNFIT, Dossier, Entry
from isotherm.errors import UpstrokeError

__all__ = ["dossier_page"]


def dossier_page(dossier: Dossier) -> bytes:
    """Return the page of a dossier."""
    sections = []
    for entry in dossier.entries:
        remarks = {item.path: item.state for item in entry.inputs}
        name = f"{entry.kind.capitalize()}: {entry.title}"
        sections.append(Section(entry.payload, _pictures(entry), remarks, name))
    lead = facts_html(dossier.together) + warnings_html(dossier.warnings, 2)
    return page_bytes(sections, dossier.title, lead=lead)


def _pictures(entry: Entry) -> tuple[Picture, ...]:
    try:
        return result_pictures(entry.payload) or _again(entry)
    except (UpstrokeError, *UNFIT):
        # the numbers stand as they are; only the drawing cannot be made of them, or not from these files
        # any more, or not as the recorded settings say
        return ()


def _again(entry: Entry) -> tuple[Picture, ...]:
    """Read the inputs once more where they are unchanged, as the recorded settings say, and draw."""
    if entry.kind not in ("isotherm", "hold"):
        return ()
    if any(item.state != "unchanged" for item in entry.inputs):
        return ()
    from cli.inputs import load_sheet

    places = {item.path: item.found for item in entry.inputs}
    settings: dict[str, Any] = entry.payload.get("settings") or {}
    trace = places.get(entry.payload["source"]["path"])
    sheet = _place(places, settings.get("sheet"))
    if trace is None or (settings.get("sheet") and sheet is None):
        return ()
    run_sheet = load_sheet(sheet, settings.get("columns"))
    if entry.kind == "isotherm":
        from isotherm.analysis import analyse
        from isotherm.trace_read import read_trace

        result = analyse(read_trace(trace, run_sheet), at=tuple(settings.get("at") or ()))
        return (isotherm_picture(result, run_sheet),)
    from isotherm.hold import analyse_hold
    from isotherm.hold_figure import figure_hold
    from isotherm.hold_read import read_hold

    if settings.get("check"):
        return ()
    held = analyse_hold(read_hold(trace, run_sheet), run_sheet, settings.get("over_s"))
    caption = "The drifting quantity, the laws fitted to it, and what they leave over."
    return (picture_of(figure_hold(held), caption),)


def _place(places: dict[str, Path | None], stamp: Any) -> Path | None:
    return places.get(stamp["path"]) if isinstance(stamp, dict) and "path" in stamp else None
