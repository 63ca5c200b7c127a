"""From moves to strokes: what crossed the surface, in one held film, from one dwell to the next."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from transfer.contact import Contact, immersion
from transfer.ratio_nodes import Nodes
from transfer.strokes_motion import Motion
from transfer.strokes_pressure import Pressure

__all__ = ["Passage", "Strokes", "Unjudged", "find_strokes"]

FloatArray = NDArray[np.float64]

# A stroke crosses at least this part of the log's travel, and this many mm; and more than the doubt about
# where the surface is.
_LEAST_PART = 0.02
_LEAST_MM = 0.3
_LEAST_U = 3.0
# A stroke that crosses less than this part of the usual one is called partial.
_PARTIAL_PART = 0.85
# A rest in air shorter than this part of the usual dwell is a pause on the way, not the end of a stroke.
_PAUSE_PART = 0.5


@dataclass(frozen=True)
class Passage:
    """One stroke: its moves, and the nodes (dwells or pauses) before, between and after them.

    shallow, deep: immersions of the lower edge (mm) that bound what crossed. start, end, paused: s.
    """

    direction: str
    moves: tuple[int, ...]
    nodes: tuple[int, ...]
    hold: int
    start: float
    end: float
    shallow: float
    deep: float
    flags: tuple[str, ...] = ()
    paused: float = 0.0


@dataclass(frozen=True)
class Unjudged:
    """The substrate crossed the surface while no film was held: not a stroke. start, end: s."""

    start: float
    end: float
    why: str


@dataclass(frozen=True)
class Strokes:
    """Passages in time order, crossings left out and why, and the number of moves in air or in water only."""

    passages: tuple[Passage, ...]
    unjudged: tuple[Unjudged, ...]
    idle_moves: int


def find_strokes(
    time: FloatArray, motion: Motion, held: Pressure, nodes: Nodes, contact: Contact
) -> Strokes:
    """Assemble strokes.

    Parameters
    ----------
    time : (n,) s.
    motion : Motion
    held : Pressure
    nodes : Nodes
    contact : Contact

    Returns
    -------
    Strokes
    """
    levels = np.asarray([rest.level for rest in motion.rests], dtype=np.float64)
    depth = np.maximum(immersion(contact, levels), 0.0)
    least = _least(motion, contact)
    where = {
        (int(r), int(h)): k for k, (r, h) in enumerate(zip(nodes.rest, nodes.hold, strict=True))
    }
    joins = _joins(time, motion)
    passages: list[Passage] = []
    unjudged: list[Unjudged] = []
    idle = 0
    for m, move in enumerate(motion.moves):
        change = depth[m + 1] - depth[m]
        if abs(change) < least:
            idle += 1
            _extend(passages, m, motion, nodes, where, held, joins)
            continue
        ends = _same_hold(m, nodes, where, held, move.first, move.last)
        if ends is None:
            unjudged.append(Unjudged(move.start, move.end, _why(held, move.first, move.last)))
            continue
        before, after, hold = ends
        direction = "down" if change > 0 else "up"
        shallow, deep = sorted((float(depth[m]), float(depth[m + 1])))
        shallow = _in_air(shallow, levels, m, m + 1, contact)
        if passages and passages[-1].moves[-1] == m - 1:
            last = passages[-1]
            if last.direction == direction and last.hold == hold and depth[m] > 0:
                passages[-1] = replace(
                    last,
                    moves=(*last.moves, m),
                    nodes=(*last.nodes, after),
                    end=move.end,
                    shallow=min(last.shallow, shallow),
                    deep=max(last.deep, deep),
                )
                continue
        moves: tuple[int, ...] = (m,)
        ends_at: tuple[int, ...] = (before, after)
        start = move.start
        lead = m - 1
        if lead >= 0 and joins[lead] and abs(depth[m] - depth[lead]) < least:
            # the stroke had begun in air and paused there
            led = _same_hold(lead, nodes, where, held, motion.moves[lead].first, move.last)
            if led is not None and led[2] == hold:
                moves, ends_at, start = (lead, m), (led[0], before, after), motion.moves[lead].start
        passages.append(Passage(direction, moves, ends_at, hold, start, move.end, shallow, deep))
    usual = float(np.median([p.deep - max(p.shallow, 0.0) for p in passages])) if passages else 0.0
    flagged = [_flag(p, time, motion, nodes, usual) for p in passages]
    return Strokes(tuple(flagged), tuple(unjudged), idle)


def _joins(time: FloatArray, motion: Motion) -> list[bool]:
    """Whether move m goes on as move m + 1: same way, after a rest short against the usual dwell."""
    levels = np.asarray([rest.level for rest in motion.rests], dtype=np.float64)
    way = np.sign(np.diff(levels))
    stay = np.asarray(
        [time[min(r.last, time.size - 1)] - time[min(r.first, time.size - 1)] for r in motion.rests]
    )
    turning = np.concatenate([[False], way[1:] != way[:-1], [False]])
    usual = float(np.median(stay[turning])) if turning.any() else 0.0
    return [
        bool(way[m] == way[m + 1] and stay[m + 1] < _PAUSE_PART * usual)
        for m in range(way.size - 1)
    ] + [False]


def _extend(
    passages: list[Passage],
    m: int,
    motion: Motion,
    nodes: Nodes,
    where: dict[tuple[int, int], int],
    held: Pressure,
    joins: list[bool],
) -> None:
    """Let a stroke that paused in air go on to where it stops."""
    if not passages or passages[-1].moves[-1] != m - 1 or not joins[m - 1]:
        return
    last = passages[-1]
    ends = _same_hold(m, nodes, where, held, motion.moves[m].first, motion.moves[m].last)
    if ends is None or ends[2] != last.hold:
        return
    passages[-1] = replace(
        last, moves=(*last.moves, m), nodes=(*last.nodes, ends[1]), end=motion.moves[m].end
    )


def _least(motion: Motion, contact: Contact) -> float:
    """Smallest change of immersion, mm, that is a stroke in this log."""
    levels = [rest.level for rest in motion.rests]
    travel = max(levels) - min(levels)
    u = (contact.at.u or 0.0) if contact.at is not None and contact.at_from == "data" else 0.0
    return max(_LEAST_PART * travel, _LEAST_MM, _LEAST_U * u)


def _in_air(shallow: float, levels: FloatArray, a: int, b: int, contact: Contact) -> float:
    """Give a bound at the surface its true (negative) immersion, so that a crossing edge is known."""
    if shallow > 0:
        return shallow
    return float(min(immersion(contact, levels[[a, b]]).min(), 0.0))


def _same_hold(
    move: int,
    nodes: Nodes,
    where: dict[tuple[int, int], int],
    held: Pressure,
    first: int,
    last: int,
) -> tuple[int, int, int] | None:
    """Nodes before and after a move that lie in one hold with it, or None."""
    for h, hold in enumerate(held.holds):
        if hold.first <= first + 1 and hold.last >= last - 1:
            before, after = where.get((move, h)), where.get((move + 1, h))
            if before is None or after is None:
                continue
            if np.isfinite(nodes.weight[before]) and np.isfinite(nodes.weight[after]):
                return before, after, h
    return None


def _why(held: Pressure, first: int, last: int) -> str:
    """What was going on while the substrate crossed without a held film."""
    for item in held.interruptions:
        if item.first <= last and item.last >= first:
            return {
                "start": "before the film was at its pressure",
                "end": "after the film was let go",
                "renewal": "during a renewal of the film",
                "set-point change": "during a change of set point",
                "lost control": "while the pressure was not held",
            }[item.kind]
    return "without a usable dwell on both sides"


def _flag(
    passage: Passage, time: FloatArray, motion: Motion, nodes: Nodes, usual: float
) -> Passage:
    """Add what a reader should know of how the stroke went."""
    flags: list[str] = []
    paused = 0.0
    first, last = passage.nodes[0], passage.nodes[-1]
    for node, word in ((first, "before"), (last, "after")):
        if nodes.rows[node] > 0:
            continue
        index = int(nodes.rest[node])
        if index == 0:
            flags.append("log starts during this stroke")
        elif index == len(motion.rests) - 1:
            flags.append("log ends during this stroke")
        else:
            flags.append(f"no dwell {word} this stroke: level taken from the strokes' own ends")
    for node in passage.nodes[1:-1]:
        rest = motion.rests[int(nodes.rest[node])]
        pause = float(time[min(rest.last, time.size - 1)] - time[rest.first])
        paused += max(pause, 0.0)
        flags.append(f"pause of {pause:.0f} s at {rest.level:.1f} mm")
    if passage.deep - max(passage.shallow, 0.0) < _PARTIAL_PART * usual:
        part = (passage.deep - max(passage.shallow, 0.0)) / usual
        flags.append(f"partial stroke: {100 * part:.0f} % of the usual length crossed")
    return replace(passage, flags=tuple(flags), paused=paused)
