"""Results built by hand, so that the command's words and files are tested apart from the science."""

from __future__ import annotations

import numpy as np

from isotherm.quantity import Quantity
from isotherm.result import (
    AreaAt,
    Branch,
    Collapse,
    Curve,
    IsothermResult,
    MaxModulus,
    Phase,
    Point,
    Tangent,
    Transition,
)
from isotherm.source import ColumnSource, Source

RELATIVE_U = 0.01  # of the area scale, common to a run


def area(value: float, u_random: float = 0.0002) -> Quantity:
    return Quantity.combine(value, "nm^2", u_random=u_random, u_systematic=RELATIVE_U * value)


def pressure(value: float, u_random: float = 0.03) -> Quantity:
    return Quantity.combine(value, "mN/m", u_random=u_random, u_systematic=0.1)


def modulus(value: float) -> Quantity:
    return Quantity.combine(value, "mN/m", u_random=0.02 * value, u_systematic=None)


def acid_curve(m: int = 220) -> Curve:
    """Gas, a coexistence from 0.60 to 0.30 nm^2 near 8 mN/m, a kink at 0.215, collapse at 0.195."""
    a = np.linspace(0.95, 0.17, m)
    corners_a = [0.17, 0.195, 0.215, 0.30, 0.60, 0.80, 0.95]
    corners_p = [51.2, 50.8, 26.0, 9.0, 8.0, 0.05, 0.0]
    p = np.interp(a, corners_a, corners_p)
    slope = np.gradient(p, a)
    k = np.clip(-a * slope, 0.05, None)
    return Curve(
        area=a,
        pressure=p,
        u_pressure=np.full(m, 0.02),
        modulus=k,
        u_modulus=0.03 * k + 0.2,
        trough_area=a * 500,
    )


def compression() -> Branch:
    return Branch(
        direction="compression",
        cycle=1,
        rows=1203,
        zero_offset=pressure(-0.12, 0.01),
        noise=0.05,
        lift_off=area(0.80, 0.001),
        phases=(
            Phase("liquid-expanded", (0.80, 0.60), (0.05, 8.0), modulus(28.0)),
            Phase("liquid-expanded to condensed", (0.60, 0.30), (8.0, 9.0), modulus(1.5)),
            Phase("intermediate", (0.30, 0.215), (9.0, 26.0), modulus(52.0)),
            Phase("liquid-condensed", (0.215, 0.195), (26.0, 50.8), modulus(248.0)),
        ),
        transitions=(
            Transition(
                "coexistence",
                onset=Point(area(0.60, 0.002), pressure(8.0)),
                end=Point(area(0.30, 0.003), pressure(9.0)),
            ),
            Transition("kink", at=Point(area(0.215, 0.0006), pressure(26.0))),
        ),
        collapse=Collapse("constant-pressure", area(0.195), pressure(50.8)),
        highest_pressure=pressure(51.2),
        limiting_area=area(0.2361, 0.0005),
        modulus_max=MaxModulus(modulus(251.0), pressure(48.0), area(0.1973)),
        area_at=(
            AreaAt(10.0, area(0.2951), modulus(55.0)),
            AreaAt(30.0, area(0.2118), modulus(245.0)),
            AreaAt(60.0, None, None),
        ),
        curve=acid_curve(),
        tangent=Tangent(-1240.0, 292.6, (0.215, 0.195)),
        time=(0.0, 2410.0),
    )


def expansion() -> Branch:
    down = acid_curve()
    shifted = Curve(
        area=down.area[down.area > 0.19] - 0.006,
        pressure=down.pressure[down.area > 0.19],
        u_pressure=down.u_pressure[down.area > 0.19],
        modulus=down.modulus[down.area > 0.19],
        u_modulus=down.u_modulus[down.area > 0.19],
    )
    return Branch(
        direction="expansion",
        cycle=1,
        rows=1100,
        zero_offset=pressure(-0.12, 0.01),
        noise=0.05,
        lift_off=None,
        phases=(),
        transitions=(),
        collapse=None,
        highest_pressure=pressure(50.0),
        limiting_area=None,
        modulus_max=None,
        area_at=(AreaAt(30.0, area(0.2061), modulus(240.0)),),
        curve=shifted,
        time=(2420.0, 4600.0),
        warnings=("not every knee of the compression is found on the way back",),
    )


def result(*branches: Branch, path: str = "spacer.txt") -> IsothermResult:
    return IsothermResult(
        source=Source(
            path=path,
            digest="0" * 64,
            rows=2412,
            columns={
                "time": ColumnSource("Time", "s", 1),
                "molecular_area": ColumnSource("Area per molecule", "Å²", 2),
                "pressure": ColumnSource("Surface pressure", "mN/m", 3),
            },
        ),
        branches=branches or (compression(),),
        warnings=("tension of the clean subphase taken for pure water at 20.0 °C",),
        title="Spacer film, run 3",
        settings={"at": [10.0, 30.0, 60.0]},
        area_relative_u=RELATIVE_U,
        pressure_u=0.1,
    )
