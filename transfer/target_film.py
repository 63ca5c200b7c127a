"""The film along the pressure axis: area, modulus and their uncertainty at any pressure it can hold."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.result import IsothermResult

__all__ = ["FilmAxis", "film_axis"]

FloatArray = NDArray[np.float64]

_NM2_PER_CM2 = 1e14
_FEWEST_NODES = 3
_MEDIAN = 5  # nodes; two wild ones in a row are passed over
_SOFTEST = 0.1  # mN/m; below it a pressure says nothing about the area, and the quotient is no help


@dataclass(frozen=True)
class FilmAxis:
    """A compression read as a function of pressure, from its lowest pressure to collapse or its end.

    pressure : (m,) mN/m, rising. area : (m,) nm^2. modulus, u_modulus : (m,) mN/m.
    molecules : on the trough, None where unknown (then no trough area can be given).
    pressure_u : mN/m, of a pressure read off the curve: random, zero and scale. random_u : its random part.
    """

    pressure: FloatArray
    area: FloatArray
    modulus: FloatArray
    u_modulus: FloatArray
    molecules: float | None
    pressure_u: float
    random_u: float = 0.0

    @property
    def lowest(self) -> float:
        """Lowest pressure of the record, mN/m."""
        return float(self.pressure[0])

    @property
    def highest(self) -> float:
        """Highest pressure of the record up to collapse, mN/m."""
        return float(self.pressure[-1])

    def area_at(self, pressure: FloatArray) -> FloatArray:
        """Area per molecule, nm^2, where the compression passes `pressure` for good."""
        return np.asarray(np.interp(pressure, self.pressure, self.area))

    def trough_area_at(self, pressure: FloatArray) -> FloatArray:
        """Trough area, cm^2; NaN where the number of molecules is not known."""
        count = np.nan if self.molecules is None else self.molecules
        return np.asarray(self.area_at(pressure) * (count / _NM2_PER_CM2))

    def u_trough_area_at(
        self, pressure: FloatArray, relative_u: float, pressure_u: float
    ) -> FloatArray:
        """Standard uncertainty of the trough area, cm^2, from amount spread and pressure (dA = A dP/M)."""
        stiff = np.maximum(self.modulus_at(pressure), _SOFTEST)
        return np.asarray(self.trough_area_at(pressure) * np.hypot(relative_u, pressure_u / stiff))

    def modulus_at(self, pressure: FloatArray, k: float = 0.0) -> FloatArray:
        """Modulus less k of its standard uncertainties, mN/m."""
        value = np.interp(pressure, self.pressure, self.modulus)
        u = np.interp(pressure, self.pressure, self.u_modulus)
        return np.asarray(value - k * u)

    def modulus_across(self, pressure: FloatArray, reach: float, k: float = 0.0) -> FloatArray:
        """Modulus from `reach` below to `reach` above a pressure, less k of its u, mN/m.

        dP / d ln A between the two pressures: what the film does to a controller that strays so far. A
        plateau anywhere between shows, a wild local slope does not.
        """
        low = np.maximum(pressure - reach, self.lowest)
        high = np.minimum(pressure + reach, self.highest)
        rise = np.maximum(high - low, 1e-12)
        value = rise / np.maximum(np.log(self.area_at(low) / self.area_at(high)), 1e-12)
        return np.asarray(value * (1.0 - k * np.sqrt(2.0) * self.random_u / rise))

    def u_modulus_at(self, pressure: FloatArray) -> FloatArray:
        """Standard uncertainty of the modulus, mN/m."""
        return np.asarray(np.interp(pressure, self.pressure, self.u_modulus))

    def pressure_of(self, area: float) -> float:
        """Pressure, mN/m, at an area per molecule, nm^2."""
        return float(np.interp(-area, -self.area, self.pressure))

    def with_modulus_moved(self, k: float) -> FilmAxis:
        """The same film with its modulus moved by k of its standard uncertainties."""
        return replace(self, modulus=self.modulus + k * self.u_modulus)

    def with_pressure_moved(self, by: float) -> FilmAxis:
        """The same film with every pressure moved, mN/m."""
        return replace(self, pressure=self.pressure + by)


def film_axis(result: IsothermResult) -> FilmAxis:
    """Turn the first compression round: from pressure against area to everything against pressure.

    Where the pressure dips on the way (noise, a hump before a plateau), the rising curve nearest to it counts
    (isotonic regression), so that each pressure has one area: that at which it is left behind.

    Raises
    ------
    UpstrokeError
        When the record holds no compression that rises.
    """
    branch = result.headline
    curve = branch.curve
    where = result.source.path
    if branch.direction != "compression":
        raise UpstrokeError(
            "no compression in the record",
            where=where,
            remedy="a dipping pressure is chosen on a compression; export the whole run",
        )
    stop = int(np.argmax(curve.pressure)) + 1
    if branch.collapse is not None:
        inside = int(np.count_nonzero(curve.area >= branch.collapse.area.value))
        stop = min(stop, max(inside, 1))
    good = np.isfinite(curve.pressure[:stop]) & np.isfinite(curve.modulus[:stop])
    pressure = curve.pressure[:stop][good]
    # last node at each level: np.unique keeps the first of the reversed order; pooled means of one level
    # differ by rounding
    level = np.round(_rising(pressure), 9)
    levels, last = np.unique(level[::-1], return_index=True)
    if levels.size < _FEWEST_NODES:
        raise UpstrokeError(
            "the pressure does not rise on compression",
            where=where,
            remedy="check which column is the pressure and which way the barriers moved",
        )
    modulus = curve.modulus[:stop][good][::-1][last]
    u_modulus = curve.u_modulus[:stop][good][::-1][last]
    known = np.where(np.isfinite(u_modulus), u_modulus, np.abs(modulus))
    random = float(np.median(curve.u_pressure[np.isfinite(curve.u_pressure)], axis=None))
    parts = (random, branch.zero_offset.u or 0.0, result.pressure_u or 0.0)
    return FilmAxis(
        pressure=levels,
        area=curve.area[:stop][good][::-1][last],
        modulus=modulus,
        u_modulus=known,
        molecules=_molecules(result),
        pressure_u=float(np.linalg.norm(parts)),
        random_u=random,
    )


def _rising(pressure: FloatArray) -> FloatArray:
    """The rising curve nearest to a pressure in order of compression, (m,) mN/m.

    A running median first, which leaves what rises alone, so that one wild node cannot drag its neighbours.
    """
    from scipy.optimize import isotonic_regression

    half = _MEDIAN // 2
    if pressure.size <= _MEDIAN:
        return np.asarray(isotonic_regression(pressure).x)
    padded = np.pad(pressure, half, mode="edge")
    steady = np.median(np.lib.stride_tricks.sliding_window_view(padded, _MEDIAN), axis=1)
    return np.asarray(isotonic_regression(steady).x)


def _molecules(result: IsothermResult) -> float | None:
    """Molecules on the trough, from the result or from its curve's two areas."""
    if result.molecules is not None:
        return result.molecules
    curve = result.headline.curve
    if curve.trough_area is None:
        return None
    return float(np.median(curve.trough_area / curve.area)) * _NM2_PER_CM2
