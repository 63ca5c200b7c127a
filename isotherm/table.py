"""Read any text export: bytes become named columns in fixed units."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from isotherm.sheet import RunSheet
from isotherm.source import Source

__all__ = ["Table", "read_table"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Table:
    """Columns of one export in fixed units, rows in file order.

    values : role -> (n,) array; `barrier_position` is (n,) or (n, 2), mm. time s, area cm^2,
        molecular_area nm^2, pressure and tension mN/m, temperature degC, dipper_position mm, potential mV.
    lines : (n,) line number in the file of each row, from 1.
    """

    source: Source
    values: dict[str, FloatArray]
    lines: NDArray[np.int64]
    warnings: tuple[str, ...] = field(default=())


def read_table(path: str | Path, sheet: RunSheet | None = None, *, needs: tuple[str, ...] = ()) -> Table:
    """Read one export (see the module's helper)."""
    raise NotImplementedError
