"""Read miscibility from collapse or transition pressure against composition."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.constants import BOLTZMANN_MN_NM
from isotherm.mixture_areas import Composition
from isotherm.mixture_result import CompositionPressure, SurfacePhaseRule
from isotherm.quantity import Quantity
from isotherm.result import Branch, IsothermResult
from isotherm.series import format_p

__all__ = ["surface_phase_rule"]

FloatArray = NDArray[np.float64]

_SIGNIFICANCE: Final = 0.05  # customary
# Collapse and transition pressures of one film repeat to a few tenths of mN/m at best: practice, used
# where no composition was repeated and the fits' own u would overstate what is known.
_REPEATS_TO: Final = 0.3  # mN/m


def _pressure(branch: Branch, kind: str) -> Quantity | None:
    if kind == "collapse":
        return None if branch.collapse is None else branch.collapse.pressure
    onsets = [t.onset for t in branch.transitions if t.kind == "coexistence"]
    return next((point.pressure for point in onsets if point is not None), None)


def _points(
    kind: str, results: Sequence[IsothermResult], compositions: Sequence[Composition]
) -> tuple[CompositionPressure, ...]:
    """Mean pressure of each composition; scatter pooled over repeated runs."""
    found: list[list[tuple[Quantity, float]]] = []
    squares, freedom = 0.0, 0
    for composition in compositions:
        here = []
        for i in composition.runs:
            quantity = _pressure(results[i].headline, kind)
            if quantity is not None:
                here.append((quantity, quantity.u or 0.0))
        found.append(here)
        if len(here) > 1:
            values = np.array([q.value for q, _ in here])
            squares += float(((values - values.mean()) ** 2).sum())
            freedom += len(here) - 1
    scatter = max(math.sqrt(squares / freedom), 0.0) if freedom >= 3 else _REPEATS_TO
    points = []
    for composition, here in zip(compositions, found, strict=True):
        pressure = None
        if here:
            n = len(here)
            fit = math.sqrt(sum(u * u for _, u in here)) / n
            mean = float(np.mean([q.value for q, _ in here]))
            pressure = Quantity(mean, math.hypot(fit, scatter / math.sqrt(n)), "mN/m")
        points.append(CompositionPressure(composition.fractions, len(here), pressure))
    return tuple(points)


def _chi_square_p(rest: FloatArray, pick: FloatArray, variance: FloatArray) -> float:
    from scipy.special import chdtrc

    inverse = np.linalg.pinv(pick @ np.diag(variance) @ pick.T, hermitian=True)
    return float(chdtrc(len(rest), float(rest @ inverse @ rest)))


def surface_phase_rule(
    kind: str,
    results: Sequence[IsothermResult],
    compositions: Sequence[Composition],
    names: Sequence[str],
) -> SurfacePhaseRule | None:
    """Test whether the pressure depends on composition, as a mixed film's must.

    Parameters
    ----------
    kind : "collapse" or "transition"
        The latter is the onset of the first coexistence.
    results, compositions, names
        The series; compositions pure ones first.

    Returns
    -------
    SurfacePhaseRule or None
        None where no run shows such a pressure.

    Notes
    -----
    Crisp, Surface Chemistry (Butterworths 1949), 17 and 23 (from memory): at constant temperature
    and outer pressure F = C - P + 1 with C components and P surface phases, the collapsed bulk phase
    counting as one. A mixed film of two at collapse or transition keeps F = 1, its pressure moves with
    composition; with the components apart F = 0, and the pressure stays that of one of them.
    """
    points = _points(kind, results, compositions)
    if all(p.pressure is None for p in points):
        return None
    k = len(names)
    pures, mixtures = points[:k], [p for p in points[k:] if p.pressure is not None]
    have = [i for i, p in enumerate(pures) if p.pressure is not None]
    if not have or not mixtures:
        missing = "no mixture shows one" if have else "no component alone shows one"
        if kind == "transition" and have and not mixtures:
            missing += ": the components mix, or too little of the one that has it is there"
        return SurfacePhaseRule(kind, points, "cannot tell", f"{kind} pressure: {missing}")
    if kind == "collapse" and len(have) < k:
        absent = ", ".join(names[i] for i in range(k) if i not in have)
        return SurfacePhaseRule(
            kind, points, "cannot tell", f"collapse pressure: not reached by {absent} alone"
        )
    used = [*(pures[i] for i in have), *mixtures]
    values = np.array([_value(p) for p in used])
    variance = np.array([_u(p) ** 2 for p in used])
    chances = []
    for place in range(len(have)):
        # apart, the film goes at the pressure of one component: the lower, or the last to give way
        constant = np.hstack([np.zeros((len(mixtures), len(have))), np.eye(len(mixtures))])
        constant[:, place] = -1.0
        chances.append(_chi_square_p(constant @ values, constant, variance))
    best = int(np.argmax(chances))
    p_constant = chances[best]
    p_ideal = None
    if len(have) == k:
        straight = np.hstack([-np.array([m.fractions for m in mixtures]), np.eye(len(mixtures))])
        p_ideal = _chi_square_p(straight @ values, straight, variance)
    resolved = kind == "transition" and _dilution_resolved(
        have[best], mixtures, results, compositions
    )
    reading, statement = _reading(
        kind, names[have[best]], pures, mixtures, p_constant, p_ideal, resolved
    )
    return SurfacePhaseRule(kind, points, reading, statement, p_constant, p_ideal)


def _dilution_resolved(
    component: int,
    mixtures: Sequence[CompositionPressure],
    results: Sequence[IsothermResult],
    compositions: Sequence[Composition],
) -> bool:
    """Whether the shift that dilution alone would bring, kT x / ΔA, is well above the uncertainty.

    The two-dimensional form of the freezing-point law for a second component that enters one of the
    two phases only.
    """
    widths = []
    for i in compositions[component].runs:
        for transition in results[i].headline.transitions:
            if transition.onset is not None and transition.end is not None:
                widths.append(transition.onset.area.value - transition.end.area.value)
    kelvin = [r.kelvin for r in results if r.kelvin is not None]
    if not widths or not kelvin or not np.mean(widths) > 0:
        return False
    thermal = BOLTZMANN_MN_NM * float(np.mean(kelvin)) / float(np.mean(widths))
    shifts = [thermal * (1.0 - m.fractions[component]) for m in mixtures]
    return any(shift > 4.0 * _u(m) for shift, m in zip(shifts, mixtures, strict=True))


def _value(point: CompositionPressure) -> float:
    return math.nan if point.pressure is None else point.pressure.value


def _u(point: CompositionPressure) -> float:
    return math.nan if point.pressure is None else point.pressure.u or math.nan


def _reading(
    kind: str,
    first: str,
    pures: Sequence[CompositionPressure],
    mixtures: Sequence[CompositionPressure],
    p_constant: float,
    p_ideal: float | None,
    dilution_resolved: bool,
) -> tuple[str, str]:
    low, high = min(map(_value, mixtures)), max(map(_value, mixtures))
    span = f"{kind} pressure of the mixtures {low:.1f} to {high:.1f} mN/m"
    if p_constant < _SIGNIFICANCE:
        text = (
            f"{span} depends on composition ({format_p(p_constant)} if it stayed at that of one "
            "component): one degree of freedom is left, the components mix in the film"
        )
        top = max((p for p in pures if p.pressure is not None), key=_value)
        above = [m for m in mixtures if _value(m) - _value(top) > 2.0 * math.hypot(_u(m), _u(top))]
        if above:
            text += "; above that of every component: they hold each other in the film"
        return "miscible", text
    if p_ideal is not None and p_ideal < _SIGNIFICANCE:
        return (
            "immiscible",
            f"{span} stays at that of {first} ({format_p(p_constant)}) and not between the components "
            f"({format_p(p_ideal)}): no degree of freedom is left, the components lie apart",
        )
    if p_ideal is None and dilution_resolved:
        return (
            "immiscible",
            f"{span} stays at that of {first} ({format_p(p_constant)}), though dissolving the rest in "
            "either phase would shift it by more than the uncertainty: the components lie apart",
        )
    why = (
        "the components alone do not differ enough"
        if p_ideal is not None
        else f"it stays at that of {first}, and another component has none to compare with"
    )
    return (
        "cannot tell",
        f"{span}: {why} ({format_p(p_constant)} if it did not depend on composition)",
    )
