"""Isotherms of components and their mixtures: excess area, Gibbs energy of mixing, miscibility."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np

from isotherm.errors import UpstrokeError
from isotherm.mixture_areas import Composition, CompositionAreas, composition_areas, compositions_of
from isotherm.mixture_excess import excess_at, ideal_mixing, regular_solution
from isotherm.mixture_phase_rule import surface_phase_rule
from isotherm.mixture_result import MixtureResult, MixturesAt, MixtureState
from isotherm.mixture_verdict import departure_verdict
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.series import pressure_range, two_sided_p
from isotherm.sheet import RunSheet

__all__ = ["analyse_mixture"]

_USUAL_PRESSURES: Final = (5.0, 10.0, 15.0, 20.0, 25.0, 30.0, 35.0, 40.0)  # mN/m
_SAME_TEMPERATURE: Final = 0.5  # K


def analyse_mixture(
    results: Sequence[IsothermResult],
    sheets: Sequence[RunSheet],
    *,
    pressures: Sequence[float] | None = None,
) -> MixtureResult:
    """Compare mixtures with what their components alone would give.

    Parameters
    ----------
    results : sequence of IsothermResult
        One a run; its first compression is used. Every component must be among them alone.
    sheets : sequence of RunSheet
        One a run; the mole fractions are read from `film.components`.
    pressures : sequence of float, optional
        mN/m; by default every 5 mN/m that all compositions reach, up to 40.

    Returns
    -------
    MixtureResult

    Raises
    ------
    UpstrokeError
        For components without a pure run, no mixture, or no pressure that all runs have.

    Notes
    -----
    A_ex = A - Σ x_i A_i and ΔG_ex = N_A ∫₀^Π A_ex dΠ (Goodrich, Proc. 2nd Int. Congr. Surface
    Activity 1957, 1, 85; Pagano & Gershfeld, J. Phys. Chem. 1972, 76, 1238; both from memory).
    Uncertainties: the scale error of each solution is independent, what the whole series shares only
    multiplies A_ex, and the components' errors are carried into every mixture (their covariance).
    """
    if len(results) != len(sheets):
        raise UpstrokeError(
            f"{len(results)} runs but {len(sheets)} run sheets",
            remedy="give one sheet for each run",
        )
    found = compositions_of(sheets)
    names, compositions = found.names, found.groups
    warnings: list[str] = []
    chosen = _pressures(results, pressures, warnings)
    areas = composition_areas(results, sheets, compositions, chosen)
    kelvin = _kelvin(results, warnings)
    if not any(r.area_relative_u for r in results) and areas.scatter is None:
        warnings.append(
            "no uncertainty of the area scale (run sheets) and no repeated run: the significance below "
            "rests on noise alone and is overstated"
        )
    if areas.scatter is None:
        warnings.append(
            "no composition was repeated: scatter between runs is taken from the sheets"
        )
    warnings.append(
        f"below {areas.lowest:.2f} mN/m the excess area is taken constant for the Gibbs energy"
    )
    # a run may reach a pressure and yet have no area there, as where its readings jump over it
    known = np.isfinite(areas.area).all(axis=0) & np.isfinite(areas.var_area).all(axis=0)
    if not known.all():
        lost = ", ".join(f"{p:g}" for p in areas.pressure[~known])
        warnings.append(f"{lost} mN/m left out: not every run has an area there")
    at = tuple(
        _at(names, compositions, areas, int(column), kelvin) for column in np.flatnonzero(known)
    )
    rules = tuple(
        rule
        for kind in ("collapse", "transition")
        if (rule := surface_phase_rule(kind, results, compositions, names)) is not None
    )
    return MixtureResult(
        names,
        kelvin,
        at,
        rules,
        areas.lowest,
        tuple(r.source.path for r in results),
        tuple(warnings),
    )


def _pressures(
    results: Sequence[IsothermResult], pressures: Sequence[float] | None, warnings: list[str]
) -> tuple[float, ...]:
    ranges = [pressure_range(r.headline, where=r.source.path) for r in results]
    low, high = max(r[0] for r in ranges), min(r[1] for r in ranges)
    wanted = _USUAL_PRESSURES if pressures is None else tuple(sorted(set(pressures)))
    usable = tuple(p for p in wanted if low <= p <= high)
    left_out = [p for p in wanted if p not in usable]
    if pressures is not None and left_out:
        warnings.append(
            f"not every run has {', '.join(f'{p:g}' for p in left_out)} mN/m: left out (all have "
            f"{low:.1f} to {high:.1f} mN/m)"
        )
    if not usable:
        if pressures is None and high > low:
            return (0.5 * (low + high),)
        raise UpstrokeError(
            "no pressure that every run has",
            remedy=f"choose pressures between {low:.1f} and {high:.1f} mN/m"
            if high > low
            else "leave out the run that never rises",
        )
    return usable


def _kelvin(results: Sequence[IsothermResult], warnings: list[str]) -> float | None:
    known = [r.kelvin for r in results if r.kelvin is not None]
    if not known:
        warnings.append("no temperature: the total Gibbs energy of mixing cannot be had")
        return None
    if max(known) - min(known) > _SAME_TEMPERATURE:
        warnings.append(
            f"temperatures of the runs differ by {max(known) - min(known):.1f} K: the excess mixes "
            "composition with temperature"
        )
    return float(np.mean(known))


def _at(
    names: Sequence[str],
    compositions: Sequence[Composition],
    areas: CompositionAreas,
    column: int,
    kelvin: float | None,
) -> MixturesAt:
    """Every composition at one pressure."""
    pressure = float(areas.pressure[column])
    components = len(compositions[0].fractions)
    excess = excess_at(compositions, areas, column)
    mixtures = compositions[components:]
    u_null = np.sqrt(np.diag(excess.cov_area))
    u_null_gibbs = np.sqrt(np.diag(excess.cov_gibbs))
    area = [
        Quantity(float(a), float(u), "nm^2")
        for a, u in zip(areas.area[:, column], excess.u_area, strict=True)
    ]
    states = [
        MixtureState(c.fractions, len(c.runs), area[i])
        for i, c in enumerate(compositions[:components])
    ]
    p_values = []
    for k, composition in enumerate(mixtures):
        freedom = float(excess.freedom[k])
        gibbs = Quantity(float(excess.gibbs[k]), float(excess.u_gibbs[k]), "J/mol")
        ideal, departure = float(excess.area_ideal[k]), float(excess.area_excess[k])
        p_values.append(two_sided_p(departure, float(u_null[k]), freedom))
        states.append(
            MixtureState(
                fractions=composition.fractions,
                runs=len(composition.runs),
                area=area[components + k],
                ideal=Quantity(ideal, float(excess.u_ideal[k]), "nm^2"),
                excess=Quantity(departure, float(excess.u_excess[k]), "nm^2"),
                excess_relative=Quantity(departure / ideal, float(u_null[k]) / ideal, "1"),
                p=p_values[k],
                gibbs_excess=gibbs,
                gibbs_p=two_sided_p(gibbs.value, float(u_null_gibbs[k]), freedom),
                gibbs_mixing=_total(gibbs, composition, kelvin),
            )
        )
    labels = [
        ", ".join(f"x({n}) = {x:.3g}" for n, x in zip(names[1:], c.fractions[1:], strict=True))
        for c in mixtures
    ]
    verdict = departure_verdict(pressure, excess, p_values, labels)
    fit = None
    if components == 2:
        fraction = np.array([c.fractions[0] for c in mixtures])
        fit = regular_solution(fraction, excess, areas.common)
    return MixturesAt(
        pressure,
        tuple(states),
        verdict.word,
        verdict.p,
        verdict.statement,
        None if fit is None else fit.value,
        None if fit is None else fit.p,
    )


def _total(gibbs: Quantity, composition: Composition, kelvin: float | None) -> Quantity | None:
    if kelvin is None:
        return None
    ideal = ideal_mixing(composition, kelvin)
    return Quantity(gibbs.value + ideal.value, math.hypot(gibbs.u or 0.0, ideal.u), "J/mol")
