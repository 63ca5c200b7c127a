"""Cycles: work, hysteresis and area shift of loops whose truth is known in closed form."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest

from isotherm.check_result import CheckResult
from isotherm.constants import AVOGADRO
from isotherm.cycles import analyse_cycles
from isotherm.cycles_result import molar
from isotherm.cycles_shift import area_at
from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.source import Source
from isotherm.trace import Trace

MODULUS, LIFT_OFF, LOW, HIGH = 100.0, 0.25, 0.18, 0.30
LOSS, BACK = 0.01, 0.9


def loops(
    cycles: int = 3, *, noise: float = 0.05, zero: float = 0.1, seed: int = 0, n: int = 1500,
    loss: float = LOSS, back: float = BACK, clock: bool = True, end: str = "expansion",
) -> Trace:  # fmt: skip
    """Film Pi = C ln(A0/A): each cycle's A0 smaller by `loss`, expansion `back` times the compression."""
    rng = np.random.default_rng(seed)
    down = np.linspace(HIGH, LOW, n)
    areas, pressures = [], []
    for k in range(cycles):
        for area, factor in ((down, 1.0), (down[::-1], back)):
            lift_off = LIFT_OFF * (1.0 - loss) ** k
            areas.append(area)
            pressures.append(factor * MODULUS * np.log(np.maximum(lift_off / area, 1.0)))
    if end == "compression":
        areas, pressures = areas[:-1], pressures[:-1]
    area, pressure = np.concatenate(areas), np.concatenate(pressures)
    return Trace(
        area=area + 1e-5 * rng.normal(size=area.size),
        pressure=pressure + zero + noise * rng.normal(size=area.size),
        source=Source("loops.csv", "", area.size),
        time=np.arange(area.size, dtype=float) if clock else None,
        area_relative_u=0.01,
        pressure_u=0.1,
    )


def truth(cycle: int) -> float:
    """Integral of C ln(A0/A) dA from LOW to A0."""
    lift_off = LIFT_OFF * (1.0 - LOSS) ** (cycle - 1)
    return MODULUS * (lift_off - LOW - LOW * math.log(lift_off / LOW))


def test_work_hysteresis_and_lost_part() -> None:
    result = analyse_cycles(loops())
    assert [cycle.number for cycle in result.cycles] == [1, 2, 3]
    for cycle in result.cycles:
        expected = truth(cycle.number)
        assert cycle.compression.work.value == pytest.approx(expected, rel=0.005)
        assert cycle.hysteresis is not None
        assert cycle.hysteresis.u_random is not None
        missed = cycle.hysteresis.value - (1.0 - BACK) * expected
        assert abs(missed) < 4.0 * cycle.hysteresis.u_random
        assert cycle.lost_part is not None
        assert cycle.lost_part.value == pytest.approx(1.0 - BACK, abs=0.003)


def test_area_shift_follows_the_film_lost() -> None:
    result = analyse_cycles(loops(), at=(12.0,))
    seen = [s for s in result.shifts if s.direction == "compression"]
    assert [s.cycle for s in seen] == [1, 2, 3]
    first = LIFT_OFF * math.exp(-12.0 / MODULUS)
    assert seen[0].area.value == pytest.approx(first, abs=1e-4)
    assert seen[0].from_first is None
    for s in seen[1:]:
        expected = (1.0 - LOSS) ** (s.cycle - 1) - 1.0
        assert s.part is not None
        assert s.part.u is not None
        assert abs(s.part.value - expected) < 4.0 * s.part.u
        assert s.from_previous is not None
        # the scale of the area is common: it scales the shift, it does not blur it
        assert s.from_previous.u_systematic == pytest.approx(0.01 * abs(s.from_previous.value))
    assert (seen[0].area.u_systematic or 0) > 0.01 * seen[0].area.value


def test_an_offset_of_the_probe_moves_the_work_and_not_the_hysteresis() -> None:
    shifted = analyse_cycles(loops(zero=5.0))
    plain = analyse_cycles(loops(zero=0.0))
    assert any("zero not subtracted" in text for text in shifted.warnings)
    a, b = plain.cycles[0], shifted.cycles[0]
    span = HIGH - LOW
    assert b.compression.work.value - a.compression.work.value == pytest.approx(
        5.0 * span, rel=0.01
    )
    assert a.hysteresis is not None
    assert b.hysteresis is not None
    assert b.hysteresis.value == pytest.approx(a.hysteresis.value, rel=1e-3)


def test_drift_from_a_check_enters_the_hysteresis() -> None:
    checked = CheckResult(
        items=(),
        zero_offset=Quantity(0.1, 0.02, "mN/m"),
        drift_rate=Quantity(0.0, 0.6, "mN/m/h"),
    )
    trace = loops()
    result = analyse_cycles(trace, check=checked)
    assert result.zero_offset.value == 0.1
    hysteresis = result.cycles[0].hysteresis
    assert hysteresis is not None
    assert hysteresis.u_systematic is not None
    # compression and expansion are 1500 s apart on average
    drift = 0.6 * 1500.0 / 3600.0 * (HIGH - LOW)
    assert hysteresis.u_systematic == pytest.approx(
        math.hypot(drift, 0.01 * hysteresis.value), rel=0.02
    )


def test_reversible_film_has_no_hysteresis() -> None:
    for cycle in analyse_cycles(loops(loss=0.0, back=1.0)).cycles:
        assert cycle.hysteresis is not None
        assert cycle.hysteresis.u is not None
        assert abs(cycle.hysteresis.value) < 4.0 * cycle.hysteresis.u


def test_a_last_compression_without_expansion() -> None:
    result = analyse_cycles(loops(2, end="compression"))
    assert result.cycles[-1].expansion is None
    assert result.cycles[-1].hysteresis is None
    assert result.cycles[0].hysteresis is not None
    json.dumps(result.to_json(), allow_nan=False)


def test_pressures_never_passed_are_named() -> None:
    result = analyse_cycles(loops(1), at=(20.0, 60.0))
    assert {shift.pressure for shift in result.shifts} == {20.0}
    assert any("60" in text for text in result.warnings)
    assert area_at(result.cycles[0].compression.curve, 60.0) is None


def test_json_units_and_molar_energy() -> None:
    out = analyse_cycles(loops()).to_json()
    assert out["schema"] == "upstroke.cycles/1"
    work = out["cycles"][0]["compression"]["work"]
    assert work["per_molecule"]["unit"] == "mN/m nm^2"
    # 1 mN/m nm^2 is 10^-21 J
    expected = work["per_molecule"]["value"] * 1e-21 * AVOGADRO / 1000.0
    assert work["molar"]["value"] == pytest.approx(expected)
    assert molar(Quantity(1.0, None, "mN/m nm^2")).u is None


def test_input_is_left_alone_and_no_compression_is_an_error() -> None:
    trace = loops(1)
    before = trace.pressure.copy()
    analyse_cycles(trace)
    assert np.array_equal(before, trace.pressure)
    up = np.linspace(LOW, HIGH, 500)
    opening = Trace(
        area=up, pressure=20.0 - 10.0 * up, source=Source("up.csv", "", up.size),
        time=np.arange(up.size, dtype=float),
    )  # fmt: skip
    with pytest.raises(UpstrokeError, match="no compression"):
        analyse_cycles(opening)
