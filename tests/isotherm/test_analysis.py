"""The whole path from a trace to its numbers, on invented films with closed forms."""

from dataclasses import replace

import numpy as np
import pytest

from isotherm.analysis import analyse
from isotherm.errors import UpstrokeError
from isotherm.result import Branch
from tests.support.isotherm_traces import acid, lecithin, make_trace


def _near(quantity: object, value: float, wide: float = 0.0) -> None:
    found, u = quantity.value, quantity.u  # type: ignore[attr-defined]
    assert u is not None
    assert found == pytest.approx(value, abs=3 * u + wide)


def test_acid_is_read_in_full() -> None:
    branch = analyse(acid(seed=3)).headline
    assert [t.kind for t in branch.transitions] == ["kink"]
    kink = branch.transitions[0].at
    assert kink is not None
    _near(kink.area, 0.20)
    _near(kink.pressure, 25.0)
    assert branch.lift_off is not None
    _near(branch.lift_off, 0.25)
    assert branch.collapse is not None
    assert branch.collapse.kind == "constant-area"
    _near(branch.collapse.area, 0.193)
    _near(branch.collapse.pressure, 53.0)
    # the untilted branch is straight: 25 + 4000 (0.20 - A) meets zero at 0.20625 nm^2
    assert branch.limiting_area is not None
    _near(branch.limiting_area, 0.20625)
    assert branch.tangent is not None
    assert branch.tangent.slope == pytest.approx(-4000.0, rel=0.01)
    assert [p.name for p in branch.phases] == ["gaseous", "liquid-condensed", "solid", "collapsed"]
    assert branch.modulus_max is not None
    # -A dΠ/dA = 4000 A: between 772 and 800 mN/m on the untilted branch
    assert branch.modulus_max.modulus.value == pytest.approx(790.0, rel=0.08)
    areas = {a.pressure: a for a in branch.area_at}
    for pressure, area in ((10.0, 0.23), (20.0, 0.21), (30.0, 0.19875), (40.0, 0.19625)):
        assert areas[pressure].area is not None
        _near(areas[pressure].area, area)


def test_lecithin_has_a_coexistence_and_no_collapse() -> None:
    branch = analyse(lecithin(seed=4)).headline
    assert [t.kind for t in branch.transitions] == ["coexistence"]
    onset, end = branch.transitions[0].onset, branch.transitions[0].end
    assert onset is not None
    assert end is not None
    _near(onset.area, 0.75)
    _near(end.area, 0.55)
    _near(onset.pressure, 30 * np.log(0.95 / 0.75))
    _near(end.pressure, 30 * np.log(0.95 / 0.75) + 8 * np.log(0.75 / 0.55))
    assert branch.collapse is None
    _near(branch.highest_pressure, 9.58 + 200 * np.log(0.55 / 0.42), 0.1)
    assert [p.name for p in branch.phases] == [
        "gaseous",
        "liquid-expanded",
        "coexistence",
        "liquid-condensed",
    ]
    moduli = [p.modulus.value for p in branch.phases[1:]]
    assert moduli == pytest.approx([30.0, 8.0, 200.0], rel=0.05)


def _numbers(branch: Branch) -> dict[str, float]:
    out = {"noise": branch.noise, "high": branch.highest_pressure.value}
    for k, transition in enumerate(branch.transitions):
        for name in ("onset", "end", "at"):
            point = getattr(transition, name)
            if point is not None:
                out[f"{k} {name} area"] = point.area.value
                out[f"{k} {name} pressure"] = point.pressure.value
    for name in ("lift_off", "limiting_area"):
        value = getattr(branch, name)
        if value is not None:
            out[name] = value.value
    if branch.collapse is not None:
        out["collapse"] = branch.collapse.pressure.value
    return out


@pytest.mark.parametrize("make", [acid, lecithin])
def test_time_shift_changes_nothing(make: object) -> None:
    trace = make()  # type: ignore[operator]
    later = replace(trace, time=trace.time + 1e6)
    assert _numbers(analyse(later).headline) == _numbers(analyse(trace).headline)


@pytest.mark.parametrize("make", [acid, lecithin])
def test_areas_scale_with_the_molecules(make: object) -> None:
    trace = make()  # type: ignore[operator]
    before = _numbers(analyse(trace).headline)
    after = _numbers(analyse(replace(trace, area=3.0 * trace.area)).headline)
    assert after.keys() == before.keys()
    for name, value in before.items():
        factor = 3.0 if "area" in name or name == "lift_off" else 1.0
        assert after[name] == pytest.approx(factor * value, rel=2e-3), name


@pytest.mark.parametrize("make", [acid, lecithin])
def test_a_timeless_trace_may_come_either_end_first(make: object) -> None:
    trace = replace(make(), time=None)  # type: ignore[operator]
    backwards = replace(trace, area=trace.area[::-1].copy(), pressure=trace.pressure[::-1].copy())
    first, second = analyse(trace), analyse(backwards)
    assert len(second.branches) == 1
    assert second.headline.direction == "compression"
    assert _numbers(second.headline) == pytest.approx(_numbers(first.headline), rel=1e-9)


def test_input_is_not_touched() -> None:
    trace = acid()
    area, pressure = trace.area.copy(), trace.pressure.copy()
    trace.area.flags.writeable = trace.pressure.flags.writeable = False
    analyse(trace)
    assert np.array_equal(trace.area, area)
    assert np.array_equal(trace.pressure, pressure)


def test_more_rows_say_the_same_with_less_doubt() -> None:
    few, many = analyse(acid(1000)).headline, analyse(acid(100_000)).headline
    a, b = few.area_at[2].area, many.area_at[2].area
    assert a is not None
    assert b is not None
    assert b.u_random < 0.5 * a.u_random  # type: ignore[operator]
    kink = many.transitions[0].at
    assert kink is not None
    _near(kink.area, 0.20)


def test_two_cycles_give_four_branches() -> None:
    down = np.linspace(1.15, 0.45, 1500)
    area = np.concatenate([down, down[::-1], down, down[::-1]])
    x = -np.log(area)
    pressure = 30 * np.maximum(x + np.log(0.95), 0)
    # each expansion lies below its compression
    lag = np.concatenate([np.zeros(1500), np.full(1500, 2.0)] * 2)
    pressure = np.maximum(pressure - lag, 0.0)
    result = analyse(make_trace(area, pressure, noise=0.05))
    found = [(b.direction, b.cycle) for b in result.branches]
    expected = [("compression", 1), ("expansion", 1), ("compression", 2), ("expansion", 2)]
    assert found == expected
    assert result.headline is result.branches[0]
    assert all(b.collapse is None for b in result.branches)


def test_a_pause_and_encoder_jitter_do_not_make_branches() -> None:
    down = np.linspace(0.40, 0.195, 1200)
    area = np.concatenate([down[:800], np.full(300, down[800]), down[800:]])
    random = np.random.default_rng(2)
    area = area + 2e-4 * random.standard_normal(area.size)
    clean = 500 * np.maximum(0.25 - area, 0) + 3500 * np.maximum(0.20 - area, 0)
    clean[800:1100] -= 1.0 * (1 - np.exp(-np.arange(300) / 50.0))
    branch = analyse(make_trace(area, clean, noise=0.05))
    assert len(branch.branches) == 1
    assert any("stood still" in w for w in branch.headline.warnings)
    assert [t.kind for t in branch.headline.transitions] == ["kink"]


def test_spikes_are_left_out_and_counted() -> None:
    trace = lecithin()
    pressure = trace.pressure.copy()
    pressure[[400, 1200, 1201, 2000, 2900]] += [8.0, -15.0, -14.0, 20.0, 9.0]
    branch = analyse(replace(trace, pressure=pressure)).headline
    assert any(w.startswith("5 isolated") for w in branch.warnings)
    assert _numbers(branch) == pytest.approx(_numbers(analyse(trace).headline), rel=5e-3)


@pytest.mark.parametrize("offset", [-0.3, 0.2, 0.9])
def test_a_small_offset_is_subtracted(offset: float) -> None:
    trace = acid()
    branch = analyse(replace(trace, pressure=trace.pressure + offset)).headline
    assert branch.zero_offset.value == pytest.approx(offset, abs=0.02)
    assert branch.collapse is not None
    _near(branch.collapse.pressure, 53.0)


@pytest.mark.parametrize("offset", [-4.0, 1.5, 6.0])
def test_a_large_offset_is_left_and_said(offset: float) -> None:
    trace = acid()
    branch = analyse(replace(trace, pressure=trace.pressure + offset)).headline
    assert branch.zero_offset.value == 0.0
    assert any("was not zeroed on a clean surface" in w for w in branch.warnings)


def test_a_run_started_on_film_has_no_zero() -> None:
    trace = lecithin()
    late = trace.area < 0.85
    branch = analyse(
        replace(trace, area=trace.area[late], pressure=trace.pressure[late], time=trace.time[late])  # type: ignore[index]
    ).headline
    assert branch.zero_offset.value == 0.0
    assert branch.zero_offset.u_systematic == pytest.approx(0.2, abs=0.05)
    assert branch.lift_off is None
    assert any("no flat start" in w for w in branch.warnings)
    assert [t.kind for t in branch.transitions] == ["coexistence"]


def test_systematic_and_random_parts_stay_apart() -> None:
    trace = replace(acid(), area_relative_u=0.02, pressure_u=0.1)
    branch = analyse(trace).headline
    assert branch.lift_off is not None
    assert branch.lift_off.u_systematic == pytest.approx(0.02 * 0.25, rel=0.02)
    assert branch.lift_off.u_random is not None
    assert branch.lift_off.u_random < 0.1 * branch.lift_off.u_systematic
    many = analyse(replace(acid(100_000), area_relative_u=0.02)).headline
    assert many.lift_off is not None
    # counting more points does not average the spreading budget down
    assert many.lift_off.u_systematic == pytest.approx(0.02 * 0.25, rel=0.02)


def test_pressures_beyond_the_branch_have_no_area() -> None:
    branch = analyse(lecithin(), at=(5.0, 500.0)).headline
    assert branch.area_at[0].area is not None
    assert branch.area_at[1].area is None
    assert branch.area_at[1].modulus is None


def test_pure_noise_has_no_features() -> None:
    area = np.linspace(1.0, 0.4, 2000)
    branch = analyse(make_trace(area, np.zeros(2000), noise=0.1)).headline
    assert branch.transitions == ()
    assert branch.collapse is None


@pytest.mark.parametrize("n", [20, 45, 90])
def test_sparse_traces_get_no_invented_features(n: int) -> None:
    branch = analyse(acid(n, stop=0.205, noise=0.1, seed=5)).headline
    assert branch.transitions == ()
    assert branch.collapse is None
    assert branch.lift_off is not None
    assert branch.lift_off.value == pytest.approx(0.25, rel=0.03)
    assert branch.limiting_area is not None
    assert branch.limiting_area.value == pytest.approx(0.25, rel=0.01)


def test_too_few_rows_says_how_many() -> None:
    area = np.linspace(1.0, 0.5, 7)
    with pytest.raises(UpstrokeError, match=r"7 usable rows.*at least 8"):
        analyse(make_trace(area, 10 / area))


@pytest.mark.parametrize("name", ["area", "pressure"])
def test_a_constant_column_is_refused(name: str) -> None:
    trace = acid(200)
    flat = replace(trace, **{name: np.full(200, 3.0)})
    with pytest.raises(UpstrokeError, match=f"the {name} never changes"):
        analyse(flat)


def test_json_has_every_field_of_the_contract() -> None:
    import json

    out = analyse(acid()).to_json()
    json.dumps(out, allow_nan=False)
    assert out["schema"] == "upstroke.isotherm/1"
    branch = out["branches"][0]
    for name in (
        "direction",
        "cycle",
        "zero_offset",
        "noise",
        "lift_off",
        "phases",
        "transitions",
        "collapse",
        "highest_pressure",
        "limiting_area",
        "modulus_max",
        "area_at",
    ):
        assert name in branch
    assert set(branch["phases"][0]) >= {"name", "area", "pressure", "modulus"}
    assert set(branch["lift_off"]) >= {"value", "u", "unit"}
    assert branch["lift_off"]["unit"] == "nm^2"
