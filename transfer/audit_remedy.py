"""What measurement would narrow a ratio: the remedy for the largest part of its uncertainty."""

from __future__ import annotations

from transfer.result import Stroke

__all__ = ["REMEDIES", "remedy_for"]

REMEDIES = {
    "dwells": "longer dwells before and after the stroke, or a quieter area reading",
    "creep": "longer dwells, or a hold of this film, to fix its rate of loss",
    "pressure": "an isotherm of this film (--isotherm), or dipping.modulus with its uncertainty",
    "position": "a finer reading of the dipper's position",
    "dimensions": "a closer measurement of the substrate's width and thickness",
    "contact": "a closer reading of where the lower edge touches (dipping.surface_at)",
}


def remedy_for(stroke: Stroke) -> str:
    """Return what to measure to narrow this stroke's ratio.

    Parameters
    ----------
    stroke : Stroke
    """
    if not stroke.budget:
        return ""
    largest = max(stroke.budget, key=lambda name: stroke.budget[name])
    return REMEDIES.get(largest, "")
