"""A voltammogram cut into its sweeps, each with rising potential and positive charging current."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from transfer.evidence_series import Voltammogram

__all__ = ["Sweep", "split_sweeps"]

FloatArray = NDArray[np.float64]

# A sweep reaches from one tenth of the window to the other; shorter pieces (the start of a record
# that begins inside the window) are left out.
_EDGE = 0.1
_FEWEST_ROWS = 20


@dataclass(frozen=True)
class Sweep:
    """One sweep: potential V, rising; current A, positive where it charges the electrode."""

    direction: str  # "anodic" (potential rose in time) | "cathodic"
    potential: FloatArray
    current: FloatArray


def split_sweeps(record: Voltammogram) -> tuple[Sweep, ...]:
    """Cut at the turning potentials and turn every sweep the same way round.

    Charging current has the sign of dE/dt where anodic currents count as positive and the opposite
    where they count as negative; which of the two a record uses shows in the sign of ∮ i dE.

    Raises
    ------
    UpstrokeError
        When the potential does not sweep.
    """
    potential = record.potential
    low, high = float(np.min(potential)), float(np.max(potential))
    span = high - low
    if not span > 0 or len(potential) < _FEWEST_ROWS:
        raise UpstrokeError(
            f"the potential does not sweep ({len(potential)} rows between {low:g} and {high:g} V)",
            where=record.path,
            remedy="give a voltammogram of at least 20 rows",
        )
    zone = np.where(potential >= high - _EDGE * span, 1, 0)
    zone = np.where(potential <= low + _EDGE * span, -1, zone)
    marked = np.flatnonzero(zone)
    change = np.flatnonzero(np.diff(zone[marked])) + 1
    turns = []
    for rows in np.split(marked, change):
        inside = potential[rows]
        top = zone[rows[0]] > 0
        extreme = float(inside.max() if top else inside.min())
        at = rows[np.abs(inside - extreme) <= 1e-9 * span]
        turns.append((int(at[0]), int(at[-1])))
    pieces = [slice(a[1], b[0] + 1) for a, b in pairwise(turns) if b[0] > a[1]]
    pieces = [p for p in pieces if p.stop - p.start >= _FEWEST_ROWS]
    if not pieces:
        raise UpstrokeError(
            "no sweep runs through the potential window",
            where=record.path,
            remedy="give a record that holds at least one whole sweep",
        )
    work = sum(
        float(np.sum(np.diff(potential[p]) * (record.current[p][1:] + record.current[p][:-1])))
        for p in pieces
    )
    sign = 1.0 if work >= 0 else -1.0
    return tuple(_turned(record, piece, sign) for piece in pieces)


def _turned(record: Voltammogram, piece: slice, sign: float) -> Sweep:
    potential, current = record.potential[piece], record.current[piece]
    rising = potential[-1] > potential[0]
    order = np.argsort(potential, kind="stable")
    return Sweep(
        "anodic" if rising else "cathodic",
        potential[order],
        sign * (1.0 if rising else -1.0) * current[order],
    )
