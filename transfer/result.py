"""What a transfer analysis found, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number
from isotherm.source import Source

__all__ = [
    "ContactReading",
    "CreepSpan",
    "Deposition",
    "Drift",
    "Layer",
    "LogTrace",
    "ProfileWindow",
    "Renewal",
    "Stack",
    "Stroke",
    "TransferResult",
    "UnjudgedCrossing",
]

FloatArray = NDArray[np.float64]


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


@dataclass(frozen=True)
class CreepSpan:
    """Loss of the floating film over one dwell or a stretch of them: relative rate, 1/s."""

    from_s: float
    to_s: float
    rate: Quantity

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "from_s": json_number(self.from_s),
            "to_s": json_number(self.to_s),
            "rate": json_number(self.rate.value),
            "u": json_number(self.rate.u),
        }


@dataclass(frozen=True)
class Renewal:
    """An interval in which no film was held; kind: renewal, set-point change, lost control, start, end."""

    from_s: float
    to_s: float
    kind: str = "renewal"

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "from_s": json_number(self.from_s),
            "to_s": json_number(self.to_s),
            "kind": self.kind,
        }


@dataclass(frozen=True)
class UnjudgedCrossing:
    """Substrate crossed the surface, but not through a held film: not counted as a stroke."""

    from_s: float
    to_s: float
    why: str

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {"from_s": json_number(self.from_s), "to_s": json_number(self.to_s), "why": self.why}


@dataclass(frozen=True)
class ProfileWindow:
    """Local ratio over one stretch of substrate: heights above the lower edge, mm, and dA_film/dA_coated."""

    from_mm: float
    to_mm: float
    ratio: Quantity

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "from_mm": json_number(self.from_mm),
            "to_mm": json_number(self.to_mm),
            "ratio": self.ratio.to_json(),
        }


@dataclass(frozen=True)
class Stroke:
    """One passage of the substrate through the held film.

    coated_area, film_removed : cm^2. ratio : 1, or None where it cannot be judged. shallow, deep :
    immersions of the lower edge that bound what crossed, mm. counted : False for a first stroke that takes
    nothing on a wetting substrate, which says nothing of type or drift. budget : parts of u(ratio) by source.
    """

    number: int
    direction: str
    start_s: float
    end_s: float
    coated_area: Quantity
    film_removed: Quantity
    ratio: Quantity | None
    ratio_uncorrected: float | None
    pressure_mean: float
    pressure_sd: float
    speed_mm_per_s: float
    flags: tuple[str, ...] = ()
    shallow: float = 0.0
    deep: float = 0.0
    counted: bool = True
    budget: dict[str, float] = field(default_factory=dict)
    profile: tuple[ProfileWindow, ...] = ()
    film: str = ""
    pressure_dwells: float | None = None
    renewed_before: bool = False

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "number": self.number,
            "direction": self.direction,
            "start_s": json_number(self.start_s),
            "end_s": json_number(self.end_s),
            "coated_area": self.coated_area.to_json(),
            "film_removed": self.film_removed.to_json(),
            "ratio": _json(self.ratio),
            "ratio_uncorrected": json_number(self.ratio_uncorrected),
            "pressure_mean": json_number(self.pressure_mean),
            "pressure_sd": json_number(self.pressure_sd),
            "speed_mm_per_s": json_number(self.speed_mm_per_s),
            "flags": list(self.flags),
            "immersion_mm": [json_number(self.shallow), json_number(self.deep)],
            "counted": self.counted,
            "film": self.film or None,
            "budget": {name: json_number(part) for name, part in self.budget.items()},
            "profile": [window.to_json() for window in self.profile],
        }


@dataclass(frozen=True)
class ContactReading:
    """How the dipper reads and where the lower edge touches the water.

    reads : "depth" or "height". at : mm, None when the edge never leaves the water. *_from : "sheet",
    "data" or "assumed". found : what the data say, mm, where they say anything.
    """

    reads: str
    reads_from: str
    at: Quantity | None
    at_from: str
    found: Quantity | None = None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "position_reads": self.reads,
            "position_reads_from": self.reads_from,
            "surface_at": _json(self.at),
            "surface_at_from": self.at_from,
            "surface_found": _json(self.found),
        }


@dataclass(frozen=True)
class Deposition:
    """type : X, Y, Z, XY or None. up_down_ratio : 1. criterion : the rule in words. decided : whether the
    ratio's uncertainty leaves the type in no doubt."""

    type: str | None
    up_down_ratio: Quantity | None
    down: Quantity | None
    up: Quantity | None
    criterion: str
    decided: bool

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "down": _json(self.down),
            "up": _json(self.up),
            "criterion": self.criterion,
            "decided": self.decided,
        }


@dataclass(frozen=True)
class Drift:
    """Trend of the ratio along the build, up and down strokes about their own means.

    slope : per stroke, Theil-Sen. interval : its 95 % limits. changes : numbers of the last stroke before
    each change.
    """

    slope: Quantity | None
    interval: tuple[float, float] | None
    changes: tuple[int, ...]
    strokes: int

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "slope_per_stroke": _json(self.slope),
            "slope_interval_95": None
            if self.interval is None
            else [json_number(v) for v in self.interval],
            "changes_after_stroke": list(self.changes),
            "strokes_used": self.strokes,
        }


@dataclass(frozen=True)
class Layer:
    """What one stroke added. layers: 1. faces: what the molecules turn to the substrate."""

    stroke: int
    film: str
    faces: str
    layers: Quantity
    total: Quantity
    thickness: Quantity | None
    mass_per_area: Quantity | None
    surface_density: Quantity | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "stroke": self.stroke,
            "film": self.film or None,
            "faces_substrate": self.faces,
            "layers": self.layers.to_json(),
            "layers_so_far": self.total.to_json(),
            "thickness": _json(self.thickness),
            "mass_per_area": _json(self.mass_per_area),
            "surface_density": _json(self.surface_density),
        }


@dataclass(frozen=True)
class Stack:
    """The ledger. thickness nm, mass_per_area ng/cm^2, surface_density 1/nm^2; None where unknown."""

    ledger: tuple[Layer, ...]
    layers: Quantity
    thickness: Quantity | None
    mass_per_area: Quantity | None
    surface_density: Quantity | None
    notes: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "ledger": [layer.to_json() for layer in self.ledger],
            "notes": list(self.notes),
        }


@dataclass(frozen=True)
class LogTrace:
    """The log thinned for drawing; arrays (m,): s, mm, cm^2, mN/m."""

    time: FloatArray
    position: FloatArray
    area: FloatArray
    pressure: FloatArray


@dataclass(frozen=True)
class TransferResult:
    """Everything one dipping log gave. ratio_covariance: (s, s) of the strokes' ratios, 1."""

    source: Source
    strokes: tuple[Stroke, ...]
    creep: tuple[CreepSpan, ...]
    interruptions: tuple[Renewal, ...]
    unjudged: tuple[UnjudgedCrossing, ...]
    contact: ContactReading
    compressibility: Quantity  # m/mN
    compressibility_from: str  # "sheet" | "isotherm" | "dwells"
    deposition: Deposition
    drift: Drift
    stack: Stack
    pressure_target: float
    limits: tuple[float, float]
    ratio_covariance: FloatArray
    geometry: dict[str, Any]
    trace: LogTrace
    warnings: tuple[str, ...] = field(default=())
    title: str = ""

    @property
    def renewals(self) -> tuple[Renewal, ...]:
        """Only the renewals among the interruptions."""
        return tuple(item for item in self.interruptions if item.kind == "renewal")

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.transfer/1."""
        return {
            "schema": "upstroke.transfer/1",
            "title": self.title,
            "source": self.source.to_json(),
            "warnings": list(self.warnings),
            "creep": [span.to_json() for span in self.creep],
            "renewals": [
                {"from_s": json_number(r.from_s), "to_s": json_number(r.to_s)}
                for r in self.renewals
            ],
            "interruptions": [item.to_json() for item in self.interruptions],
            "unjudged_crossings": [item.to_json() for item in self.unjudged],
            "strokes": [stroke.to_json() for stroke in self.strokes],
            "type": self.deposition.type,
            "up_down_ratio": _json(self.deposition.up_down_ratio),
            "deposition": self.deposition.to_json(),
            "layers": self.stack.layers.to_json(),
            "drift": self.drift.to_json(),
            "thickness": _json(self.stack.thickness),
            "mass_per_area": _json(self.stack.mass_per_area),
            "surface_density": _json(self.stack.surface_density),
            "stack": self.stack.to_json(),
            "contact": self.contact.to_json(),
            "compressibility": self.compressibility.to_json(),
            "compressibility_from": self.compressibility_from,
            "pressure_target": json_number(self.pressure_target),
            "limits": [json_number(v) for v in self.limits],
            "geometry": self.geometry,
        }
