"""Area of substrate that crosses the water surface between two immersions, with its uncertainty."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.sheet import RunSheet, Substrate

__all__ = ["Geometry", "substrate_geometry"]

FloatArray = NDArray[np.float64]

_MM2_PER_CM2 = 100.0
_AVERAGED = 8  # points of a bin that its mean is taken over


@dataclass(frozen=True)
class Geometry:
    """A substrate as the water line sees it; heights above the lower edge, all lengths mm.

    heights, perimeters : (m,) perimeter of the cross section at each height, linear in between.
    face : area of the lower face, cm^2. u_perimeters : (k, m) mm and u_face : (k,) cm^2, what one standard
    uncertainty of each of k independent dimensions changes. height : usable height, or None where unknown.
    """

    shape: str
    heights: FloatArray
    perimeters: FloatArray
    u_perimeters: FloatArray
    face: float
    u_face: FloatArray
    height: float | None
    exact: bool

    def coated(self, immersion: FloatArray) -> FloatArray:
        """Area below the water line, cm^2, at each immersion (mm, of the lower edge; negative: in air)."""
        return self._area(immersion, self.perimeters) + np.where(immersion > 0, self.face, 0.0)

    def mean_coated(self, immersion: FloatArray, width: float) -> FloatArray:
        """`coated` averaged over a stretch of immersions (mm) as wide as a bin, for binned readings."""
        if width <= 0:
            return self.coated(immersion)
        shifts = width * (np.arange(_AVERAGED) + 0.5 - 0.5 * _AVERAGED) / _AVERAGED
        total = np.zeros(np.shape(immersion))
        for shift in shifts:
            total += self.coated(immersion + shift)
        return np.asarray(total / _AVERAGED)

    def u_coated(self, shallow: float, deep: float) -> float:
        """Standard uncertainty, cm^2, from the dimensions, of the area between two immersions (mm)."""
        ends = np.asarray([shallow, deep])
        body = np.asarray([np.diff(self._area(ends, part))[0] for part in self.u_perimeters])
        # a dimension changes body and lower face with the same sign
        return float(np.linalg.norm(body + (self.u_face if shallow <= 0 < deep else 0.0)))

    def perimeter_at(self, immersion: float) -> float:
        """Perimeter at the water line, cm, for an immersion in mm."""
        return float(np.interp(immersion, self.heights, self.perimeters)) / 10.0

    def _area(self, immersion: FloatArray, perimeters: FloatArray) -> FloatArray:
        depth = np.maximum(immersion, 0.0)
        if (perimeters == perimeters[0]).all():
            return np.asarray(depth * (perimeters[0] / _MM2_PER_CM2), dtype=np.float64)
        steps = np.diff(self.heights)
        summed = np.concatenate(
            [[0.0], np.cumsum(0.5 * (perimeters[1:] + perimeters[:-1]) * steps)]
        )
        inside = np.minimum(depth, self.heights[-1])
        index = np.clip(np.searchsorted(self.heights, inside, side="right") - 1, 0, steps.size - 1)
        into = inside - self.heights[index]
        slope = np.diff(perimeters)[index] / steps[index]
        area = summed[index] + perimeters[index] * into + 0.5 * slope * into**2
        # above the last height given, the cross section is taken to go on unchanged
        area = area + (depth - inside) * perimeters[-1]
        return np.asarray(area / _MM2_PER_CM2, dtype=np.float64)


def substrate_geometry(sheet: RunSheet) -> Geometry:
    """Build the geometry from the sheet's substrate.

    Plate: perimeter 2 (w + t), lower face w t. Rod: pi d, lower face pi d^2 / 4. Table of width against
    height: faces and slanted edges integrated, lower face w(0) t.

    Parameters
    ----------
    sheet : RunSheet

    Returns
    -------
    Geometry

    Raises
    ------
    UpstrokeError
        When a dimension is missing, not positive, or the substrate is wider than the trough.
    """
    substrate = sheet.substrate
    if substrate is None:
        raise UpstrokeError(
            "the sheet has no [substrate]",
            where=sheet.path,
            remedy='give shape, width and thickness (or shape = "rod" and diameter)',
        )
    if substrate.shape == "rod":
        geometry = _rod(substrate, sheet.path)
        widest = float(geometry.perimeters.max()) / np.pi
    elif substrate.profile:
        geometry = _table(substrate, sheet.path)
        widest = max(point.width for point in substrate.profile)
    else:
        geometry = _plate(substrate, sheet.path)
        widest = substrate.width.value if substrate.width is not None else 0.0
    trough = sheet.trough.width
    if trough is not None and widest >= trough.value:
        raise UpstrokeError(
            f"the substrate ({widest:g} mm) is as wide as the trough ({trough.value:g} mm) or wider",
            where=sheet.path or "substrate.width",
            remedy="check [substrate] and [trough] width, and their units",
        )
    return geometry


def _need(value: float | None, key: str, path: str) -> float:
    if value is None or not np.isfinite(value) or value <= 0:
        found = "missing" if value is None else f"{value:g} mm"
        raise UpstrokeError(
            f"substrate.{key} is {found}; a positive length is needed", where=path, remedy="in mm"
        )
    return float(value)


def _plate(substrate: Substrate, path: str) -> Geometry:
    width = _need(substrate.width.value if substrate.width else None, "width", path)
    thick = _need(substrate.thickness.value if substrate.thickness else None, "thickness", path)
    u_width = (substrate.width.u if substrate.width else None) or 0.0
    u_thick = (substrate.thickness.u if substrate.thickness else None) or 0.0
    perimeter = 2.0 * (width + thick)
    return Geometry(
        shape="plate",
        heights=np.asarray([0.0, 1.0]),
        perimeters=np.asarray([perimeter, perimeter]),
        u_perimeters=np.asarray([[2.0 * u_width] * 2, [2.0 * u_thick] * 2]),
        face=width * thick / _MM2_PER_CM2,
        u_face=np.asarray([u_width * thick, u_thick * width]) / _MM2_PER_CM2,
        height=substrate.height.value if substrate.height else None,
        exact=u_width == 0.0 and u_thick == 0.0,
    )


def _rod(substrate: Substrate, path: str) -> Geometry:
    diameter = _need(substrate.diameter.value if substrate.diameter else None, "diameter", path)
    u = (substrate.diameter.u if substrate.diameter else None) or 0.0
    perimeter = float(np.pi) * diameter
    return Geometry(
        shape="rod",
        heights=np.asarray([0.0, 1.0]),
        perimeters=np.asarray([perimeter, perimeter]),
        u_perimeters=np.full((1, 2), np.pi * u),
        face=float(np.pi) * diameter**2 / 4.0 / _MM2_PER_CM2,
        u_face=np.asarray([np.pi * diameter * u / 2.0 / _MM2_PER_CM2]),
        height=substrate.height.value if substrate.height else None,
        exact=u == 0.0,
    )


def _table(substrate: Substrate, path: str) -> Geometry:
    thick = _need(substrate.thickness.value if substrate.thickness else None, "thickness", path)
    u_thick = (substrate.thickness.u if substrate.thickness else None) or 0.0
    u_width = (substrate.width.u if substrate.width else None) or 0.0
    points = sorted(substrate.profile, key=lambda point: point.height)
    heights = np.asarray([p.height for p in points], dtype=np.float64)
    widths = np.asarray([p.width for p in points], dtype=np.float64)
    if heights.size < 2 or (np.diff(heights) <= 0).any() or (widths <= 0).any():
        raise UpstrokeError(
            "substrate.profile needs two or more rising heights, each with a positive width",
            where=path,
        )
    if heights[0] > 0:
        heights = np.concatenate([[0.0], heights])
        widths = np.concatenate([widths[:1], widths])
    # both edges slant by half the change of width: their length along the slope counts
    slant = np.hypot(1.0, 0.5 * np.gradient(widths, heights))
    perimeters = 2.0 * widths + 2.0 * thick * slant
    return Geometry(
        shape="table",
        heights=heights,
        perimeters=perimeters,
        u_perimeters=np.stack([np.full(slant.size, 2.0 * u_width), 2.0 * u_thick * slant]),
        face=float(widths[0]) * thick / _MM2_PER_CM2,
        u_face=np.asarray([u_width * thick, u_thick * float(widths[0])]) / _MM2_PER_CM2,
        height=substrate.height.value if substrate.height else float(heights[-1]),
        exact=u_width == 0.0 and u_thick == 0.0,
    )
