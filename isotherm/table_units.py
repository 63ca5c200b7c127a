"""Units of the columns: as given, inferred where nothing else can be meant, else asked for."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.table_roles import Assigned, describe
from isotherm.table_words import ROLE_DIMENSION
from isotherm.unit_symbols import DIMENSIONS
from isotherm.units import Conversion, conversion

__all__ = ["column_conversion"]

# A unit is inferred only where the readings leave one choice:
# surface pressures and tensions of water lie below 150 in mN/m (= dyn/cm) and below 0.15 in N/m;
_SURFACE_FORCE: Final = (1.0, 150.0)
# subphases are liquid, 0 to 100 in degC and above 270 in K;
_CELSIUS: Final = (-5.0, 105.0)
# no molecule is smaller than 0.1 nm^2, so readings below 5 cannot be Å^2; those of 12 to 200 would be
# macromolecules if they were nm^2.
_NM2: Final = (0.02, 5.0)
_A2: Final = (12.0, 200.0)


def _inferred(role: str, values: NDArray[np.float64], needed: bool) -> str | None:
    finite = values[np.isfinite(values)]
    if not len(finite):
        return None
    low, high = float(finite.min()), float(finite.max())
    if (
        role in ("pressure", "tension")
        and _SURFACE_FORCE[0] < high < _SURFACE_FORCE[1]
        and low > -50
    ):
        return "mN/m"
    if role == "temperature" and low > _CELSIUS[0] and high < _CELSIUS[1]:
        return "degC"
    if role == "molecular_area":
        middle = float(np.median(finite))
        if low > 0 and _NM2[0] < middle < _NM2[1]:
            return "nm^2"
        if low > 0 and _A2[0] < middle < _A2[1]:
            return "Å^2"
    if role == "time" and not needed:
        return "s"  # only the order of rows hangs on it
    return None


def column_conversion(
    one: Assigned, values: NDArray[np.float64], *, needed: bool, optional: bool, where: str
) -> tuple[Conversion | None, str]:
    """Find the conversion of one column to its fixed unit, and a warning ("" for none).

    Parameters
    ----------
    one : Assigned
        The column.
    values : (n,) array of float
        Its readings as written.
    needed : bool
        Whether the unit matters to what was asked; then it is never guessed for a time.
    optional : bool
        Whether to do without the column (returning None) rather than stop.

    Raises
    ------
    UpstrokeError
        When the unit is unknown or missing and the column is not optional.
    """
    dimension = ROLE_DIMENSION[one.role]
    named = describe(one.column, one.cell)
    label = DIMENSIONS[dimension][0]
    if one.unit is not None:
        return conversion(one.unit, dimension, where=f"{where}, column {named}"), ""
    if one.cell.unknown is not None and not one.hinted:
        if optional:
            return None, f"column {named} has an unknown unit and is not used"
        conversion(one.cell.unknown, dimension, where=f"{where}, column {named}")
    unit = _inferred(one.role, values, needed)
    role = one.role.replace("_", " ")
    if unit is not None:
        return (
            conversion(unit, dimension),
            f"column {named} gives no unit; {role} is taken to be in {unit}",
        )
    if optional:
        return None, f"column {named} gives no unit and is not used"
    raise UpstrokeError(
        f"the {role} has no unit",
        where=f"{where}, column {named}",
        remedy=f'add to the run sheet: [[columns]] with role = "{one.role}", index = {one.column + 1} '
        f'and unit = "{label}"',
    )
