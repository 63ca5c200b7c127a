"""Fitted branches written down by hand."""

from __future__ import annotations

import numpy as np

from isotherm.knee_model import KneeModel

__all__ = ["straight"]


def straight(*legs: tuple[float, float], width: float = 0.002) -> KneeModel:
    """A branch of straight legs in x = -ln A: (length, modulus mN/m) each, with sharp knees."""
    lengths, moduli = (np.array(part) for part in zip(*legs, strict=True))
    edges = np.concatenate([[0.0], np.cumsum(lengths)])
    knots = edges[1:-1]
    # the model's first coordinate counts from the first knee, or from the middle without one
    origin = knots[0] if knots.size else 0.5 * edges[-1]
    constant = 1.0 + float(moduli[0]) * float(origin)
    coefficients = np.concatenate([[constant], moduli * lengths])
    size = coefficients.size + 2 * knots.size
    return KneeModel(
        knots, np.full(knots.size, width), (1,) * lengths.size, lengths, coefficients,
        np.eye(size), 0.0, 1, 1.0, float(edges[0]), float(edges[-1]),
    )  # fmt: skip
