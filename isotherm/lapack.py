"""LAPACK called directly: for matrices of a few columns the checks around it take longer than the work."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["orthonormal", "solve_positive"]

FloatArray = NDArray[np.float64]

_ROUTINES: dict[str, Any] = {}


def _routine(name: str) -> Any:
    if name not in _ROUTINES:
        from scipy.linalg import lapack

        _ROUTINES[name] = getattr(lapack, name)
    return _ROUTINES[name]


def orthonormal(columns: FloatArray) -> FloatArray:
    """An orthonormal basis of (n, p) columns, n >= p, column by column (Householder reflections)."""
    reflectors, tau, _, _ = _routine("dgeqrf")(columns)
    basis, _, _ = _routine("dorgqr")(reflectors, tau, overwrite_a=1)
    return np.asarray(basis)


def solve_positive(matrix: FloatArray, right: FloatArray) -> FloatArray | None:
    """Solve a (p, p) symmetric positive definite system; None where it is not positive definite."""
    _, solution, info = _routine("dposv")(matrix, right)
    return np.asarray(solution) if info == 0 else None
