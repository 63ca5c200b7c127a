"""What a pressure along the isotherm would mean for dipping: packing error and strokes left."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.result import Curve
from isotherm.sheet import RunSheet
from transfer.geometry import substrate_geometry

__all__ = ["FilmReading", "film_reading"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class FilmReading:
    """Along a curve's m points; an array is None where the sheet lacks what it needs.

    packing_error, u_packing_error : (m,) relative error of the area per molecule, 1; NaN where the modulus is
    not above zero. strokes_left : (m,) whole strokes the film on the trough still serves at that area.
    """

    packing_error: FloatArray | None = None
    u_packing_error: FloatArray | None = None
    strokes_left: FloatArray | None = None


def film_reading(curve: Curve, sheet: RunSheet) -> FilmReading:
    """Read packing error and strokes left at every point of an isotherm.

    The packing error is dA/A = tolerance / modulus, from the definition of the compression modulus
    -A dP/dA. A stroke takes the area of substrate that crosses the surface (transfer ratio 1), and film
    can be taken down to the trough's smallest area.

    Parameters
    ----------
    curve : Curve
        Modulus in mN/m, trough area in cm^2, (m,) each.
    sheet : RunSheet
        dipping.tolerance for the packing error; substrate, dipping.stroke_length and trough.smallest_area for
        the strokes.

    Returns
    -------
    FilmReading
    """
    error = u_error = None
    tolerance = sheet.dipping.tolerance
    if tolerance is not None:
        with np.errstate(divide="ignore", invalid="ignore"):
            error = np.where(curve.modulus > 0, tolerance.value / curve.modulus, np.nan)
            u_error = error * curve.u_modulus / curve.modulus
    return FilmReading(error, u_error, _strokes_left(curve, sheet))


def _strokes_left(curve: Curve, sheet: RunSheet) -> FloatArray | None:
    length, smallest = sheet.dipping.stroke_length, sheet.trough.smallest_area
    if curve.trough_area is None or length is None or smallest is None or sheet.substrate is None:
        return None
    ends = substrate_geometry(sheet).coated(np.array([-1.0, length.value]))
    each = float(ends[1] - ends[0])  # cm^2, the lower edge's face included
    left: FloatArray = np.floor(np.maximum(curve.trough_area - smallest.value, 0.0) / each)
    return left
