"""The one way from a dipping log to its result."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from transfer.analysis_result import assemble
from transfer.contact import find_contact
from transfer.geometry import substrate_geometry
from transfer.log import DippingLog
from transfer.log_cleaning import clean_log
from transfer.ratio import transfer_ratios
from transfer.ratio_curves import RemovalCurve, removal_curve
from transfer.ratio_film import FilmFit, fit_film
from transfer.ratio_modulus import known_compressibility
from transfer.ratio_nodes import Nodes, build_nodes
from transfer.ratio_noise import variance_inflation
from transfer.result import TransferResult
from transfer.strokes import find_strokes
from transfer.strokes_motion import Motion, find_motion
from transfer.strokes_pressure import Hold, Pressure, find_holds

__all__ = ["analyse_log"]

FloatArray = NDArray[np.float64]

# After a stroke the last of the film still leaves the water line and the controller still settles: the
# first seconds of a dwell (at most a quarter of it) are left out.
_SETTLING = 10.0


def analyse_log(
    log: DippingLog, sheet: RunSheet, *, isotherm: IsothermResult | None = None
) -> TransferResult:
    """Find every stroke of a dipping log and its transfer ratio.

    Parameters
    ----------
    log : DippingLog
        Arrays (n,) in s, mm, cm^2, mN/m; never changed.
    sheet : RunSheet
        [substrate] is needed; [dipping] and [stack] are used where given, else found or assumed, and said.
    isotherm : IsothermResult or None
        Gives the film's modulus and area per molecule at the dipping pressure.

    Returns
    -------
    TransferResult

    Raises
    ------
    UpstrokeError
        When the log or the sheet cannot be used; the message says what to do.
    """
    geometry = substrate_geometry(sheet)
    log = clean_log(log)
    where = log.source.path
    warnings: list[str] = []

    motion = find_motion(log.time, log.position)
    if not motion.moves:
        raise UpstrokeError(
            f"the dipper does not move (reading {motion.rests[0].level:.3g} mm throughout)",
            where=where,
            remedy="check which column is the dipper's position",
        )
    target = sheet.dipping.pressure.value if sheet.dipping.pressure is not None else None
    held = find_holds(
        log.time,
        log.area,
        log.pressure,
        target=target,
        tolerance=sheet.dipping.tolerance.value if sheet.dipping.tolerance is not None else 0.0,
        moves=tuple((m.first, m.last) for m in motion.moves),
    )
    longest = _longest_hold(log, motion, held)
    if target is None:
        warnings.append(
            f"dipping.pressure not given: areas are referred to the pressure held, "
            f"{longest.pressure:.2f} mN/m"
        )
    elif abs(longest.pressure - target) > held.band:
        warnings.append(
            f"the film was held at {longest.pressure:.2f} mN/m, not at the sheet's {target:g} mN/m"
        )
    targets = tuple(
        target if target is not None and abs(h.pressure - target) <= held.band else h.pressure
        for h in held.holds
    )
    nodes = build_nodes(log.time, log.area, log.pressure, motion, held, targets, settling=_SETTLING)
    reference = target if target is not None else longest.pressure
    known = known_compressibility(sheet, isotherm, reference)
    warnings.extend(known.warnings)
    if nodes.time.size == 0:
        raise UpstrokeError(
            "no dwell has rows enough to fit the film's creep",
            where=where,
            remedy="record more rows while the dipper rests, or check the pressure and position columns",
        )
    starts = np.asarray([log.time[hold.first] for hold in held.holds], dtype=np.float64)
    fit = fit_film(nodes, starts, prior=known.value, prior_u=known.u)
    inflation = variance_inflation(nodes, fit)
    if inflation > 1.0:
        fit = fit_film(nodes, starts, prior=known.value, prior_u=known.u, inflation=inflation)
    curves = _curves(log, motion, held, nodes, fit)
    levels = [rest.level for rest in motion.rests]
    contact = find_contact(curves, geometry, sheet, (min(levels), max(levels)))
    strokes = find_strokes(log.time, motion, held, nodes, contact)
    if not strokes.passages and not strokes.unjudged:
        at = contact.at.value if contact.at is not None else float("nan")
        raise UpstrokeError(
            f"the dipper's readings ({min(levels):.2f} to {max(levels):.2f} mm) never carry the substrate "
            f"through the surface (at {at:.2f} mm, read as {contact.reads})",
            where=where,
            remedy="check dipping.surface_at and dipping.position_reads",
        )
    ratios = transfer_ratios(strokes.passages, motion, nodes, fit, geometry, contact)
    return assemble(
        log=log,
        sheet=sheet,
        isotherm=isotherm,
        motion=motion,
        held=held,
        nodes=nodes,
        fit=fit,
        known=known,
        curves=curves,
        contact=contact,
        geometry=geometry,
        strokes=strokes,
        ratios=ratios,
        reference=reference,
        warnings=warnings,
    )


def _longest_hold(log: DippingLog, motion: Motion, held: Pressure) -> Hold:
    """Return the longest hold; refuse a log whose film is held through no move of the dipper."""
    if not held.holds:
        raise UpstrokeError(
            "the pressure is never held long enough to judge a stroke",
            where=log.source.path,
            remedy="check the pressure column, and dipping.pressure in the sheet",
        )
    longest = max(held.holds, key=lambda hold: hold.last - hold.first)
    through = any(
        hold.first <= move.first + 1 and hold.last >= move.last - 1
        for hold in held.holds
        for move in motion.moves
    )
    if not through:
        seconds = log.time[longest.last] - log.time[longest.first]
        raise UpstrokeError(
            "the pressure is held through no move of the dipper (longest hold "
            f"{seconds:.0f} s, at {longest.pressure:.1f} mN/m)",
            where=log.source.path,
            remedy="check the pressure and position columns; a compression is read by upstroke isotherm",
        )
    return longest


def _curves(
    log: DippingLog, motion: Motion, held: Pressure, nodes: Nodes, fit: FilmFit
) -> list[RemovalCurve]:
    """Film removed within every move that lies, with both its dwells, in one hold."""
    where = {
        (int(r), int(h)): k for k, (r, h) in enumerate(zip(nodes.rest, nodes.hold, strict=True))
    }
    out: list[RemovalCurve] = []
    for m in range(len(motion.moves)):
        for h in range(len(held.holds)):
            before, after = where.get((m, h)), where.get((m + 1, h))
            if before is None or after is None:
                continue
            if np.isfinite(nodes.weight[before]) and np.isfinite(nodes.weight[after]):
                out.append(
                    removal_curve(
                        log.time,
                        log.position,
                        log.area,
                        log.pressure,
                        motion,
                        nodes,
                        fit,
                        m,
                        before,
                        after,
                    )
                )
                break
    return out
