"""What the evidence says, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number

__all__ = ["BendResult", "EvidenceResult", "JointResult", "KindResult", "Pinholes"]

FloatArray = NDArray[np.float64]


def _json(quantity: Quantity | None) -> dict[str, Any] | None:
    return None if quantity is None else quantity.to_json()


@dataclass(frozen=True)
class BendResult:
    """Where a line bends: stroke, layers by the ledger there, strokes not worse at 95 %, increments."""

    after_stroke: int
    layers: float
    strokes: tuple[int, int]
    increment_before: Quantity
    increment_after: Quantity
    p_value: float

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "after_stroke": self.after_stroke,
            "after_layers": json_number(self.layers),
            "strokes_95": list(self.strokes),
            "increment_before": self.increment_before.to_json(),
            "increment_after": self.increment_after.to_json(),
            "p_value": json_number(self.p_value),
        }


@dataclass(frozen=True)
class KindResult:
    """One kind of evidence against the ledger.

    x, u_x layers by the ledger at each point; y, u measured value in `unit`; drawn (k, 2) the fitted
    line, expected (k, 2) the expected line (layers, value), either None where there is none.
    consistent : agrees with the transfer ratios (or, for a Bragg spacing, with the run sheet).
    """

    kind: str
    label: str
    symbol: str
    unit: str
    x: FloatArray
    u_x: FloatArray
    y: FloatArray
    u: FloatArray | None
    intercept: Quantity | None
    increment: Quantity | None
    expected_increment: Quantity | None
    chi_square: float | None
    dof: int
    lack_of_fit: float | None
    bend: BendResult | None
    layers: Quantity | None
    ratio: Quantity | None
    p_value: float | None
    consistent: bool
    reason: str
    implied: dict[str, Quantity] = field(default_factory=dict)
    details: dict[str, Any] = field(default_factory=dict)
    drawn: FloatArray | None = None
    expected: FloatArray | None = None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        nothing = {"value": None, "u": None, "unit": "1"}
        return {
            "kind": self.kind,
            "label": self.label,
            "layers": nothing if self.layers is None else self.layers.to_json(),
            "consistent": self.consistent,
            "reason": self.reason,
            "ratio_to_ledger": _json(self.ratio),
            "p_value": json_number(self.p_value),
            "increment_per_layer": _json(self.increment),
            "expected_per_layer": _json(self.expected_increment),
            "intercept": _json(self.intercept),
            "chi_square": json_number(self.chi_square),
            "degrees_of_freedom": self.dof,
            "lack_of_fit_p": json_number(self.lack_of_fit),
            "bend": None if self.bend is None else self.bend.to_json(),
            "implied": {name: q.to_json() for name, q in self.implied.items()},
            "points": [
                {
                    "layers": json_number(float(x)),
                    "value": json_number(float(y)),
                    "u": None if self.u is None else json_number(float(self.u[n])),
                    "unit": self.unit,
                }
                for n, (x, y) in enumerate(zip(self.x, self.y, strict=True))
            ],
            "details": self.details,
        }


@dataclass(frozen=True)
class JointResult:
    """The joint statement: see `evidence_joint.Joint`.

    layers : best estimate after the last stroke. surface_density : molecules on one face, mol/cm^2.
    coverage_ratio : best estimate over the ledger's layers.
    """

    agree: bool
    chi_square: float
    dof: int
    p_value: float | None
    pull_p: float | None
    disagrees: tuple[str, ...]
    undecided: tuple[str, ...]
    layers: Quantity | None
    ledger_layers: Quantity
    surface_density: Quantity | None
    coverage_ratio: Quantity | None
    statement: str

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "agree": self.agree,
            "chi_square": json_number(self.chi_square),
            "degrees_of_freedom": self.dof,
            "p_value": json_number(self.p_value),
            "largest_pull_p": json_number(self.pull_p),
            "disagrees": list(self.disagrees),
            "undecided": list(self.undecided),
            "layers": _json(self.layers),
            "ledger_layers": self.ledger_layers.to_json(),
            "surface_density": _json(self.surface_density),
            "layers_over_ledger": _json(self.coverage_ratio),
            "statement": self.statement,
        }


@dataclass(frozen=True)
class Pinholes:
    """Part of the electrode's area that is bare, as one kind of measurement implies it."""

    source: str
    layers: float
    fraction: Quantity
    upper_limit: float | None
    note: str

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "from": self.source,
            "layers": json_number(self.layers),
            "bare_fraction": self.fraction.to_json(),
            "upper_limit_95": json_number(self.upper_limit),
            "note": self.note,
        }


@dataclass(frozen=True)
class EvidenceResult:
    """Everything one evidence file gave."""

    path: str
    sha256: str
    kinds: tuple[KindResult, ...]
    joint: JointResult
    pinholes: tuple[Pinholes, ...] = ()
    roughness: Quantity | None = None
    raw_files: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()

    def to_json(self) -> dict[str, Any]:
        """Return what `audit` adds: the contract's "evidence" list and the joint statement."""
        return {
            "evidence": [kind.to_json() for kind in self.kinds],
            "evidence_joint": self.joint.to_json(),
            "evidence_electrode": {
                "roughness": _json(self.roughness),
                "pinholes": [p.to_json() for p in self.pinholes],
            },
            "evidence_source": {
                "path": self.path,
                "sha256": self.sha256,
                "raw_files": list(self.raw_files),
            },
        }
