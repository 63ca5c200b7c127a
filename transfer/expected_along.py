"""Layers, thickness and mass at every height of the substrate."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import json_number
from transfer.evidence_ledger import LedgerView
from transfer.expected import per_layer
from transfer.result import TransferResult

__all__ = ["AlongSubstrate", "along_substrate"]

FloatArray = NDArray[np.float64]

_POINTS = 60


@dataclass(frozen=True)
class AlongSubstrate:
    """Arrays (k,) over height above the lower edge, mm.

    layers, u_layers 1; thickness, u_thickness nm and mass, u_mass ng/cm^2 (one face), None where unknown.
    """

    height: FloatArray
    layers: FloatArray
    u_layers: FloatArray
    thickness: FloatArray | None
    u_thickness: FloatArray | None
    mass: FloatArray | None
    u_mass: FloatArray | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""

        def column(values: FloatArray | None) -> list[float | None] | None:
            return None if values is None else [json_number(float(v)) for v in values]

        return {
            "height_mm": column(self.height),
            "layers": column(self.layers),
            "u_layers": column(self.u_layers),
            "thickness_nm": column(self.thickness),
            "u_thickness_nm": column(self.u_thickness),
            "mass_ng_per_cm2": column(self.mass),
            "u_mass_ng_per_cm2": column(self.u_mass),
        }


def along_substrate(result: TransferResult, ledger: LedgerView) -> AlongSubstrate | None:
    """Add up what each stroke laid down at each height; None when no stroke was judged.

    Where a stroke's profile was resolved its local ratios are taken, elsewhere its mean ratio over the
    length it crossed. Heights no stroke reached hold no layer.

    Parameters
    ----------
    result : TransferResult
    ledger : LedgerView
        Of the same result: film numbers, and the covariance of the ratios (its part common to all
        strokes is not averaged down).
    """
    judged = [s for s in result.strokes if s.ratio is not None]
    if not judged:
        return None
    deepest = max(max(s.deep, s.shallow) for s in judged)
    if not deepest > 0:
        return None
    edges = np.linspace(0.0, deepest, _POINTS + 1)
    height = 0.5 * (edges[1:] + edges[:-1])
    local = np.zeros((len(result.strokes), _POINTS))
    own = np.zeros_like(local)
    crossed = np.zeros_like(local)
    for row, stroke in enumerate(result.strokes):
        if stroke.ratio is None:
            continue
        low, high = min(stroke.shallow, stroke.deep), max(stroke.shallow, stroke.deep)
        inside = (height >= low) & (height <= high)
        crossed[row, inside] = 1.0
        local[row, inside] = stroke.ratio.value
        own[row, inside] = (
            stroke.ratio.u_random if stroke.ratio.u_random is not None else (stroke.ratio.u or 0.0)
        )
        for window in stroke.profile:
            here = inside & (height >= window.from_mm) & (height < window.to_mm)
            local[row, here] = window.ratio.value
            own[row, here] = window.ratio.u or 0.0
    common = ledger.covariance - np.diag(np.diag(ledger.covariance))

    def total(weights: FloatArray, relative_u: FloatArray) -> tuple[FloatArray, FloatArray]:
        value = weights @ local
        reach = crossed * weights[:, None]
        variance = (weights**2) @ own**2 + np.maximum(
            np.einsum("ik,ij,jk->k", reach, common, reach), 0.0
        )
        by_film = np.zeros(_POINTS)
        for name in dict.fromkeys(ledger.films):
            mine = np.array([film == name for film in ledger.films], dtype=float)
            by_film += ((weights * mine * relative_u) @ local) ** 2
        return value, np.sqrt(variance + by_film)

    ones = np.ones(len(result.strokes))
    layers, u_layers = total(ones, 0.0 * ones)
    columns: dict[str, tuple[FloatArray, FloatArray] | None] = {}
    for key in ("thickness", "mass_per_area"):
        each = [per_layer(ledger.film(name), None, 1)[key] for name in ledger.films]
        if any(q is None for q in each):
            columns[key] = None
            continue
        weights = np.array([q.value for q in each if q is not None])
        relative = np.array([(q.u or 0.0) / q.value for q in each if q is not None])
        columns[key] = total(weights, relative)
    thickness, mass = columns["thickness"], columns["mass_per_area"]
    return AlongSubstrate(
        height=height,
        layers=layers,
        u_layers=u_layers,
        thickness=None if thickness is None else thickness[0],
        u_thickness=None if thickness is None else thickness[1],
        mass=None if mass is None else mass[0],
        u_mass=None if mass is None else mass[1],
    )
