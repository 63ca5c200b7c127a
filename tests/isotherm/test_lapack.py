"""Direct calls agree with numpy's own."""

from __future__ import annotations

import numpy as np
import pytest

from isotherm.lapack import orthonormal, solve_positive


@pytest.mark.parametrize("p", [1, 2, 7])
@pytest.mark.parametrize("order", ["C", "F"])
def test_a_basis_is_that_of_numpy(p: int, order: str) -> None:
    columns = np.array(np.random.default_rng(1).normal(size=(40, p)), order=order)  # type: ignore[call-overload]
    before = columns.copy()
    basis = orthonormal(columns)
    np.testing.assert_allclose(basis, np.linalg.qr(columns)[0], atol=1e-13)
    np.testing.assert_array_equal(columns, before)


def test_a_positive_system_is_solved_and_another_refused() -> None:
    random = np.random.default_rng(2)
    half = random.normal(size=(9, 5))
    matrix, right = half.T @ half, random.normal(size=5)
    before = matrix.copy()
    found = solve_positive(matrix, right)
    assert found is not None
    np.testing.assert_allclose(found, np.linalg.solve(matrix, right), rtol=1e-9)
    np.testing.assert_array_equal(matrix, before)
    assert solve_positive(-matrix, right) is None
