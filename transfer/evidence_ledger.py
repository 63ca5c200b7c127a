"""What evidence is tested against: layers after each stroke, with their covariance."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity

__all__ = ["FilmInputs", "LedgerView"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class FilmInputs:
    """What the run sheet says about one layer of a film; None where it says nothing.

    layer_thickness nm, molar_mass g/mol, molecular_area nm^2 (at the dipping pressure, on water),
    permittivity 1 (relative), absorptivity L/mol/cm (decadic).
    """

    name: str = ""
    layer_thickness: Quantity | None = None
    molar_mass: Quantity | None = None
    molecular_area: Quantity | None = None
    permittivity: Quantity | None = None
    absorptivity: Quantity | None = None


@dataclass(frozen=True)
class LedgerView:
    """Layers each stroke added, as the transfer ratios say.

    Parameters
    ----------
    strokes : (n,) int array
        Stroke numbers, in the order they were made.
    added : (n,) array, layers
        Transfer ratio of each stroke; negative where film went back to the surface.
    covariance : (n, n) array, layers^2
        Covariance of `added`: the random part on the diagonal, the part common to all strokes
        (trough and substrate geometry) everywhere.
    films : tuple of str, length n
        Name of the film each stroke laid down ("" for the only one).
    inputs : tuple of FilmInputs
        One per film name.
    lays_film : (n,) bool array
        Strokes that count as a layer when evidence is given against a number of layers.
    designed_layers : int or None
        Layers the design asks for.
    """

    strokes: NDArray[np.int64]
    added: FloatArray
    covariance: FloatArray
    films: tuple[str, ...]
    inputs: tuple[FilmInputs, ...]
    lays_film: NDArray[np.bool_]
    designed_layers: int | None = None
    warnings: tuple[str, ...] = field(default=())

    @property
    def cumulative(self) -> FloatArray:
        """Layers on the substrate before the first stroke and after each, (n + 1,)."""
        return np.concatenate((np.zeros(1), np.cumsum(self.added)))

    @property
    def total(self) -> Quantity:
        """Layers after the last stroke."""
        ones = np.ones(len(self.added))
        return Quantity(
            float(self.added.sum()), math.sqrt(max(float(ones @ self.covariance @ ones), 0.0)), "1"
        )

    def film(self, name: str) -> FilmInputs:
        """Inputs of the film called `name`; empty inputs where the sheet never described it."""
        for inputs in self.inputs:
            if inputs.name == name:
                return inputs
        return FilmInputs(name)

    def index_after(self, axis: str, position: int, where: str) -> int:
        """Return how many strokes had been made: 0 before the first, n after the last.

        Parameters
        ----------
        axis : "layers" | "stroke"
            What `position` counts.
        position : int
            0 is the bare substrate.
        where : str
            File and line, for the error.

        Raises
        ------
        UpstrokeError
            When the log holds no such stroke, or fewer strokes that laid film than `position`.
        """
        if position == 0:
            return 0
        if axis == "stroke":
            found = np.flatnonzero(self.strokes == position)
            if found.size == 0:
                raise UpstrokeError(
                    f"stroke {position} is not in the log, which has {_span(self.strokes)}",
                    where=where,
                    remedy="give the number of a stroke of this log, or 0 for the bare substrate",
                )
            return int(found[0]) + 1
        laying = np.flatnonzero(self.lays_film)
        if position > laying.size:
            raise UpstrokeError(
                f"{position} layers do not match the log: {laying.size} of its"
                f" {len(self.strokes)} strokes laid film",
                where=where,
                remedy="give layers that this build reached, or use a stroke column",
            )
        return int(laying[position - 1]) + 1

    def weighted(self, weights: FloatArray) -> FloatArray:
        """Cumulative Σ weight × layers before the first stroke and after each, (n + 1,)."""
        return np.concatenate((np.zeros(1), np.cumsum(self.added * weights)))

    def weighted_rows(self, index: NDArray[np.int64], weights: FloatArray) -> FloatArray:
        """Return rows R so that R @ added is `weighted(weights)[index]`, shape (m, n)."""
        reached = np.arange(len(self.added))[None, :] < np.asarray(index)[:, None]
        rows: FloatArray = reached * weights[None, :]
        return rows


def _span(strokes: NDArray[np.int64]) -> str:
    if strokes.size == 0:
        return "no strokes"
    return f"strokes {int(strokes[0])} to {int(strokes[-1])}"
