"""Compare what a method read from a log with the truth of that log."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from transfer_truth import StrokeTruth, Truth

__all__ = ["FoundStroke", "Match", "Reading", "StrokeError", "compare", "reading_from_json"]


@dataclass(frozen=True)
class FoundStroke:
    """A stroke as a method reports it; ratio and u are None where it would not judge."""

    start: float
    end: float
    direction: str
    ratio: float | None
    u: float | None
    flags: tuple[str, ...] = ()


@dataclass(frozen=True)
class Reading:
    """What a method says about one log. contact is (mm, u) or None; changes None: not looked for."""

    strokes: tuple[FoundStroke, ...]
    type: str | None = None
    changes: tuple[int, ...] | None = None
    renewals: tuple[tuple[float, float], ...] = ()
    contact: tuple[float, float | None] | None = None
    error: str = ""


@dataclass(frozen=True)
class StrokeError:
    """Error of one TR (found minus true), its u, and the coated area it stands on, cm^2."""

    number: int
    error: float
    u: float | None
    coated_area: float


@dataclass(frozen=True)
class Match:
    """Score of one log."""

    missed: tuple[int, ...]
    invented: tuple[int, ...]
    errors: tuple[StrokeError, ...]
    unjudged: int  # found and judgeable, but the method gave no ratio
    guessed: int  # not judgeable, yet given a ratio without a flag
    renewals_right: bool
    type_right: bool | None
    drop_located: bool | None
    invented_changes: int
    change_found: tuple[int, ...] = field(default=())

    @property
    def strokes_right(self) -> bool:
        """All strokes found, none invented."""
        return not self.missed and not self.invented


def _number(cell: Any) -> tuple[float | None, float | None]:
    if cell is None:
        return None, None
    if isinstance(cell, dict):
        return cell.get("value"), cell.get("u")
    return float(cell), None


def reading_from_json(out: dict[str, Any]) -> Reading:
    """Read the documented JSON of `upstroke transfer` (plus `drift` and `contact` where it has them)."""
    strokes = []
    for s in out["strokes"]:
        value, u = _number(s["ratio"])
        strokes.append(
            FoundStroke(s["start_s"], s["end_s"], s["direction"], value, u, tuple(s["flags"]))
        )
    drift = out.get("drift") or {}
    changes = drift.get("changes_after_stroke")
    place = out.get("contact") or {}
    searched = place.get("surface_at_from") == "data"
    where, where_u = _number(place.get("surface_at")) if searched else (None, None)
    return Reading(
        tuple(strokes),
        out["type"],
        None if changes is None else tuple(changes),
        tuple((r["from_s"], r["to_s"]) for r in out["renewals"]),
        None if where is None else (where, where_u),
    )


def _overlap(a: tuple[float, float], b: tuple[float, float]) -> float:
    return max(min(a[1], b[1]) - max(a[0], b[0]), 0.0)


def _is_same(found: FoundStroke, true: StrokeTruth, row: float) -> bool:
    """Same direction, most of the wet part covered, and not reaching far beyond the motion."""
    wet = max(true.wet_end - true.wet_start, 1e-9)
    covered = _overlap((found.start - row, found.end + row), (true.wet_start, true.wet_end)) / wet
    slack = 5.0 + 2.0 * row + 0.2 * (true.end - true.start)
    within = found.start > true.start - slack and found.end < true.end + slack
    return found.direction == true.direction and covered > 0.6 and within


def _renewals_right(reading: Reading, truth: Truth) -> bool:
    """Each true renewal is met by one found, and no found one lies after the first stroke elsewhere."""
    first = truth.strokes[0].start if truth.strokes else 0.0
    later = [r for r in reading.renewals if r[1] > first]
    met = all(any(_overlap(r, f) > 0.5 * (r[1] - r[0]) for f in later) for r in truth.renewals)
    idle = [f for f in later if not any(_overlap(r, f) > 0.0 for r in truth.renewals)]
    return met and not idle


def compare(reading: Reading, truth: Truth, row: float) -> Match:
    """Score one reading.

    Parameters
    ----------
    reading : Reading
    truth : Truth
    row : float
        Time between rows, s.
    """
    free = list(range(len(reading.strokes)))
    missed: list[int] = []
    errors: list[StrokeError] = []
    unjudged = guessed = 0
    for number, true in enumerate(truth.strokes, start=1):
        if not true.judgeable:
            near = [
                i
                for i in free
                if _overlap(
                    (reading.strokes[i].start, reading.strokes[i].end), (true.start, true.end)
                )
                > 0.0
                and reading.strokes[i].direction == true.direction
            ]
            guessed += true.flag_due and any(
                reading.strokes[i].ratio is not None and not reading.strokes[i].flags for i in near
            )
            free = [i for i in free if i not in near]
            continue
        hit = next((i for i in free if _is_same(reading.strokes[i], true, row)), None)
        if hit is None:
            missed.append(number)
            continue
        free.remove(hit)
        found = reading.strokes[hit]
        if found.ratio is None:
            unjudged += 1
        else:
            errors.append(StrokeError(number, found.ratio - true.ratio, found.u, true.coated_area))
    located: bool | None = None
    changes = reading.changes or ()
    if truth.drop_after is not None and reading.changes is not None and not missed:
        located = any(abs(c - truth.drop_after) <= 1 for c in changes)
    return Match(
        tuple(missed),
        tuple(free),
        tuple(errors),
        unjudged,
        guessed,
        _renewals_right(reading, truth),
        None if truth.type is None else reading.type == truth.type,
        located,
        len(changes) if truth.steady else 0,
        tuple(changes),
    )
