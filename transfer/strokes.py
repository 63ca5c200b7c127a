"""From moves to strokes: what crossed the surface, in one held film, from one dwell to the next."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from transfer.contact import Contact, immersion
from transfer.ratio_nodes import Nodes
from transfer.strokes_motion import Motion, Move
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
    passages: list[Passage] = []
    unjudged: list[Unjudged] = []
    idle = 0
    for moves in _ways(motion, nodes, where, held, contact, depth):
        a, b = moves[0], moves[-1] + 1
        change = depth[b] - depth[a]
        start, end = motion.moves[a].start, motion.moves[b - 1].end
        if abs(change) < least:
            idle += len(moves)
            continue
        ends = [_same_hold(m, nodes, where, held, motion.moves[m]) for m in moves]
        first = ends[0]
        if first is None:
            first_row, last_row = motion.moves[a].first, motion.moves[b - 1].last
            unjudged.append(Unjudged(start, end, _why(held, first_row, last_row)))
            continue
        shallow, deep = sorted((float(depth[a]), float(depth[b])))
        passages.append(
            Passage(
                "down" if change > 0 else "up",
                moves,
                (first[0], *(e[1] for e in ends if e is not None)),
                first[2],
                start,
                end,
                _in_air(shallow, levels, a, b, contact),
                deep,
            )
        )
    usual = float(np.median([p.deep - max(p.shallow, 0.0) for p in passages])) if passages else 0.0
    flagged = [_flag(p, time, motion, nodes, usual) for p in passages]
    return Strokes(tuple(flagged), tuple(unjudged), idle)


def _ways(
    motion: Motion,
    nodes: Nodes,
    where: dict[tuple[int, int], int],
    held: Pressure,
    contact: Contact,
    depth: FloatArray,
) -> list[tuple[int, ...]]:
    """Group moves that go on the same way after a rest in the water, within one hold: pauses of a stroke."""
    levels = np.asarray([rest.level for rest in motion.rests], dtype=np.float64)
    way = np.sign(np.diff(immersion(contact, levels)))
    homes = [_same_hold(m, nodes, where, held, move) for m, move in enumerate(motion.moves)]
    groups: list[tuple[int, ...]] = []
    for m, home in enumerate(homes):
        before = homes[m - 1] if m else None
        together = home is not None and before is not None and home[2] == before[2]
        if groups and together and way[m] == way[m - 1] and depth[m] > 0:
            groups[-1] = (*groups[-1], m)
        else:
            groups.append((m,))
    return groups


def _least(motion: Motion, contact: Contact) -> float:
    """Smallest change of immersion, mm, that is a stroke in this log."""
    levels = [rest.level for rest in motion.rests]
    travel = max(levels) - min(levels)
    found = contact.at_from == "data" and not contact.always_wet
    u = (contact.at.u or 0.0) if contact.at is not None and found else 0.0
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
    way: Move,
) -> tuple[int, int, int] | None:
    """Nodes before and after a move that lie in one hold with it, or None."""
    for h, hold in enumerate(held.holds):
        if hold.first <= way.first + 1 and hold.last >= way.last - 1:
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
