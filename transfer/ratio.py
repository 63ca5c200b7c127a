"""Transfer ratio of every stroke with its uncertainty, and the covariance between strokes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transfer.contact import Contact
from transfer.geometry import Geometry
from transfer.ratio_film import FilmFit, film_area
from transfer.ratio_nodes import Nodes
from transfer.strokes import Passage
from transfer.strokes_motion import Motion

__all__ = ["Ratios", "transfer_ratios"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Ratios:
    """Per stroke, (s,): coated and removed in cm^2, ratio 1; random and systematic standard uncertainties.

    random_covariance, systematic_covariance : (s, s) of the ratios. budget: part of u(ratio) from each
    source, (s,) each.
    """

    coated: FloatArray
    u_coated: FloatArray
    removed: FloatArray
    u_removed: FloatArray
    ratio: FloatArray
    uncorrected: FloatArray
    random_covariance: FloatArray
    systematic_covariance: FloatArray
    budget: dict[str, FloatArray]

    @property
    def u_random(self) -> FloatArray:
        """Random standard uncertainty of each ratio, (s,)."""
        return np.asarray(np.sqrt(np.diag(self.random_covariance)))

    @property
    def u_systematic(self) -> FloatArray:
        """Systematic standard uncertainty of each ratio, (s,)."""
        return np.asarray(np.sqrt(np.diag(self.systematic_covariance)))


def transfer_ratios(
    passages: tuple[Passage, ...],
    motion: Motion,
    nodes: Nodes,
    fit: FilmFit,
    geometry: Geometry,
    contact: Contact,
) -> Ratios:
    """Film removed over area coated, stroke by stroke.

    The film before, followed to the middle of the move by its creep, less the film after, followed back to
    the same moment, is what the stroke took; both at the set point through the film's compressibility.

    Parameters
    ----------
    passages : tuple of Passage
    motion : Motion
    nodes : Nodes
    fit : FilmFit
    geometry : Geometry
    contact : Contact

    Returns
    -------
    Ratios
    """
    count, size = len(passages), nodes.size
    by_mean = np.zeros((count, size))
    terms = fit.model.size
    by_film = np.zeros((count, terms + 1))
    bends = 0.5 * fit.model.rate_changes() * (nodes.tt / np.maximum(nodes.rows, 1))[:, None]
    removed, raw = np.zeros(count), np.zeros(count)
    coated, u_shape, by_contact, u_level = (np.zeros(count) for _ in range(4))
    contact_u = contact.at.u if contact.at is not None and contact.at.u else 0.0
    for s, passage in enumerate(passages):
        for m, before, after in zip(passage.moves, passage.nodes, passage.nodes[1:], strict=False):
            middle = _middle(passage, motion, m, contact)
            at = np.asarray([middle])
            film_before = float(film_area(nodes, fit, before, at)[0])
            film_after = float(film_area(nodes, fit, after, at)[0])
            removed[s] += film_before - film_after
            by_mean[s, before] += film_before
            by_mean[s, after] -= film_after
            for node, film in ((before, film_before), (after, -film_after)):
                by_film[s, :terms] += film * bends[node]
                for index, coefficient in fit.model.loss(node, at):
                    by_film[s, index] -= film * coefficient[0]
            by_film[s, terms] += film_before * nodes.off[before] - film_after * nodes.off[after]
        raw[s] = np.exp(nodes.log_area[passage.nodes[0]]) - np.exp(
            nodes.log_area[passage.nodes[-1]]
        )
        bounds = geometry.coated(np.asarray([passage.shallow, passage.deep]))
        coated[s] = bounds[1] - bounds[0]
        u_shape[s] = geometry.u_coated(passage.shallow, passage.deep)
        line = geometry.perimeter_at(max(passage.shallow, 0.0)) / 10.0  # cm^2 per mm
        deep_line = geometry.perimeter_at(passage.deep) / 10.0
        crossing = passage.shallow <= 0.0
        by_contact[s] = _by_contact(geometry, passage, contact_u)
        ends = [motion.rests[int(nodes.rest[n])] for n in (passage.nodes[0], passage.nodes[-1])]
        levels = [end.u_level for end in ends]
        deep_end = 1 if passage.direction == "down" else 0
        u_level[s] = deep_line * levels[deep_end]
        if not crossing:
            u_level[s] = float(np.hypot(u_level[s], line * levels[1 - deep_end]))
    safe = np.where(coated > 0, coated, np.nan)
    ratio = removed / safe
    per_area = 1.0 / safe
    known = np.where(np.isfinite(fit.mean_variance), fit.mean_variance, 0.0)
    dwell = (by_mean * known) @ by_mean.T
    by_fit = by_film @ fit.covariance @ by_film.T
    outer = np.outer(per_area, per_area)
    level = np.diag((ratio * u_level * per_area) ** 2)
    random = (dwell + by_fit) * outer + level
    shape_part, contact_part = ratio * u_shape * per_area, ratio * by_contact * per_area
    systematic = np.outer(shape_part, shape_part) + np.outer(contact_part, contact_part)
    by_creep = by_film[:, :terms]
    creep_variance = ((by_creep @ fit.covariance[:terms, :terms]) * by_creep).sum(axis=1)
    pressure_variance = by_film[:, terms] ** 2 * fit.covariance[terms, terms]
    return Ratios(
        coated=coated,
        u_coated=np.sqrt(u_shape**2 + by_contact**2 + u_level**2),
        removed=removed,
        u_removed=np.sqrt(np.diag(dwell + by_fit)),
        ratio=ratio,
        uncorrected=raw * per_area,
        random_covariance=random,
        systematic_covariance=systematic,
        budget={
            "dwells": np.sqrt(np.diag(dwell)) * per_area,
            "creep": np.sqrt(creep_variance) * per_area,
            "pressure": np.sqrt(pressure_variance) * per_area,
            "position": np.abs(ratio) * u_level * per_area,
            "dimensions": np.abs(shape_part),
            "contact": np.abs(contact_part),
        },
    )


def _by_contact(geometry: Geometry, passage: Passage, u: float) -> float:
    """Change of the coated area, cm^2, with one u (mm) of the surface's place; positive: more when higher.

    Taken over two u to the side that matters more: where the edge comes to rest near the surface, one side
    lifts it into air and the other changes nothing.
    """
    shifts = 2.0 * u * np.asarray([-1.0, 0.0, 1.0])
    area = geometry.coated(passage.deep + shifts) - geometry.coated(passage.shallow + shifts)
    lower, upper = area[0] - area[1], area[2] - area[1]
    return 0.5 * float(upper if abs(upper) >= abs(lower) else -lower)


def _middle(passage: Passage, motion: Motion, move: int, contact: Contact) -> float:
    """Moment, s, by which half of what a move coats has crossed: the middle of its way under the surface."""
    way = motion.moves[move]
    sign = 1.0 if contact.reads == "depth" else -1.0
    zero = contact.at.value if contact.at is not None else 0.0
    a = sign * (motion.rests[move].level - zero)
    b = sign * (motion.rests[move + 1].level - zero)
    if a == b:
        return 0.5 * (way.start + way.end)
    wet = 0.5 * (max(a, 0.0) + max(b, 0.0))
    share = float(np.clip((wet - a) / (b - a), 0.0, 1.0))
    return way.start + share * (way.end - way.start)
