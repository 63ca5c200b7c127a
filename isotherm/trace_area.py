"""Area per molecule from whatever the export gives: molecular area, trough area or barrier positions."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.molecular_area import NM2_PER_CM2, molecules_spread
from isotherm.sheet import Film, RunSheet, Trough
from isotherm.table import Table

__all__ = ["Areas", "areas_of", "trough_area"]

FloatArray = NDArray[np.float64]

_CM2_PER_MM2: Final = 1e-2
# The export's own area per molecule and the one from the sheet differ by rounding only, or else the
# amounts do: half a percent is far above rounding and below any slip.
_DISAGREEMENT: Final = 0.005

# A straight chain stands on 0.18 to 0.20 nm^2 (Gaines, Insoluble Monolayers, 1966; from memory), and the
# open end of a compression lies well above; half of that is a slip in the amounts.
_SMALLEST_MOLECULE: Final = 0.1  # nm^2


@dataclass(frozen=True)
class Areas:
    """molecular, trough : (n,) nm^2 and cm^2 or None. relative_u : of the common scale, or None."""

    molecular: FloatArray
    trough: FloatArray | None
    relative_u: float | None
    warnings: tuple[str, ...] = field(default=())


def areas_of(table: Table, sheet: RunSheet) -> Areas:
    """Area per molecule of every row, with the relative standard uncertainty common to all of them.

    A trough area (or barrier positions) and the sheet's amounts go before the export's own area per
    molecule; where both are there and disagree, a warning says so. The uncertainty of the trough area is
    taken at the median area of the run.

    Raises
    ------
    UpstrokeError
        When the amounts or the trough's dimensions that are needed are not in the sheet.
    """
    warnings: list[str] = []
    own = table.values.get("molecular_area")
    trough: FloatArray | None = table.values.get("area")
    barriers = "barrier_position" in table.values
    if trough is None and barriers and (own is None or sheet.trough.width is not None):
        trough = trough_area(table, sheet.trough, warnings)
    amounts = sheet.film.volume is not None or sheet.film.concentration is not None
    if own is not None and (trough is None or not amounts):
        relative_u = _spread_relative_u(sheet.film) if amounts else None
        if relative_u is None:
            warnings.append(
                "the export's own area per molecule is used; the uncertainty of its scale is unknown "
                "(give [film] volume and concentration with their uncertainties)"
            )
        return Areas(own, trough, relative_u, tuple(warnings))
    if trough is None:  # the reader asks for one of the three before it comes to this
        raise UpstrokeError("no area", where=table.source.path)
    if not amounts:
        raise UpstrokeError(
            "the export gives trough area only, and how many molecules were spread is not known",
            where=table.source.path,
            remedy='add to the run sheet under [film]: molar_mass = "284.48 g/mol", '
            'concentration = "1.00 ± 0.01 mg/mL" and volume = "50 ± 0.5 µL" (with your values)',
        )
    number = molecules_spread(sheet.film)
    area = trough * (NM2_PER_CM2 / number.value)
    largest = float(np.nanmax(area, initial=-math.inf))
    if 0 < largest < _SMALLEST_MOLECULE:
        warnings.append(
            f"the largest area per molecule is {largest:.3g} nm^2, and no molecule lies on so little: check "
            "volume, concentration and molar mass in the run sheet, and the unit of the area"
        )
    if own is not None:
        ratio = _median(own / np.where(area == 0, np.nan, area))
        if math.isfinite(ratio) and abs(ratio - 1.0) > _DISAGREEMENT:
            warnings.append(
                f"the export's own area per molecule is {ratio:.4g} times the one from trough area and "
                "the run sheet's amounts; the run sheet is used"
            )
    spread = None if number.u is None else number.u / number.value
    relative_u = _relative_u(spread, trough, sheet)
    if relative_u is None:
        warnings.append(
            "no uncertainty of the area per molecule: the run sheet gives none for volume, "
            "concentration or trough area"
        )
    return Areas(area, trough, relative_u, tuple(warnings))


def _median(values: FloatArray) -> float:
    finite = values[np.isfinite(values)]
    return float(np.median(finite)) if len(finite) else math.nan


def _spread_relative_u(film: Film) -> float | None:
    try:
        number = molecules_spread(film)
    except UpstrokeError:  # the export's own area needs no amounts
        return None
    return None if number.u is None else number.u / number.value


def _relative_u(spread: float | None, trough: FloatArray | None, sheet: RunSheet) -> float | None:
    parts = [] if spread is None else [spread]
    given = sheet.trough.area_uncertainty
    if given is not None and trough is not None:
        middle = _median(trough)
        if middle > 0:
            parts.append(given.value / middle)
    return math.hypot(*parts) if parts else None


def trough_area(table: Table, trough: Trough, warnings: list[str]) -> FloatArray:
    """Trough area (cm^2, shape (n,)) from barrier positions (mm) and the trough's width.

    One barrier: position × width, the position taken from the fixed end, so that it falls as the film is
    compressed. Where it rises with pressure it counts from the open end, and the area is the trough's
    largest area less position × width. Two barriers that move against each other on one scale enclose
    their distance; two that both fall as pressure rises count from the middle and enclose their sum; two
    that both rise count from their own ends, and the largest area is needed.

    Raises
    ------
    UpstrokeError
        When the width, or the largest area where it is needed, is not in the sheet.
    """
    where = table.source.path
    positions = table.values["barrier_position"]
    if trough.width is None:
        raise UpstrokeError(
            "the export gives barrier positions, and the trough's width is not known",
            where=where,
            remedy='add to the run sheet under [trough]: width = "75 mm" (with your value)',
        )
    width = trough.width.value
    one = positions[:, None] if positions.ndim == 1 else positions
    signs = [_with_pressure(table, one[:, i]) for i in range(one.shape[1])]
    if len(signs) == 2 and signs[0] * signs[1] < 0:
        warnings.append("trough area is the distance between the two barriers times the width")
        return np.asarray(np.abs(one[:, 1] - one[:, 0]) * width * _CM2_PER_MM2)
    total = one.sum(axis=1)
    if all(sign <= 0 for sign in signs):
        how = "the barrier position" if len(signs) == 1 else "the sum of both barrier positions"
        warnings.append(f"trough area is {how} times the width")
        return np.asarray(total * width * _CM2_PER_MM2)
    if trough.largest_area is None:
        raise UpstrokeError(
            "barrier positions rise with pressure, so they count from the open end",
            where=where,
            remedy='add to the run sheet under [trough]: largest_area = "240 cm^2" (the area at position 0)',
        )
    warnings.append("trough area is the largest area less the barrier travel times the width")
    return np.asarray(trough.largest_area.value - total * width * _CM2_PER_MM2)


def _with_pressure(table: Table, position: FloatArray) -> int:
    """Whether a barrier position rises (1) or falls (-1) with surface pressure; 0 where it does neither."""
    pressure = table.values.get("pressure")
    if pressure is None:
        pressure = -table.values["tension"] if "tension" in table.values else None
    if pressure is None:
        return 0
    good = np.isfinite(position) & np.isfinite(pressure)
    if good.sum() < 3:
        return 0
    x, y = position[good], pressure[good]
    covariance = float(np.mean((x - x.mean()) * (y - y.mean())))
    return 0 if covariance == 0 else (1 if covariance > 0 else -1)
