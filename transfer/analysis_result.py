"""Put what the analysis found into the result: strokes with their flags, type, drift, stack, warnings."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from transfer.contact import Contact
from transfer.deposition import deposition_type, first_stroke_took_nothing, gives_back
from transfer.drift import ratio_drift
from transfer.geometry import Geometry
from transfer.log import DippingLog
from transfer.profile import StrokeProfile, stroke_profile
from transfer.ratio import Ratios
from transfer.ratio_curves import RemovalCurve
from transfer.ratio_film import FilmFit
from transfer.ratio_modulus import Compressibility
from transfer.ratio_nodes import Nodes
from transfer.result import (
    ContactReading,
    CreepSpan,
    LogTrace,
    Renewal,
    Stroke,
    TransferResult,
    UnjudgedCrossing,
)
from transfer.stack import build_stack, film_numbers
from transfer.strokes import Passage, Strokes
from transfer.strokes_motion import Motion
from transfer.strokes_pressure import Pressure

__all__ = ["assemble"]

FloatArray = NDArray[np.float64]

# A ratio this far from one in either direction is not a film's doing but a unit's.
_IMPLAUSIBLE = (0.03, 5.0)
_DRAWN_ROWS = 4000
_CLEAR = 3.0


def assemble(
    *,
    log: DippingLog,
    sheet: RunSheet,
    isotherm: IsothermResult | None,
    motion: Motion,
    held: Pressure,
    nodes: Nodes,
    fit: FilmFit,
    known: Compressibility,
    curves: list[RemovalCurve],
    contact: Contact,
    geometry: Geometry,
    strokes: Strokes,
    ratios: Ratios,
    reference: float,
    warnings: list[str],
) -> TransferResult:
    """Build the result from the parts of the analysis; see `transfer.analysis.analyse_log`.

    Returns
    -------
    TransferResult
    """
    passages = strokes.passages
    directions = [p.direction for p in passages]
    empty_first = first_stroke_took_nothing(
        directions, ratios.ratio, sheet.substrate.wetting if sheet.substrate else None
    )
    profiles = [
        stroke_profile(_own(curves, p), geometry, contact, p.direction)
        if np.isfinite(r) and abs(r) > 0
        else StrokeProfile((), ())
        for p, r in zip(passages, ratios.ratio, strict=True)
    ]
    made = tuple(
        _stroke(
            k, log, passages, ratios, profiles[k], held, sheet, empty_first, isotherm, reference
        )
        for k in range(len(passages))
    )
    counted = [stroke.counted for stroke in made]
    deposition = deposition_type(directions, ratios.ratio, ratios.u_random, counted)
    keep = np.asarray(counted, dtype=bool)
    drift = ratio_drift(
        np.asarray([s.number for s in made], dtype=np.intp)[keep],
        [d for d, c in zip(directions, counted, strict=True) if c],
        ratios.ratio[keep],
        ratios.u_random[keep],
    )
    partial = [any("partial" in f for f in s.flags) for s in made]
    stack = build_stack(
        sheet,
        directions,
        ratios.ratio,
        ratios.random_covariance,
        ratios.systematic_covariance,
        numbers=[s.number for s in made],
        partial=partial,
        isotherm=isotherm,
        pressure=reference,
    )
    notes = [
        *log.warnings,
        *warnings,
        *contact.warnings,
        *_warnings(log, geometry, strokes, held, nodes, fit, known, made, deposition.type, ratios),
    ]
    return TransferResult(
        source=log.source,
        title=sheet.title,
        strokes=made,
        creep=_creep(nodes, fit),
        interruptions=tuple(
            Renewal(
                float(log.time[i.first]), float(log.time[min(i.last, log.time.size - 1)]), i.kind
            )
            for i in held.interruptions
        ),
        unjudged=tuple(UnjudgedCrossing(u.start, u.end, u.why) for u in strokes.unjudged),
        contact=ContactReading(
            contact.reads,
            contact.reads_from,
            None if contact.always_wet else contact.at,
            contact.at_from,
            contact.found,
        ),
        compressibility=_compressibility(fit),
        compressibility_from=known.origin,
        deposition=deposition,
        drift=drift,
        stack=stack,
        pressure_target=reference,
        limits=sheet.stack.accept,
        ratio_covariance=ratios.random_covariance + ratios.systematic_covariance,
        geometry=_geometry_json(geometry, sheet),
        trace=_thin(log),
        warnings=tuple(dict.fromkeys(notes)),
    )


def _own(curves: list[RemovalCurve], passage: Passage) -> list[RemovalCurve]:
    return [c for c in curves if c.move in passage.moves]


def _stroke(
    k: int,
    log: DippingLog,
    passages: tuple[Passage, ...],
    ratios: Ratios,
    profile: StrokeProfile,
    held: Pressure,
    sheet: RunSheet,
    empty_first: bool,
    isotherm: IsothermResult | None,
    reference: float,
) -> Stroke:
    """One stroke's entry."""
    passage = passages[k]
    rows = slice(
        int(np.searchsorted(log.time, passage.start)),
        max(
            int(np.searchsorted(log.time, passage.end, side="right")),
            int(np.searchsorted(log.time, passage.start)) + 1,
        ),
    )
    pressure = log.pressure[rows]
    flags = list(passage.flags)
    value, u = float(ratios.ratio[k]), float(np.hypot(ratios.u_random[k], ratios.u_systematic[k]))
    counted = not (k == 0 and empty_first)
    if not counted:
        flags.append(
            "first stroke took nothing, as a wetting substrate does: left out of type and drift"
        )
    elif gives_back(value, u):
        flags.append("negative ratio: film was given back to the surface (peel-off)")
    hold = held.holds[passage.hold]
    dip = float(np.max(np.abs(pressure - hold.pressure)))
    if dip > held.band:
        flags.append(f"pressure up to {dip:.1f} mN/m off the set point during this stroke")
    if value > _IMPLAUSIBLE[1]:
        flags.append("implausible ratio: check the units of area and substrate")
    if counted:
        flags.extend(profile.flags)
    moving = passage.end - passage.start - passage.paused
    way = float(np.ptp(log.position[rows]))
    renewed = k > 0 and passages[k - 1].hold != passage.hold
    judged = bool(np.isfinite(value))
    return Stroke(
        number=k + 1,
        direction=passage.direction,
        start_s=passage.start,
        end_s=passage.end,
        coated_area=Quantity(float(ratios.coated[k]), float(ratios.u_coated[k]), "cm^2"),
        film_removed=Quantity(float(ratios.removed[k]), float(ratios.u_removed[k]), "cm^2"),
        ratio=Quantity.combine(
            value,
            "1",
            u_random=float(ratios.u_random[k]),
            u_systematic=float(ratios.u_systematic[k]),
        )
        if judged
        else None,
        ratio_uncorrected=float(ratios.uncorrected[k]) if judged else None,
        pressure_mean=float(pressure.mean()),
        pressure_sd=float(pressure.std()),
        speed_mm_per_s=way / moving if moving > 0 else float("nan"),
        flags=tuple(flags),
        shallow=max(passage.shallow, 0.0),
        deep=passage.deep,
        counted=counted,
        budget={name: float(part[k]) for name, part in ratios.budget.items()},
        profile=profile.windows,
        film=film_numbers(sheet, passage.direction, isotherm, reference).name,
        renewed_before=renewed,
    )


def _creep(nodes: Nodes, fit: FilmFit) -> tuple[CreepSpan, ...]:
    """Creep at every dwell: relative loss rate, 1/s."""
    return tuple(
        CreepSpan(
            float(nodes.first_time[k]),
            float(nodes.last_time[k]),
            Quantity(float(fit.creep[k]), float(fit.u_creep[k]), "1/s"),
        )
        for k in range(nodes.size)
        if nodes.rows[k] > 1
    )


def _compressibility(fit: FilmFit) -> Quantity:
    u = float(np.sqrt(max(fit.covariance[-1, -1], 0.0)))
    return Quantity(fit.compressibility, u, "m/mN")


def _warnings(
    log: DippingLog,
    geometry: Geometry,
    strokes: Strokes,
    held: Pressure,
    nodes: Nodes,
    fit: FilmFit,
    known: Compressibility,
    made: tuple[Stroke, ...],
    kind: str | None,
    ratios: Ratios,
) -> list[str]:
    """Everything assumed or odd that concerns the log as a whole."""
    out: list[str] = []
    if geometry.exact:
        out.append("the substrate's dimensions have no uncertainty: taken as exact")
    if known.origin == "dwells":
        out.append(
            f"film modulus from the dwells' own area and pressure: {1 / fit.compressibility:.0f} mN/m"
            if fit.own_compressibility is not None and fit.compressibility > 0
            else "film modulus not known and the dwells hardly show it: a usual range was taken"
        )
    elif fit.own_compressibility is not None and fit.own_u is not None:
        gap = abs(fit.own_compressibility - known.value)
        if gap > _CLEAR * float(np.hypot(fit.own_u, known.u)):
            out.append(
                f"the dwells show a compressibility of {fit.own_compressibility:.4f} m/mN, the "
                f"{known.origin} gives {known.value:.4f} m/mN: check the modulus"
            )
    for crossing in strokes.unjudged:
        out.append(
            f"substrate crossed the surface at {crossing.start:.0f}-{crossing.end:.0f} s {crossing.why}: "
            "not counted as a stroke"
        )
    for item in held.interruptions:
        if item.kind in ("set-point change", "lost control"):
            start = float(log.time[item.first])
            end = float(log.time[min(item.last, log.time.size - 1)])
            out.append(f"{item.kind} at {start:.0f}-{end:.0f} s: nothing in it is judged")
    if nodes.kept.spikes:
        out.append(f"{nodes.kept.spikes} rows far off their dwell were left out")
    deepest = max((s.deep for s in made), default=0.0)
    if geometry.height is not None and deepest > geometry.height:
        out.append(
            f"the substrate went {deepest:.1f} mm deep but is {geometry.height:.1f} mm high: beyond its "
            "upper edge the cross section was taken to go on"
        )
    values = np.abs(ratios.ratio[np.isfinite(ratios.ratio)])
    if values.size:
        top = float(np.quantile(values, 0.9))
        clear = bool((np.abs(ratios.removed) > _CLEAR * ratios.u_removed).any())
        if top > _IMPLAUSIBLE[1] or (top < _IMPLAUSIBLE[0] and clear):
            out.append(
                f"implausible transfer ratios (about {top:.2g}): check the units of the area column and of "
                "the substrate's dimensions"
            )
    if kind is None and made:
        out.append(
            "deposition type not decided: strokes of both directions that take film are needed"
        )
    return out


def _geometry_json(geometry: Geometry, sheet: RunSheet) -> dict[str, Any]:
    substrate = sheet.substrate
    out: dict[str, Any] = {"shape": geometry.shape}
    if substrate is not None:
        for key in ("width", "thickness", "diameter", "height"):
            quantity = getattr(substrate, key)
            if quantity is not None:
                out[key] = quantity.to_json()
    out["perimeter"] = Quantity(
        float(geometry.perimeters[0]), float(np.linalg.norm(geometry.u_perimeters[:, 0])), "mm"
    ).to_json()
    out["lower_face"] = Quantity(
        geometry.face, float(np.linalg.norm(geometry.u_face)), "cm^2"
    ).to_json()
    return out


def _thin(log: DippingLog) -> LogTrace:
    """Rows enough to draw, evenly taken."""
    step = max(1, log.time.size // _DRAWN_ROWS)
    return LogTrace(
        log.time[::step].copy(),
        log.position[::step].copy(),
        log.area[::step].copy(),
        log.pressure[::step].copy(),
    )
