"""Which way the dipper reads, and at which reading the lower edge touches the water."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet
from transfer.contact_search import ContactSearch, chi_squared, search_contact
from transfer.geometry import Geometry
from transfer.ratio_curves import RemovalCurve

__all__ = ["Contact", "find_contact", "immersion"]

FloatArray = NDArray[np.float64]

# Moves that took clearly more film than noise carry the search; more of them than this add nothing.
_MOST_MOVES = 16
_CLEAR = 8.0
# Difference of chi-squared, scaled to the best fit, at which the data decide the sign: odds beyond 1e4.
_DECIDED = 20.0


@dataclass(frozen=True)
class Contact:
    """reads: "depth" or "height"; at: reading (mm) at which the lower edge touches, None: never leaves.

    reads_from, at_from: "sheet", "data" or "assumed". found: what the data say where the sheet was used.
    """

    reads: str
    reads_from: str
    at: Quantity | None
    at_from: str
    found: Quantity | None = None
    always_wet: bool = False
    warnings: tuple[str, ...] = ()


def immersion(contact: Contact, reading: FloatArray) -> FloatArray:
    """Immersion of the lower edge, mm, negative in air, at dipper readings (mm)."""
    sign = 1.0 if contact.reads == "depth" else -1.0
    zero = contact.at.value if contact.at is not None else 0.0
    return np.asarray(sign * (np.asarray(reading) - zero), dtype=np.float64)


def find_contact(
    curves: list[RemovalCurve], geometry: Geometry, sheet: RunSheet, travel: tuple[float, float]
) -> Contact:
    """Settle sign and surface contact from the sheet, else from where transfer starts and ends.

    Film goes only while substrate crosses the surface: the reading beyond which nothing more is taken, on
    the way down as on the way up, is the contact. All clear strokes share it; each has its own ratio.

    Parameters
    ----------
    curves : list of RemovalCurve
    geometry : Geometry
    sheet : RunSheet
        dipping.position_reads, dipping.surface_at, stack.first_stroke.
    travel : (lowest, highest) reading of the log, mm.

    Returns
    -------
    Contact
    """
    said_reads, said_at = sheet.dipping.position_reads, sheet.dipping.surface_at
    clear = [c for c in curves if c.total > _CLEAR * c.u_total and c.reading.size >= 4]
    clear.sort(key=lambda c: -c.total / c.u_total)
    clear = clear[:_MOST_MOVES]
    searches: dict[str, ContactSearch] = {}
    if clear:
        signs = (said_reads,) if said_reads in ("depth", "height") else ("depth", "height")
        searches = search_contact(clear, geometry, travel, signs)
    reads, reads_from, warnings = _sign(
        said_reads, said_at, searches, clear, geometry, sheet, travel
    )
    search = searches.get(reads)
    if said_at is not None:
        found = None
        if search is not None and not search.outside:
            found = Quantity(search.at, search.u, "mm")
            gap = abs(search.at - said_at.value)
            if gap > 3.0 * float(np.hypot(search.u, said_at.u or 0.0)) and gap > 0.5:
                warnings.append(
                    f"transfer starts at {search.at:.2f} mm, the sheet puts the surface at "
                    f"{said_at.value:.2f} mm; the sheet's reading was used"
                )
        return Contact(reads, reads_from, said_at, "sheet", found, warnings=tuple(warnings))
    if search is None:
        end = travel[0] if reads == "depth" else travel[1]
        warnings.append(
            "no stroke took enough film to show where the edge meets the surface; the end of the "
            f"travel ({end:.2f} mm) was taken: give dipping.surface_at"
        )
        span = travel[1] - travel[0]
        doubtful = Quantity(end, 0.1 * span, "mm")
        return Contact(reads, reads_from, doubtful, "assumed", warnings=tuple(warnings))
    if search.outside:
        warnings.append(
            "the film was taken over the whole travel: the lower edge was taken to stay in the water; "
            "give dipping.surface_at if it does not"
        )
        beyond = 1.0
        at = travel[0] - beyond if reads == "depth" else travel[1] + beyond
        quantity = Quantity(at, None, "mm")
        return Contact(
            reads, reads_from, quantity, "data", always_wet=True, warnings=tuple(warnings)
        )
    quantity = Quantity(search.at, search.u, "mm")
    warnings.append(
        f"surface contact found from where transfer starts: {search.at:.2f} mm "
        f"± {2 * search.u:.2f} mm (k = 2); the meniscus may shift it between strokes"
    )
    return Contact(reads, reads_from, quantity, "data", quantity, warnings=tuple(warnings))


def _sign(
    said: str | None,
    said_at: Quantity | None,
    searches: dict[str, ContactSearch],
    clear: list[RemovalCurve],
    geometry: Geometry,
    sheet: RunSheet,
    travel: tuple[float, float],
) -> tuple[str, str, list[str]]:
    """Depth or height: the sheet's word, else what the data say, else the design, else depth."""
    if said in ("depth", "height"):
        return said, "sheet", []
    if clear:
        if said_at is not None:
            score = {r: _score_at(clear, geometry, r, said_at.value) for r in ("depth", "height")}
        else:
            score = {r: s.score for r, s in searches.items()}
        better = min(score, key=lambda r: score[r])
        worse = "height" if better == "depth" else "depth"
        if score[worse] - score[better] > _DECIDED:
            why = "film is taken only on that side of the surface"
            return better, "data", [f"position_reads not given: the reading is a {better} ({why})"]
    if said_at is not None:
        below, above = said_at.value - travel[0], travel[1] - said_at.value
        if max(below, above) > 2.0 * max(0.0, min(below, above)):
            reads = "depth" if above > below else "height"
            return (
                reads,
                "assumed",
                [
                    f"position_reads not given: the reading was taken for a {reads}, since most of the "
                    "travel lies on that side of the surface; give dipping.position_reads"
                ],
            )
    first = sheet.stack.first_stroke
    if first and clear:
        earliest = min(clear, key=lambda c: c.move)
        rising = earliest.end > earliest.start
        reads = "depth" if rising == (first == "down") else "height"
        return (
            reads,
            "assumed",
            [
                f"position_reads not given and the data do not tell: taken for a {reads}, so that the "
                f"first stroke goes {first} as designed; give dipping.position_reads"
            ],
        )
    return (
        "depth",
        "assumed",
        [
            "position_reads not given and the data do not tell: taken for a depth (growing as the "
            "substrate goes down); give dipping.position_reads"
        ],
    )


def _score_at(curves: list[RemovalCurve], geometry: Geometry, reads: str, at: float) -> float:
    """Scaled chi-squared of all moves for one sign and a known contact."""
    grid = np.asarray([at])
    other = "height" if reads == "depth" else "depth"
    total = 0.0
    for curve in curves:
        mine = float(chi_squared(curve, geometry, reads, grid)[0])
        best = min(mine, float(chi_squared(curve, geometry, other, grid)[0]))
        total += min(mine / max(best / (curve.reading.size + 1), 1.0), 1e6)
    return total
