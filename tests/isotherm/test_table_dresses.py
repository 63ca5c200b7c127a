"""One run in many random dresses reads as the same run."""

from __future__ import annotations

import random
from pathlib import Path

import numpy as np
import pytest
from crowded_export import crowded_export
from dressed_export import dressed_export

from isotherm.table import read_table


@pytest.mark.parametrize("batch", range(10))
def test_any_dress_reads_as_the_run(batch: int, tmp_path: Path) -> None:
    path = tmp_path / "export"
    for seed in range(batch * 60, batch * 60 + 60):
        dressed = dressed_export(random.Random(seed))
        path.write_bytes(dressed.data)
        table = read_table(path)
        assert set(table.values) == set(dressed.roles), dressed.said
        for role, values in table.values.items():
            expected = getattr(dressed.run, role)
            np.testing.assert_allclose(values, expected, rtol=1e-6, atol=1e-6, err_msg=dressed.said)


@pytest.mark.parametrize("batch", range(4))
def test_columns_about_other_things_are_left_alone(batch: int, tmp_path: Path) -> None:
    path = tmp_path / "export"
    for seed in range(batch * 60, batch * 60 + 60):
        crowded = crowded_export(seed)
        path.write_text(crowded.text, encoding="utf-8")
        table = read_table(path)
        header = crowded.text.splitlines()[0]
        assert set(table.values) == set(crowded.readings), header
        for role, expected in crowded.readings.items():
            values = table.values[role]
            if role == "time":
                values = values - values[0]
            np.testing.assert_allclose(values, expected, rtol=1e-9, atol=1e-6, err_msg=header)
