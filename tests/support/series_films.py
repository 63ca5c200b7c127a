"""Invented films with a closed form, as results the series functions take."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity
from isotherm.result import (
    AreaAt,
    Branch,
    Collapse,
    Curve,
    IsothermResult,
    MaxModulus,
    Point,
    Transition,
)
from isotherm.sheet import Component, Film, RunSheet, Subphase
from isotherm.source import Source

FloatArray = NDArray[np.float64]
K_MN_NM = 0.01380649  # k in mN/m nm^2 per kelvin


@dataclass(frozen=True)
class Lipid:
    """Volmer fluid, a sloping coexistence, a condensed branch of modulus E0 + c (Π - Π_end), collapse."""

    omega: float = 0.40
    cohesion: float = 5.0
    transition: float | None = 10.0
    gap: float = 0.15  # ΔA at the coexistence, nm^2
    plateau: float = 1.0  # rise of pressure over the coexistence, mN/m
    modulus: float = 120.0
    stiffening: float = 3.0
    collapse: float | None = 60.0
    last: float = 65.0  # where the trace stops when there is no collapse
    kelvin: float = 295.0

    def area(self, pressure: FloatArray) -> FloatArray:
        """Area per molecule (nm^2) at `pressure` (mN/m)."""
        p = np.asarray(pressure, dtype=float)
        fluid = self.omega + K_MN_NM * self.kelvin / (p + self.cohesion)
        if self.transition is None:
            return fluid
        at = self.omega + K_MN_NM * self.kelvin / (self.transition + self.cohesion)
        through = at - self.gap * (p - self.transition) / self.plateau
        end = self.transition + self.plateau
        x = np.maximum(p - end, 0.0)
        strain = np.log1p(self.stiffening * x / self.modulus) / self.stiffening
        condensed = (at - self.gap) * np.exp(-strain)
        return np.where(p <= self.transition, fluid, np.where(p <= end, through, condensed))


def result_of(
    lipid: Lipid,
    *,
    name: str = "run",
    scale: float = 1.0,
    noise: float = 0.0,
    area_relative_u: float | None = 0.01,
    pressure_u: float | None = 0.1,
    rng: np.random.Generator | None = None,
    shift: float = 0.0,
    points: int = 300,
    lowest: float = 0.3,
    other_area: object = None,
) -> IsothermResult:
    """A result as the analysis gives it, exact but for `scale`, `shift` (mN/m) and `noise` (mN/m)."""
    rng = rng or np.random.default_rng(0)
    area_of = other_area if callable(other_area) else lipid.area
    top = lipid.collapse if lipid.collapse is not None else lipid.last
    fine = np.linspace(lowest, top, 20000)
    areas = np.asarray(area_of(fine)) * scale
    # even in area, as a condensed trace is
    even = np.linspace(areas[0], areas[-1], points)
    pressure = np.interp(-even, -areas, fine) + shift
    u = np.full(points, max(noise, 1e-3))
    noisy = pressure + rng.normal(0.0, noise, points) if noise else pressure
    modulus = -even * np.gradient(pressure, even)
    relative = area_relative_u or 0.0

    def area_q(value: float) -> Quantity:
        return Quantity.combine(
            value, "nm^2", u_random=1e-4 * value, u_systematic=relative * value or None
        )

    def pressure_q(value: float, jitter: float = 0.0) -> Quantity:
        return Quantity.combine(
            value + shift + jitter, "mN/m", u_random=max(noise / 3, 0.01), u_systematic=pressure_u
        )

    def point(p: float) -> Point:
        return Point(area_q(float(area_of(np.array([p]))[0]) * scale), pressure_q(p))

    transitions: tuple[Transition, ...] = ()
    if lipid.transition is not None and other_area is None:
        transitions = (
            Transition(
                "coexistence",
                onset=point(lipid.transition),
                end=point(lipid.transition + lipid.plateau),
            ),
        )
    collapse = None
    if lipid.collapse is not None:
        end = point(lipid.collapse)
        collapse = Collapse("constant-pressure", end.area, end.pressure)
    stiff = int(np.argmax(modulus))
    branch = Branch(
        direction="compression",
        cycle=1,
        rows=3000,
        zero_offset=Quantity(0.0, 0.02, "mN/m"),
        noise=noise,
        lift_off=area_q(float(even[0])),
        phases=(),
        transitions=transitions,
        collapse=collapse,
        highest_pressure=pressure_q(top),
        limiting_area=None,
        modulus_max=MaxModulus(
            Quantity(float(modulus[stiff]), 2.0, "mN/m"),
            pressure_q(float(pressure[stiff]) - shift),
            area_q(float(even[stiff])),
        ),
        area_at=(AreaAt(30.0, area_q(float(np.interp(30.0, pressure, even))), None),),
        curve=Curve(even, noisy, u, modulus, 0.02 * np.abs(modulus) + 1.0),
    )
    return IsothermResult(
        source=Source(f"{name}.csv", f"sha-{name}", 3000),
        branches=(branch,),
        title=name,
        area_relative_u=area_relative_u,
        pressure_u=pressure_u,
        kelvin=lipid.kelvin,
    )


def sheet_of(fractions: dict[str, float], *, celsius: float = 20.0, **film: Quantity) -> RunSheet:
    """A run sheet with these mole fractions."""
    components = tuple(
        Component(n, Quantity(700.0, None, "g/mol"), Quantity(x, None, "1"))
        for n, x in fractions.items()
    )
    return RunSheet(
        film=replace(Film(components=components), **film),  # type: ignore[arg-type]
        subphase=Subphase(temperature=Quantity(celsius, 0.1, "degC")),
    )


def regular_log(x: float) -> float:
    """x ln x + (1 - x) ln(1 - x)."""
    return x * math.log(x) + (1 - x) * math.log(1 - x)
