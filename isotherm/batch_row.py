"""One run as one row of a table that opens anywhere."""

from __future__ import annotations

from collections.abc import Sequence

from isotherm.quantity import Quantity
from isotherm.result import IsothermResult, Transition
from isotherm.series import Row, quantity_cells

__all__ = ["error_row", "summary_columns", "summary_row"]

_HEAD = ("path", "title", "error", "rows", "noise")
_FEATURES = (
    "zero_offset",
    "lift_off_area",
    "limiting_area",
    "coexistence_onset_area",
    "coexistence_onset_pressure",
    "coexistence_end_area",
    "coexistence_end_pressure",
    "kink_area",
    "kink_pressure",
    "collapse_area",
    "collapse_pressure",
    "highest_pressure",
    "modulus_max",
    "modulus_max_pressure",
)
_TAIL = ("coexistences", "kinks", "collapse_kind", "warnings")


def summary_columns(at: Sequence[float]) -> tuple[str, ...]:
    """The header of a batch: the same for every run, whatever was found in it.

    Parameters
    ----------
    at : sequence of float
        Pressures (mN/m) at which area and modulus are reported.
    """
    places = [f"{what}_at_{p:g}" for p in at for what in ("area", "modulus")]
    pairs = [cell for name in (*_FEATURES, *places) for cell in (name, f"u_{name}")]
    return (*_HEAD, *pairs, *_TAIL)


def summary_row(result: IsothermResult, at: Sequence[float]) -> Row:
    """The first compression of one run, the first transition of each kind; None where there is none."""
    branch = result.headline
    coexistence = _first(branch.transitions, "coexistence")
    kink = _first(branch.transitions, "kink")
    onset = coexistence.onset if coexistence else None
    end = coexistence.end if coexistence else None
    there = kink.at if kink else None
    collapse, stiffest = branch.collapse, branch.modulus_max
    found: dict[str, Quantity | None] = {
        "zero_offset": branch.zero_offset,
        "lift_off_area": branch.lift_off,
        "limiting_area": branch.limiting_area,
        "coexistence_onset_area": onset.area if onset else None,
        "coexistence_onset_pressure": onset.pressure if onset else None,
        "coexistence_end_area": end.area if end else None,
        "coexistence_end_pressure": end.pressure if end else None,
        "kink_area": there.area if there else None,
        "kink_pressure": there.pressure if there else None,
        "collapse_area": collapse.area if collapse else None,
        "collapse_pressure": collapse.pressure if collapse else None,
        "highest_pressure": branch.highest_pressure,
        "modulus_max": stiffest.modulus if stiffest else None,
        "modulus_max_pressure": stiffest.pressure if stiffest else None,
    }
    by_pressure = {a.pressure: a for a in branch.area_at}
    for pressure in at:
        place = by_pressure.get(pressure)
        found[f"area_at_{pressure:g}"] = place.area if place else None
        found[f"modulus_at_{pressure:g}"] = place.modulus if place else None
    row: Row = {
        "path": result.source.path,
        "title": result.title,
        "error": "",
        "rows": branch.rows,
        "noise": branch.noise,
    }
    for name, quantity in found.items():
        row.update(quantity_cells(name, quantity))
    row["coexistences"] = sum(t.kind == "coexistence" for t in branch.transitions)
    row["kinks"] = sum(t.kind == "kink" for t in branch.transitions)
    row["collapse_kind"] = collapse.kind if collapse else ""
    row["warnings"] = len(result.warnings) + len(branch.warnings)
    return row


def error_row(path: str, error: str, at: Sequence[float]) -> Row:
    """The row of a run that could not be analysed: its path and why."""
    row: Row = dict.fromkeys(summary_columns(at))
    row["path"], row["error"] = path, error
    return row


def _first(transitions: Sequence[Transition], kind: str) -> Transition | None:
    return next((t for t in transitions if t.kind == kind), None)
