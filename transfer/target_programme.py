"""The strokes a design needs, the film each takes, and the time they fill."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.sheet import RunSheet
from transfer.geometry import substrate_geometry

__all__ = ["Move", "Programme", "StrokeFilm", "Timing", "programme", "stroke_film", "timing"]

_MM_PER_CM: Final = 10.0


@dataclass(frozen=True)
class Move:
    """One passage of the substrate.

    direction : "down" | "up". deposits : whether a layer is meant to go on. film : its name. other : the
    layer comes from another film than the one analysed, held beside it.
    """

    direction: str
    deposits: bool
    film: str = ""
    other: bool = False

    @property
    def takes(self) -> bool:
        """Whether it takes film of the one analysed."""
        return self.deposits and not self.other


@dataclass(frozen=True)
class Programme:
    """Every passage in order; empty where the number of layers is not known."""

    moves: tuple[Move, ...]
    notes: tuple[str, ...] = ()

    @property
    def depositing(self) -> int:
        """Strokes that take film of the one analysed."""
        return sum(move.takes for move in self.moves)


@dataclass(frozen=True)
class StrokeFilm:
    """Film that one depositing stroke takes: coated area (cm^2) times the transfer ratio expected."""

    coated: Quantity
    ratio: Quantity
    film: Quantity
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Timing:
    """Seconds for one stroke, and waits after a down- and an up-stroke."""

    stroke: Quantity
    bottom: Quantity
    top: Quantity
    notes: tuple[str, ...] = ()

    def wait(self, direction: str) -> float:
        """Dwell after a stroke, s."""
        return self.bottom.value if direction == "down" else self.top.value

    def total(self, moves: tuple[Move, ...]) -> Quantity:
        """From the first stroke's start to the last one's end; dwells lie between strokes."""
        between = [move.direction for move in moves[:-1]]
        waits = {"down": between.count("down"), "up": between.count("up")}
        value = len(moves) * self.stroke.value
        value += waits["down"] * self.bottom.value + waits["up"] * self.top.value
        parts = (
            len(moves) * (self.stroke.u or 0.0),
            waits["down"] * (self.bottom.u or 0.0),
            waits["up"] * (self.top.u or 0.0),
        )
        return Quantity(value, float(np.linalg.norm(parts)), "s")


def programme(sheet: RunSheet) -> Programme:
    """Lay out the passages of the stack.

    Y and XY deposit on every stroke, X on down-strokes and Z on up-strokes only (IUPAC, Pure Appl.
    Chem. 1994, 66, 1667); the idle strokes between pass through the film and take time, but no film.

    Parameters
    ----------
    sheet : RunSheet

    Returns
    -------
    Programme
    """
    stack = sheet.stack
    if stack.layers is None:
        return Programme(
            (), ("stack.layers not given: one filling is planned, not the whole stack",)
        )
    notes: list[str] = []
    kind = stack.type
    if kind is None:
        kind = "Y"
        notes.append("stack.type not given: every stroke is taken to deposit (Y)")
    if kind == "XY":
        notes.append("type XY: up and down strokes take unequal film; equal amounts are planned")
    if kind in ("X", "Z"):
        active = "down" if kind == "X" else "up"
        idle = "up" if active == "down" else "down"
        pairs = [(active, True), (idle, False)] * stack.layers
        if kind == "Z":  # the last down-stroke would only wet the finished stack again
            pairs = pairs[:-1]
        else:
            notes.append("type X: the last stroke only withdraws the substrate")
    else:
        first = stack.first_stroke or _first_stroke(sheet, notes)
        other = "up" if first == "down" else "down"
        pairs = [((first, other)[j % 2], True) for j in range(stack.layers)]
        if pairs[-1][0] == "down":
            notes.append(
                "the last layer goes on by a down-stroke: remove the film before withdrawing the substrate, "
                "or it takes one layer more"
            )
    films = _films(sheet)
    own = sheet.film.name
    several = len(set(films.values())) > 1
    if several and own not in films.values():
        notes.append(
            "stack.film names several films, none of them film.name: all strokes are taken to use this film"
        )
        several = False
    elif several:
        notes.append(
            f"several films: film and renewals are those of {own}; plan the others likewise"
        )
    moves = tuple(
        Move(direction, deposits, films[direction], several and films[direction] != own)
        for direction, deposits in pairs
    )
    return Programme(moves, tuple(notes))


def stroke_film(sheet: RunSheet) -> StrokeFilm | None:
    """Film one depositing stroke takes; None where substrate or stroke length are not known.

    The transfer ratio expected is the middle of the range the sheet accepts, with that range as a rectangular
    distribution (GUM 4.3.7). The lower edge's face counts: the substrate starts above the surface.

    Raises
    ------
    UpstrokeError
        When the substrate's dimensions are impossible.
    """
    substrate, length = sheet.substrate, sheet.dipping.stroke_length
    notes: list[str] = []
    if substrate is None:
        return None
    if length is None:
        length = substrate.height
        notes.append("dipping.stroke_length not given: the substrate's whole height is coated")
    if length is None:
        return None
    if substrate.height is not None and length.value > substrate.height.value * (1 + 1e-9):
        raise UpstrokeError(
            f"dipping.stroke_length ({length.value:g} mm) is more than substrate.height "
            f"({substrate.height.value:g} mm)",
            where=sheet.path or "run sheet",
            remedy="only substrate that crosses the surface is coated; check both and their units",
        )
    geometry = substrate_geometry(sheet)
    coated = float(geometry.coated(np.array([length.value]))[0])
    u_length = (length.u or 0.0) * geometry.perimeter_at(length.value) / _MM_PER_CM
    u_coated = float(np.hypot(geometry.u_coated(0.0, length.value), u_length))
    low, high = sheet.stack.accept
    ratio = Quantity(0.5 * (low + high), (high - low) / np.sqrt(12.0), "1")
    film = coated * ratio.value
    u_film = float(np.hypot(u_coated * ratio.value, coated * (ratio.u or 0.0)))
    return StrokeFilm(
        Quantity(coated, u_coated, "cm^2"), ratio, Quantity(film, u_film, "cm^2"), tuple(notes)
    )


def timing(sheet: RunSheet) -> Timing | None:
    """Durations from stroke length, speed and dwells; None without length or speed."""
    dipping = sheet.dipping
    length = dipping.stroke_length
    if length is None and sheet.substrate is not None:
        length = sheet.substrate.height
    if length is None or dipping.speed is None:
        return None
    speed = dipping.speed
    value = length.value / speed.value
    relative = np.hypot((length.u or 0.0) / length.value, (speed.u or 0.0) / speed.value)
    notes = [
        f"dipping.{name} not given: no wait counted"
        for name, given in (
            ("dwell_top", dipping.dwell_top), ("dwell_bottom", dipping.dwell_bottom)
        )
        if given is None
    ]  # fmt: skip
    none = Quantity(0.0, 0.0, "s")
    return Timing(
        Quantity(value, float(value * relative), "s"),
        dipping.dwell_bottom or none,
        dipping.dwell_top or none,
        tuple(notes),
    )


def _first_stroke(sheet: RunSheet, notes: list[str]) -> str:
    wetting = sheet.substrate.wetting if sheet.substrate is not None else None
    if wetting is None:
        notes.append("stack.first_stroke not given: down is planned")
        return "down"
    first = "up" if wetting else "down"
    notes.append(
        f"stack.first_stroke not given: {first}, as the bare substrate is "
        f"{'wetted' if wetting else 'not wetted'}"
    )
    return first


def _films(sheet: RunSheet) -> dict[str, str]:
    """Name of the film that strokes of each direction lay down."""
    names = {"down": sheet.film.name, "up": sheet.film.name}
    for film in sheet.stack.films:
        for direction in ("down", "up"):
            if film.strokes in (direction, "both"):
                names[direction] = film.name
    return names
