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
# ... but one at least must have taken this part of the area that passed: less may be creep put down wrongly.
_CLEAR_PART = 0.02
_LEAST_BINS = 4
# Difference of chi-squared, scaled to the best fit, at which the data decide the sign: odds beyond 1e4.
_DECIDED = 20.0
# Sheet and data disagree about the surface when they differ by more than this, mm, and by this many u: a
# meniscus of a millimetre or two moves where the film starts to go.
_AGREES = 0.5
_ODDS = 3.0
# Where nothing shows the contact, it is put at the end of the travel with this part of the travel as u: the
# edge is lifted clear by a few mm of some tens, or stays in the water (practice).
_UNSEEN_PART = 0.2
# Where the edge stays in the water, how far beyond the travel the surface is put, mm: any place does.
_BEYOND = 1.0


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
    clear = [c for c in curves if c.total > _CLEAR * c.u_total and c.reading.size >= _LEAST_BINS]
    if not any(_took(curve, geometry) for curve in clear):
        clear = []
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
        found, told = _against(search, reads, said_at, travel)
        warnings.extend(told)
        return Contact(reads, reads_from, said_at, "sheet", found, warnings=tuple(warnings))
    if search is None:
        end = travel[0] if reads == "depth" else travel[1]
        warnings.append(
            "no stroke took enough film to show where the edge meets the surface; the end of the "
            f"travel ({end:.2f} mm) was taken: give dipping.surface_at"
        )
        span = travel[1] - travel[0]
        doubtful = Quantity(end, _UNSEEN_PART * span, "mm")
        return Contact(reads, reads_from, doubtful, "assumed", warnings=tuple(warnings))
    if search.outside:
        # a sign that was only assumed may be the other one
        either = searches.values() if reads_from == "assumed" else (search,)
        at, told = _always_wet(reads, max(s.reach for s in either), geometry, travel)
        warnings.extend(told)
        return Contact(reads, reads_from, at, "data", always_wet=True, warnings=tuple(warnings))
    quantity = Quantity(search.at, search.u, "mm")
    warnings.append(
        f"surface contact found from where transfer starts: {search.at:.2f} mm "
        f"± {2 * search.u:.2f} mm (k = 2); the meniscus may shift it between strokes"
    )
    return Contact(reads, reads_from, quantity, "data", quantity, warnings=tuple(warnings))


def _against(
    search: ContactSearch | None, reads: str, said: Quantity, travel: tuple[float, float]
) -> tuple[Quantity | None, list[str]]:
    """What the data say beside the sheet's surface, and a warning where both cannot be true."""
    if search is None:
        return None, []
    if search.outside:
        in_air = said.value - travel[0] if reads == "depth" else travel[1] - said.value
        if in_air - search.reach > max(_AGREES, _ODDS * (said.u or 0.0)):
            return None, [
                f"film was taken over the whole travel, the sheet puts {in_air:.1f} mm of it in air; "
                "the sheet's reading was used: check dipping.surface_at"
            ]
        return None, []
    gap = abs(search.at - said.value)
    warnings = []
    if gap > max(_AGREES, _ODDS * float(np.hypot(search.u, said.u or 0.0))):
        warnings.append(
            f"transfer starts at {search.at:.2f} mm, the sheet puts the surface at "
            f"{said.value:.2f} mm; the sheet's reading was used"
        )
    return Quantity(search.at, search.u, "mm"), warnings


def _took(curve: RemovalCurve, geometry: Geometry) -> bool:
    """Whether a move took a part of the area that passed."""
    passed = float(geometry.coated(np.asarray([abs(curve.end - curve.start)]))[0])
    return curve.total > _CLEAR_PART * passed


def _always_wet(
    reads: str, reach: float, geometry: Geometry, travel: tuple[float, float]
) -> tuple[Quantity, list[str]]:
    """Stand-in for the contact of a substrate that stays in the water, and what to say of it.

    reach : mm of the travel, from its air end, that may lie in air. Only such a doubt, and a width that
    changes with height, make the place matter.
    """
    said = (
        "the film was taken over the whole travel: the lower edge was taken to stay in the water; "
        "give dipping.surface_at if it does not"
    )
    span = travel[1] - travel[0]
    beyond, u = _BEYOND, None
    warnings = []
    spare = float(geometry.heights[-1]) - span
    if np.ptp(geometry.perimeters) > 0 and spare > 0:
        # any part of the body may be the one that crosses: between lower edge and top at the surface
        beyond, u = 0.5 * spare, 0.5 * spare / float(np.sqrt(3.0))
        warnings.append(
            "the substrate's width changes with height and its immersion is not known: the coated "
            "areas are those of its middle, with a wide uncertainty; give dipping.surface_at"
        )
    if reach > 0.0:
        u = max(u or 0.0, 0.5 * (reach + beyond))
        said += f" (up to {reach:.1f} mm of the travel may lie in air: the data do not tell)"
    at = travel[0] - beyond if reads == "depth" else travel[1] + beyond
    return Quantity(at, u, "mm"), [said, *warnings]


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
