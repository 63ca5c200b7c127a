"""Clock times."""

from __future__ import annotations

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from isotherm.text_clock import clock_seconds


@pytest.mark.parametrize(
    ("cells", "seconds"),
    [
        (["09:15:00", "09:15:02.5", "09:15:02,5"], [0.0, 2.5, 2.5]),
        (["0:00:00", "25:00:01"], [0.0, 90001.0]),
        (["23:59:59", "00:00:01", "00:00:03"], [0.0, 2.0, 4.0]),
        (["2031-05-06T23:59:58", "2031-05-07 00:00:01"], [0.0, 3.0]),
        (["06.05.2031 23:59:58", "07.05.2031 00:00:01"], [0.0, 3.0]),
        (["05/06/2031 23:59:58", "05/07/2031 00:00:01"], [0.0, 3.0]),
        (["31/12/2031 23:59:58", "01/01/2032 00:00:01"], [0.0, 3.0]),
        (["6.5.31 10:00:00", "6.5.31 10:00:01"], [0.0, 1.0]),
        (["11:59:59 AM", "12:00:01 PM", "1:00:00 PM"], [0.0, 2.0, 3601.0]),
        (["2031-05-06T10:00:00Z", "2031-05-06T12:00:00+02:00"], [0.0, 0.0]),
        (["01:30.5", "02:00.0"], [0.0, 29.5]),
        (["2031-05-06", "2031-05-07"], [0.0, 86400.0]),
        (["09:00:00", "", "x", "09:00:01"], [0.0, np.nan, np.nan, 1.0]),
        (["09:00:02", "09:00:01", "09:00:03"], [0.0, -1.0, 1.0]),
    ],
)
def test_seconds(cells: list[str], seconds: list[float]) -> None:
    read = clock_seconds(cells, where="column 1")
    np.testing.assert_allclose(read - read[0], seconds)


def test_no_time_at_all() -> None:
    assert np.isnan(clock_seconds(["", "x"], where="c")).all()


@pytest.mark.parametrize(
    ("cells", "says"),
    [
        (["99.99.2031 10:00:00"], "a date that is none"),
        (["09:00", "09:00:01"], "some times have seconds"),
        (["09:00", "09:01"], "hours and minutes or minutes and seconds"),
    ],
)
def test_what_cannot_be_told(cells: list[str], says: str) -> None:
    with pytest.raises(UpstrokeError, match=f"column 1: .*{says}"):
        clock_seconds(cells, where="column 1")


def test_two_parts_by_the_headers_format() -> None:
    assert clock_seconds(["09:00", "09:01"], where="c", form="mm:ss").tolist() == [540.0, 541.0]
    assert clock_seconds(["09:00", "09:01"], where="c", form="hh:mm").tolist() == [32400.0, 32460.0]
    # sixty and more cannot be hours
    assert clock_seconds(["59:00", "61:01"], where="c").tolist() == [3540.0, 3661.0]


@pytest.mark.parametrize(
    ("cell", "hours"),
    [("12:30:00 AM", 0.5), ("1:00:00 am", 1.0), ("12:30:00 PM", 12.5), ("1:00:00 p.m.", 13.0)],
)
def test_halves_of_the_day(cell: str, hours: float) -> None:
    assert clock_seconds([cell], where="Clock")[0] == 3600.0 * hours
