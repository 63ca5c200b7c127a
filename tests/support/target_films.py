"""Isotherm results built by hand from closed formulas, for tests of the dipping pressure."""

from __future__ import annotations

import numpy as np

from isotherm.hold import analyse_hold
from isotherm.hold_read import HoldRecord
from isotherm.hold_result import HoldResult
from isotherm.hold_segments import Stretch
from isotherm.quantity import Quantity
from isotherm.result import Branch, Collapse, Curve, IsothermResult, Phase, Point, Transition
from isotherm.source import Source

STIFF = 200.0  # mN/m, modulus of the plain film throughout
FOOT = 0.25  # nm^2, its area at zero pressure
START = 0.45  # nm^2, where its record starts
TOP = 40.0  # mN/m, its collapse


def mn(value: float, u: float = 0.0) -> Quantity:
    return Quantity.combine(value, "mN/m", u_random=u, u_systematic=0.0)


def nm2(value: float) -> Quantity:
    return Quantity.combine(value, "nm^2", u_random=0.0, u_systematic=0.0)


def plain_area(pressure: float) -> float:
    """Area, nm^2, of a film of constant modulus: dP = -M d ln A, so A = A0 exp(-P/M)."""
    return FOOT * float(np.exp(-pressure / STIFF))


def coexistence(onset: float, end: float | None, u: float = 0.0) -> Transition:
    return Transition(
        "coexistence",
        onset=Point(nm2(plain_area(onset)), mn(onset, u)),
        end=None if end is None else Point(nm2(plain_area(end)), mn(end, u)),
    )


def kink(at: float, u: float = 0.0) -> Transition:
    return Transition("kink", at=Point(nm2(plain_area(at)), mn(at, u)))


def plain_film(
    *transitions: Transition,
    collapse_u: float = 0.0,
    reached: bool = True,
    molecules: float | None = 5.0e16,
    modulus_u: float = 0.0,
    stretch: float = 1.0,
    lift: float = 0.0,
    nodes: int = 801,
) -> IsothermResult:
    """A film of constant modulus from lift-off to collapse.

    stretch : factor on every area per molecule. lift : mN/m added to every pressure above lift-off.
    """
    rise = np.linspace(0.0, TOP, nodes)
    flat = np.linspace(START, FOOT, 60)[:-1]
    area = np.concatenate([flat, FOOT * np.exp(-rise / STIFF)]) * stretch
    pressure = np.concatenate([np.zeros(flat.size), rise]) + lift
    modulus = np.concatenate([np.zeros(flat.size), np.full(nodes, STIFF)])
    phases = (
        Phase("gaseous", (START * stretch, FOOT * stretch), (lift, lift), mn(0.0)),
        Phase(
            "liquid-condensed",
            (FOOT * stretch, plain_area(TOP) * stretch),
            (lift, TOP + lift),
            mn(STIFF, modulus_u),
        ),
    )
    return IsothermResult(
        source=Source("plain.txt", "0" * 64, area.size),
        branches=(
            Branch(
                direction="compression",
                cycle=1,
                rows=area.size,
                zero_offset=mn(0.0),
                noise=0.0,
                lift_off=nm2(FOOT * stretch),
                phases=phases,
                transitions=transitions,
                collapse=Collapse(
                    "constant-pressure",
                    nm2(plain_area(TOP) * stretch),
                    mn(TOP + lift, collapse_u),
                )
                if reached
                else None,
                highest_pressure=mn(TOP + lift, collapse_u),
                limiting_area=None,
                modulus_max=None,
                area_at=(),
                curve=Curve(
                    area,
                    pressure,
                    np.zeros(area.size),
                    modulus,
                    np.full(area.size, modulus_u),
                    None if molecules is None else area * molecules / 1e14,
                ),
            ),
        ),
        title="plain film",
        area_relative_u=0.0,
        pressure_u=0.0,
        molecules=molecules,
    )


def steady_hold(
    pressure: float, rate: float, *, kind: str = "isobaric", seed: int = 0
) -> HoldResult:
    """A hold of two hours that loses `rate` (1/s of its first level) all the time."""
    rng = np.random.default_rng(seed)
    time = np.arange(0.0, 7200.0, 4.0)
    left = 1.0 - rate * time
    steady = np.ones(time.size)
    area, held = (left, steady) if kind == "isobaric" else (steady, left)
    record = HoldRecord(
        source=Source("hold.txt", "0" * 64, time.size),
        time=time,
        area=100.0 * area + rng.normal(0.0, 0.01, time.size),
        area_unit="cm^2",
        pressure=pressure * held + rng.normal(0.0, 0.02, time.size),
        stretches=(Stretch(kind, 0, time.size),),
    )
    return analyse_hold(record)
