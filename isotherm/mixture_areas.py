"""Mean area and its integral over pressure for every composition, with the parts of their u."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.series import area_against_pressure, pressure_range
from isotherm.sheet import RunSheet

__all__ = [
    "Composition",
    "CompositionAreas",
    "Compositions",
    "ScaleParts",
    "composition_areas",
    "compositions_of",
]

FloatArray = NDArray[np.float64]

_PURE: Final = 1e-6  # mole fraction of anything else below which a film is pure
_GRID: Final = 400  # pressures of the integral
# Degrees of freedom from which the pooled scatter of repeated runs is known to about 30 % (its own
# relative standard deviation is 1/√(2ν)) and replaces what the sheets state.
_ENOUGH_REPEATS: Final = 6


@dataclass(frozen=True)
class Composition:
    """Runs of one composition: mole fractions, their u (0 where not stated), places in the series."""

    fractions: tuple[float, ...]
    u_fractions: tuple[float, ...]
    runs: tuple[int, ...]

    @property
    def pure(self) -> int | None:
        """Which component it is, when only one is present."""
        most = int(np.argmax(self.fractions))
        return most if self.fractions[most] > 1.0 - _PURE else None


@dataclass(frozen=True)
class Compositions:
    """Component names, and the compositions of a series: pure ones first, in component order."""

    names: tuple[str, ...]
    groups: tuple[Composition, ...]


@dataclass(frozen=True)
class ScaleParts:
    """Relative standard uncertainty of one run's area scale, split by what shares it.

    solution : the spreading solution of one composition. volume : drawn anew each run.
    common : the rest (trough, molar mass), shared by the whole series.
    """

    solution: float
    volume: float
    common: float


@dataclass(frozen=True)
class CompositionAreas:
    """Areas of all compositions at `pressure` (p,), rows in the order of the compositions (c, p).

    area nm^2; integral nm^2 mN/m, from zero pressure, the area at `lowest` (mN/m), `area_lowest` (c,),
    standing for every pressure below it; var_area, var_integral: variances independent between compositions;
    common : relative u shared by every run. scatter : pooled relative standard deviation between
    repeated runs (None without repeats) with its degrees of freedom; scatter_share: part of var_area
    that comes from it.
    """

    pressure: FloatArray
    area: FloatArray
    integral: FloatArray
    var_area: FloatArray
    var_integral: FloatArray
    lowest: float
    area_lowest: FloatArray
    common: float
    scatter: float | None
    freedom: float
    scatter_share: FloatArray


def _relative(quantity: Quantity | None) -> float:
    if quantity is None or not quantity.u or quantity.value == 0:
        return 0.0
    return abs(quantity.u / quantity.value)


def scale_parts(result: IsothermResult, sheet: RunSheet) -> ScaleParts:
    """Split a run's area-scale uncertainty; without solution and volume all of it is the run's own."""
    total = result.area_relative_u or 0.0
    film = sheet.film
    if film.concentration is None and film.volume is None:
        return ScaleParts(total, 0.0, 0.0)
    solution = min(_relative(film.concentration), total)
    volume = min(_relative(film.volume), math.sqrt(max(total**2 - solution**2, 0.0)))
    return ScaleParts(solution, volume, math.sqrt(max(total**2 - solution**2 - volume**2, 0.0)))


def _key(name: str) -> str:
    return " ".join(name.split()).casefold()


def compositions_of(sheets: Sequence[RunSheet]) -> Compositions:
    """Gather the runs of each composition from the sheets' mole fractions.

    Raises
    ------
    UpstrokeError
        Where a sheet names no component, fractions do not add up to one, fewer than two components
        occur, or a component has no pure run.
    """
    names: dict[str, str] = {}
    for number, sheet in enumerate(sheets, start=1):
        if not sheet.film.components:
            raise UpstrokeError(
                "the run sheet names no component",
                where=sheet.path or f"run {number}",
                remedy="add [[film.component]] with name and mole_fraction",
            )
        for component in sheet.film.components:
            if component.mole_fraction.value > _PURE:
                names.setdefault(_key(component.name), component.name)
    order = list(names)
    if len(order) < 2:
        raise UpstrokeError(
            f"only one component in the series: {', '.join(names.values()) or 'unnamed'}",
            remedy="give isotherms of the components and of their mixtures",
        )
    groups: dict[tuple[float, ...], list[int]] = {}
    spread: dict[tuple[float, ...], tuple[float, ...]] = {}
    for i, sheet in enumerate(sheets):
        x = [0.0] * len(order)
        u = [0.0] * len(order)
        for component in sheet.film.components:
            if component.mole_fraction.value > _PURE:
                place = order.index(_key(component.name))
                x[place] += component.mole_fraction.value
                u[place] = math.hypot(u[place], component.mole_fraction.u or 0.0)
        total = sum(x)
        if abs(total - 1.0) > 0.005:
            raise UpstrokeError(
                f"the mole fractions add up to {total:.4g}",
                where=sheet.path or f"run {i + 1}",
                remedy="make them add up to 1",
            )
        key = tuple(round(v / total, 6) for v in x)
        groups.setdefault(key, []).append(i)
        spread[key] = tuple(u)
    every = [Composition(key, spread[key], tuple(runs)) for key, runs in groups.items()]
    pures = {c.pure: c for c in every if c.pure is not None}
    for place, key_name in enumerate(order):
        if place not in pures:
            raise UpstrokeError(
                f"no run of pure {names[key_name]}",
                remedy="add its isotherm; the ideal area needs every component alone",
            )
    mixed = sorted((c for c in every if c.pure is None), key=lambda c: c.fractions, reverse=True)
    if not mixed:
        raise UpstrokeError("no run of a mixture", remedy="add isotherms of the mixtures")
    return Compositions(tuple(names.values()), (*(pures[i] for i in range(len(order))), *mixed))


def composition_areas(
    results: Sequence[IsothermResult],
    sheets: Sequence[RunSheet],
    compositions: Sequence[Composition],
    pressures: Sequence[float],
) -> CompositionAreas:
    """Average the runs of each composition at each pressure.

    Random errors, drawn volumes and pressure zeros average over repeated runs; the solution's
    concentration does not; what every run shares is kept out of the independent variance, because a
    common factor on all areas cannot create an excess area.
    """
    wanted = np.asarray(pressures, dtype=np.float64)
    lowest = max(pressure_range(r.headline, where=r.source.path)[0] for r in results)
    top = float(wanted.max())
    span = max(top - lowest, 1e-9)
    # finer towards low pressure, where areas change fastest
    grid = np.unique(
        np.concatenate(
            (
                np.linspace(lowest, max(top, lowest + 1e-9), _GRID),
                lowest + np.geomspace(1e-3, 1.0, _GRID // 2) * span,
                wanted[wanted >= lowest],
            )
        )
    )
    parts = [scale_parts(r, s) for r, s in zip(results, sheets, strict=True)]
    curves = [area_against_pressure(r.headline, grid) for r in results]
    at = np.searchsorted(grid, wanted)
    at = np.clip(at, 0, len(grid) - 1)
    below = wanted < lowest
    logs = np.log(np.vstack([c.area for c in curves]))
    scatter, freedom = _scatter(logs, compositions)
    shape = (len(compositions), len(wanted))
    area, integral = np.full(shape, math.nan), np.full(shape, math.nan)
    var_area, var_integral = np.full(shape, math.nan), np.full(shape, math.nan)
    share = np.zeros(shape)
    area_lowest = np.full(len(compositions), math.nan)
    for row, composition in enumerate(compositions):
        runs = composition.runs
        n = len(runs)
        mean = np.mean([curves[i].area for i in runs], axis=0)
        steps = 0.5 * (mean[1:] + mean[:-1]) * np.diff(grid)
        running = np.concatenate(([0.0], np.cumsum(steps))) + mean[0] * lowest
        area[row], integral[row], area_lowest[row] = mean[at], running[at], mean[0]
        solution = float(np.mean([parts[i].solution for i in runs]))
        volume = math.sqrt(float(np.mean([parts[i].volume ** 2 for i in runs])))
        # Enough repeats measure volume, zero and noise together; fewer only guard what is stated.
        measured = scatter is not None and freedom >= _ENOUGH_REPEATS
        repeat = (scatter or 0.0) if measured else max(scatter or 0.0, volume)
        relative = solution**2 + repeat**2 / n
        noise = np.zeros(len(wanted))
        noise_integral = np.zeros(len(wanted))
        for i in () if measured else runs:
            result = results[i]
            u_zero = math.hypot(result.pressure_u or 0.0, result.headline.zero_offset.u or 0.0)
            noise += curves[i].u_random[at] ** 2 + (curves[i].softness[at] * u_zero) ** 2
            # an offset δ of Π moves the integral by δ [A(lowest) - A(Π)], its random part by less
            noise_integral += ((curves[i].area[0] - curves[i].area[at]) * u_zero) ** 2
            noise_integral += _integral_noise(result, grid[at])
        var_area[row] = area[row] ** 2 * relative + noise / n**2
        var_integral[row] = integral[row] ** 2 * relative + noise_integral / n**2
        if scatter is not None and repeat == scatter:
            share[row] = area[row] ** 2 * scatter**2 / n / var_area[row]
    for table in (area, integral, var_area, var_integral):
        table[:, below] = math.nan
    return CompositionAreas(
        pressure=wanted,
        area=area,
        integral=integral,
        var_area=var_area,
        var_integral=var_integral,
        lowest=lowest,
        area_lowest=area_lowest,
        common=float(np.mean([p.common for p in parts])),
        scatter=scatter,
        freedom=freedom,
        scatter_share=share,
    )


def _scatter(logs: FloatArray, compositions: Sequence[Composition]) -> tuple[float | None, float]:
    """Pooled standard deviation of ln A between repeated runs, averaged over pressure."""
    squares, freedom = 0.0, 0
    for composition in compositions:
        if len(composition.runs) > 1:
            block = logs[list(composition.runs)]
            known = np.isfinite(block).all(axis=0)
            if known.any():
                freedom += len(composition.runs) - 1
                deviations = block[:, known] - block[:, known].mean(axis=0)
                squares += float((deviations**2).sum(axis=0).mean())
    return (math.sqrt(squares / freedom), float(freedom)) if freedom else (None, math.inf)


def _integral_noise(result: IsothermResult, pressure: FloatArray) -> FloatArray:
    """Variance of ∫ A dΠ from the noise of the condensed points, each independent, (nm^2 mN/m)^2."""
    curve = result.headline.curve
    u = np.where(np.isfinite(curve.u_pressure), curve.u_pressure, 0.0)
    running = np.cumsum((u * np.abs(np.gradient(curve.area))) ** 2)
    rising = np.maximum.accumulate(curve.pressure)
    return np.asarray(np.interp(pressure, rising, running))
