"""The fluid branch: Volmer's equation of state, the gaseous limit, and whether they hold."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import find_branches, steady_area
from isotherm.condense import condense, despike, row_noise
from isotherm.constants import BOLTZMANN_MN_NM
from isotherm.errors import UpstrokeError
from isotherm.fluid_fit import (
    FEWEST_POINTS,
    VolmerParameters,
    fit_volmer,
    runs_test,
    smooth_misfit,
    with_systematic,
)
from isotherm.fluid_result import FluidResult, GaseousLimit, VolmerFit
from isotherm.quantity import Quantity, format_quantity
from isotherm.result import Branch, IsothermResult
from isotherm.series import run_names
from isotherm.trace import Trace

__all__ = ["analyse_fluid"]

FloatArray = NDArray[np.float64]

# Condensed from here on (Davies & Rideal, Interfacial Phenomena, 2nd ed. 1963, as widely quoted).
_CONDENSED: Final = 100.0  # mN/m
_SIGNIFICANCE: Final = 0.01  # of each of the tests of the model
_FACTOR_SIGMAS: Final = (
    2.58  # the same level for the factor of kT: normal distribution, two-sided 1 %
)
_KNEE_ROUNDING: Final = 0.5  # mN/m kept clear below a transition or collapse
_LOWER_PARTS: Final = 16  # upper ends tried when the whole branch does not follow the model
_SPARSEST: Final = 3.0  # noise standard deviations below which a pressure is not told from zero


@dataclass(frozen=True)
class _Points:
    """Independent means of rows of the fluid branch, largest area first, zero subtracted."""

    area: FloatArray
    pressure: FloatArray
    sigma: FloatArray


def analyse_fluid(trace: Trace, result: IsothermResult) -> FluidResult:
    """Fit Volmer's equation of state to the fluid branch of a run.

    Parameters
    ----------
    trace : Trace
        The rows: smoothed curves would spoil the tests of the fit.
    result : IsothermResult
        What `analyse` found in it; its first compression bounds the fluid branch (from lift-off to the
        first transition, collapse, or a modulus of 100 mN/m).

    Returns
    -------
    FluidResult

    Raises
    ------
    UpstrokeError
        Without a temperature, or a fluid branch of at least ten points.
    """
    if result.kelvin is None:
        raise UpstrokeError(
            "the temperature of this run is not known",
            where=result.source.path,
            remedy='add [subphase] temperature = "20.0 ± 0.2 degC" to its sheet',
        )
    branch = result.headline
    thermal = BOLTZMANN_MN_NM * result.kelvin
    points = _points(trace, branch, result.source.path)
    whole = _fit(points, thermal, result)
    lower = None if whole.holds else _lower_part(points, thermal, result)
    warnings = []
    if branch.zero_offset.u_random is None:
        warnings.append("the zero of pressure was not confirmed: it goes straight into Π_coh")
    if not result.area_relative_u:
        warnings.append("no uncertainty of the area scale: u of ω lacks that part")
    gaseous = _gaseous(points, thermal, result, lower or whole)
    return FluidResult(
        name=run_names([result])[0],
        path=result.source.path,
        kelvin=result.kelvin,
        whole=whole,
        lower=lower,
        gaseous=gaseous,
        area=points.area,
        pressure=points.pressure,
        u_pressure=points.sigma,
        statement=_statement(whole, lower, gaseous),
        warnings=tuple(warnings),
    )


def _points(trace: Trace, branch: Branch, path: str) -> _Points:
    """Means of the branch's own rows inside the fluid stretch."""
    found = [
        b
        for b in find_branches(trace)
        if (b.direction, b.cycle) == (branch.direction, branch.cycle)
    ]
    if not found:
        raise UpstrokeError("the trace is not the one analysed", where=path)
    rows = found[0].rows if branch.direction == "compression" else found[0].rows[::-1]
    area, pressure = steady_area(trace.area[rows]), trace.pressure[rows]
    noise = row_noise(area, pressure)
    good = ~despike(area, pressure, noise)
    nodes = condense(area[good], pressure[good], noise)
    measured = nodes.pressure - branch.zero_offset.value
    stop = branch.highest_pressure.value - _KNEE_ROUNDING
    for transition in branch.transitions:
        point = transition.at if transition.kind == "kink" else transition.onset
        if point is not None:
            stop = min(stop, point.pressure.value - _KNEE_ROUNDING)
    if branch.collapse is not None:
        stop = min(stop, branch.collapse.pressure.value - _KNEE_ROUNDING)
    curve = branch.curve
    rising = curve.pressure > max(5.0 * branch.noise, 1.0)
    stiff = np.flatnonzero(rising & (curve.modulus - 3.0 * curve.u_modulus > _CONDENSED))
    if len(stiff):
        stop = min(stop, float(curve.pressure[stiff[0]]))
    start = np.inf if branch.lift_off is None else branch.lift_off.value
    above = measured >= stop
    last = int(np.argmax(above)) if above.any() else len(measured)
    inside = np.zeros(len(measured), dtype=bool)
    inside[:last] = True
    floor = max(_SPARSEST * branch.noise, 1e-6)
    inside &= (nodes.area <= start) & (measured > floor)
    if inside.sum() < FEWEST_POINTS:
        raise UpstrokeError(
            f"no fluid branch to fit: {int(inside.sum())} points between lift-off and the first transition "
            f"or condensed phase ({stop:.1f} mN/m)",
            where=path,
            remedy="record that stretch more densely; a film condensed from lift-off on has none",
        )
    sigma = np.maximum(nodes.sigma, 1e-9)
    return _Points(nodes.area[inside], measured[inside], sigma[inside])


@dataclass(frozen=True)
class _Judged:
    """Volmer's fit, the same with a free factor of kT, and the tests of the model."""

    fit: VolmerParameters
    factor: Quantity
    misfit: float
    p_smooth: float
    p_runs: float

    @property
    def holds(self) -> bool:
        off = abs(self.factor.value - 1.0)
        scaled = off <= _FACTOR_SIGMAS * (self.factor.u or 0.0)
        return scaled and self.p_smooth >= _SIGNIFICANCE and self.p_runs >= _SIGNIFICANCE


def _judge(points: _Points, thermal: float, relative: float) -> _Judged:
    area, pressure, sigma = points.area, points.pressure, points.sigma
    fit = fit_volmer(area, pressure, sigma, thermal)
    free = fit_volmer(area, pressure, sigma, thermal, free_factor=True)
    beyond = smooth_misfit(area, sigma, free, thermal)
    # an area scale wrong by one u multiplies the factor by 1 + u
    factor = with_systematic(
        free.factor, "1", math.sqrt(free.covariance[2, 2]), [relative * free.factor]
    )
    excess = float(np.mean((fit.residual * sigma) ** 2) - np.mean(sigma**2))
    misfit = math.sqrt(max(excess, 0.0))
    return _Judged(fit, factor, misfit, beyond.p, runs_test(free.residual))


def _zero_u(points: _Points, thermal: float, result: IsothermResult) -> float:
    """u of the zero of pressure, mN/m.

    A positive reading at the largest area that was taken for the zero may have been the film's own gas
    pressure, which is at most kT/A there.
    """
    offset = result.headline.zero_offset
    own = thermal / float(result.headline.curve.area[0])
    mistaken = min(max(offset.value, 0.0), own)
    return math.hypot(offset.u or 0.0, result.pressure_u or 0.0, mistaken)


def _fit(points: _Points, thermal: float, result: IsothermResult) -> VolmerFit:
    relative = result.area_relative_u or 0.0
    judged = _judge(points, thermal, relative)
    fit = judged.fit
    larger = points.area * (1.0 + relative)
    moved = fit_volmer(larger, points.pressure, points.sigma, thermal)
    zero = _zero_u(points, thermal, result)
    return VolmerFit(
        pressure=(float(points.pressure.min()), float(points.pressure.max())),
        points=len(points.area),
        co_area=with_systematic(
            fit.co_area, "nm^2", math.sqrt(fit.covariance[0, 0]), [moved.co_area - fit.co_area]
        ),
        cohesion=with_systematic(
            fit.cohesion,
            "mN/m",
            math.sqrt(fit.covariance[1, 1]),
            [moved.cohesion - fit.cohesion, zero],
        ),
        thermal_factor=judged.factor,
        misfit=judged.misfit,
        p_smooth=judged.p_smooth,
        p_runs=judged.p_runs,
        holds=judged.holds,
    )


def _lower_part(points: _Points, thermal: float, result: IsothermResult) -> VolmerFit | None:
    """The longest part from the lowest pressure up over which the model holds."""
    n = len(points.area)
    # at least a quarter of the branch: over less, any smooth law fits
    fewest = max(FEWEST_POINTS + 4, n // 4)
    for last in np.unique(np.linspace(fewest, n - 1, _LOWER_PARTS).astype(int))[::-1]:
        part = _Points(points.area[:last], points.pressure[:last], points.sigma[:last])
        if last < fewest or len(part.area) < FEWEST_POINTS:
            continue
        if _judge(part, thermal, result.area_relative_u or 0.0).holds:
            return _fit(part, thermal, result)
    return None


def _gaseous(
    points: _Points, thermal: float, result: IsothermResult, fit: VolmerFit
) -> GaseousLimit | None:
    """Π A / kT at zero pressure, from a line of Π A against Π over the lowest third of the fit.

    Exact for Volmer's law without cohesion, Π A = kT + ω Π.
    """
    low, high = fit.pressure
    part = points.pressure <= low + (high - low) / 3.0
    if part.sum() < 4:
        return None
    area, pressure = points.area[part], points.pressure[part]
    u = points.sigma[part] * area
    design = np.column_stack([np.ones(len(area)), pressure]) / u[:, None]
    product = pressure * area
    inverse = np.linalg.pinv(design.T @ design)
    at_zero = float((inverse @ design.T @ (product / u))[0])
    zero = _zero_u(points, thermal, result)
    shifted = (pressure + zero) * area
    shifted_design = np.column_stack([np.ones(len(area)), pressure + zero]) / u[:, None]
    moved = float((np.linalg.pinv(shifted_design) @ (shifted / u))[0]) - at_zero
    ratio = with_systematic(
        at_zero / thermal,
        "1",
        math.sqrt(float(inverse[0, 0])) / thermal,
        [moved / thermal, (result.area_relative_u or 0.0) * at_zero / thermal],
    )
    u_ratio = ratio.u or 0.0
    if u_ratio > 0.25:
        reading = "cannot tell"
    elif ratio.value < 1.0 - 2.0 * u_ratio:
        reading = "associated"
    elif ratio.value <= 1.0 + 2.0 * u_ratio:
        reading = "gaseous"
    else:
        reading = "cannot tell"
    return GaseousLimit(ratio, (float(area.min()), float(area.max())), reading)


def _statement(whole: VolmerFit, lower: VolmerFit | None, gaseous: GaseousLimit | None) -> str:
    span = f"{whole.pressure[0]:.1f} to {whole.pressure[1]:.1f} mN/m"
    if whole.holds:
        text = f"Volmer's equation describes the fluid branch, {span}, within its noise"
    elif lower is not None:
        text = (
            f"Volmer's equation does not hold over the whole fluid branch (off by {whole.misfit:.2g} mN/m "
            f"rms), but up to {lower.pressure[1]:.1f} mN/m it does"
        )
    else:
        text = (
            f"Volmer's equation does not hold on the fluid branch, {span}: off by {whole.misfit:.2g} mN/m "
            "rms, far beyond noise; co-area and cohesion are descriptive only"
        )
    if gaseous is not None:
        ratio: Quantity = gaseous.ratio
        text += f"; Π A goes to {format_quantity(ratio)} kT at zero pressure: {gaseous.reading}"
    return text
