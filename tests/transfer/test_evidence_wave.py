"""Charge of surface-bound waves, the scan-rate check, charging currents and impedance."""

import math

import numpy as np
import pytest

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_average import weighted_mean
from transfer.evidence_charging import capacitance_of_impedance, capacitance_of_voltammograms
from transfer.evidence_coverage import scan_rate_check
from transfer.evidence_series import Impedance, RawRecord, Voltammogram
from transfer.evidence_sweeps import split_sweeps
from transfer.evidence_wave import measure_wave

RATE = Quantity(0.05, None, "V/s")


def voltammogram(
    charge, rate, *, capacitance=1e-6, noise=0.0, seed=0, width=0.1, place=0.25, leak=0.0
):
    """One cycle from 0 to 0.5 V and back, 500 rows each way."""
    up = np.linspace(0.0, 0.5, 500)
    potential = np.concatenate([up, up[::-1]])
    way = np.repeat([1.0, -1.0], 500)
    w = width / (2 * math.acosh(math.sqrt(2)))
    wave = charge / (2 * w) / np.cosh((potential - place) / w) ** 2
    current = way * rate * (capacitance * (1 + 0.2 * potential) + wave) + leak
    current += np.random.default_rng(seed).normal(0, noise, 1000) if noise else 0.0
    return Voltammogram(potential, current, "cycle.csv")


def test_charge_comes_back():
    for sweep in split_sweeps(voltammogram(5e-6, 0.05, noise=2e-9)):
        wave = measure_wave(sweep, RATE, "cycle.csv")
        assert wave.charge.value == pytest.approx(5e-6, rel=0.01)
        assert abs(wave.charge.value - 5e-6) < 3 * wave.charge.u
        assert wave.potential.value == pytest.approx(0.25, abs=0.002)
        assert wave.width.value == pytest.approx(0.1, rel=0.05)


def test_sign_convention_and_direction_do_not_matter():
    record = voltammogram(5e-6, 0.05, noise=2e-9)
    turned = Voltammogram(record.potential, -record.current, "cycle.csv")
    back = Voltammogram(record.potential[::-1], -record.current[::-1], "cycle.csv")
    charges = [
        sorted(measure_wave(s, RATE, "").charge.value for s in split_sweeps(r))
        for r in (record, turned, back)
    ]
    assert charges[0] == pytest.approx(charges[1], rel=1e-9)
    assert charges[0] == pytest.approx(charges[2], rel=1e-9)


def test_two_sweeps_are_told_apart_and_a_start_inside_is_left_out():
    potential = np.concatenate(
        [np.linspace(0.2, 0.5, 150), np.linspace(0.5, 0.0, 250), np.linspace(0.0, 0.5, 250)]
    )
    current = np.gradient(potential)
    sweeps = split_sweeps(Voltammogram(potential, current, ""))
    assert [s.direction for s in sweeps] == ["cathodic", "anodic"]
    assert all(np.all(np.diff(s.potential) >= 0) for s in sweeps)


def test_no_peak_is_said():
    sweep = split_sweeps(voltammogram(0.0, 0.05, noise=2e-9))[0]
    with pytest.raises(UpstrokeError, match="no peak stands out") as caught:
        measure_wave(sweep, RATE, "cycle.csv")
    assert "cycle.csv" in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_wave_cut_by_the_window_is_said():
    sweep = split_sweeps(voltammogram(5e-6, 0.05, noise=2e-9, place=0.48))[0]
    with pytest.raises(UpstrokeError, match="cut by the potential window"):
        measure_wave(sweep, RATE, "cycle.csv")


def test_constant_potential_is_said():
    with pytest.raises(UpstrokeError, match="does not sweep"):
        split_sweeps(Voltammogram(np.full(100, 0.2), np.ones(100), "hold.csv"))


@pytest.mark.parametrize(("power", "linear"), [(1.0, True), (0.5, False)])
def test_scan_rate_check_tells_bound_from_diffusing(power, linear):
    rates = [Quantity(v, None, "V/s") for v in (0.02, 0.05, 0.1, 0.2)]
    heights = [Quantity(1e-6 * r.value**power, 1e-8 * r.value**power, "A") for r in rates]
    check = scan_rate_check(rates, heights)
    assert check.exponent.value == pytest.approx(power, abs=1e-6)
    assert check.linear is linear


def test_scan_rate_check_needs_three_rates():
    q = Quantity(1.0, 0.01, "A")
    assert scan_rate_check([Quantity(0.1, None, "V/s")] * 3, [q] * 3) is None


def test_capacitance_is_the_slope_and_steady_current_drops_out():
    records = [
        RawRecord(
            voltammogram(0.0, v, capacitance=2e-6, leak=3e-8, noise=1e-10, seed=k),
            Quantity(v, None, "V/s"),
        )
        for k, v in enumerate((0.02, 0.05, 0.1, 0.2))
    ]
    found = capacitance_of_voltammograms(records, Quantity(0.25, None, "V"), "")
    assert found.value.value == pytest.approx(2e-6 * 1.05, rel=2e-3)
    assert abs(found.value.value - 2.1e-6) < 4 * found.value.u
    assert abs(found.offset.value) < 1e-9


def test_capacitance_outside_the_window_is_said():
    record = RawRecord(voltammogram(0.0, 0.05), RATE)
    with pytest.raises(UpstrokeError, match="outside the sweeps"):
        capacitance_of_voltammograms([record], Quantity(0.9, None, "V"), "")


def spectrum(capacitance=1e-6, resistance=50.0):
    f = np.geomspace(1.0, 1e4, 41)
    z = resistance + 1 / (2j * np.pi * f * capacitance)
    return Impedance(f, z.real, z.imag, "spectrum.csv")


def test_impedance_gives_the_series_capacitance():
    record = RawRecord(spectrum(), None, Quantity(100.0, None, "Hz"))
    found = capacitance_of_impedance(record, "")
    assert found.value.value == pytest.approx(1e-6, rel=1e-6)
    assert not found.notes


def test_impedance_warns_where_resistance_rules():
    record = RawRecord(spectrum(), None, Quantity(5000.0, None, "Hz"))
    assert "phase angle" in capacitance_of_impedance(record, "").notes[0]


def test_impedance_of_the_wrong_sign_or_frequency_is_said():
    good = spectrum()
    turned = Impedance(good.frequency, good.real, -good.imaginary, "spectrum.csv")
    with pytest.raises(UpstrokeError, match="no capacitor"):
        capacitance_of_impedance(RawRecord(turned, None, Quantity(100.0, None, "Hz")), "")
    with pytest.raises(UpstrokeError, match="outside the spectrum"):
        capacitance_of_impedance(RawRecord(good, None, Quantity(1e6, None, "Hz")), "")


def test_mean_of_values_that_disagree_is_wider():
    agreeing = weighted_mean([Quantity(1.0, 0.1, ""), Quantity(1.05, 0.1, "")])
    torn = weighted_mean([Quantity(1.0, 0.1, ""), Quantity(3.0, 0.1, "")])
    assert agreeing.u == pytest.approx(0.1 / math.sqrt(2))
    # by hand: mean 2, chi-square 200, one degree of freedom
    assert torn.value == pytest.approx(2.0)
    assert torn.u == pytest.approx(0.1 / math.sqrt(2) * math.sqrt(200))
