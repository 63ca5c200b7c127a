"""The rules a dipping pressure has to obey, one small function each.

A rule tells its slack at every pressure: how much is left before it breaks, in its own unit, with k
standard uncertainties of everything measured already taken off. Slack below zero excludes the pressure.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import COVERAGE_FACTOR
from transfer.target_inputs import Band, TargetInputs
from transfer.target_phase import check_phase, phase_rule_slack

__all__ = ["GASEOUS_BELOW", "LeftOut", "Rule", "Rules", "rules_of"]

FloatArray = NDArray[np.float64]

# mN/m; a film softer than this is gaseous or a coexistence (Davies & Rideal, Interfacial Phenomena, 2nd ed.,
# Academic Press 1963, as widely quoted).
GASEOUS_BELOW: Final = 12.5
_FINEST: Final = (
    200  # parts of the pressure axis that the compact curve (some 250 nodes) still resolves
)


@dataclass(frozen=True)
class Rule:
    """One limit.

    name : "record" | "lift-off" | "collapse margin" | "coexistence" | "kink" | "single phase" |
        "phase wanted" | "packing error" | "film loss" | "enough film".
    label : the same for a person, with the place where it lies.
    reason : why, with the numbers it came from.
    slack : of (n,) pressures and k, to (n,) in `unit`; NaN where nothing is known.
    demand : what it asks for in `unit` (distance, limit, film); relaxations are told as parts of it.
    at : pressures of the feature it guards, mN/m.
    """

    name: str
    label: str
    reason: str
    slack: Callable[[FloatArray, float], FloatArray]
    unit: str
    demand: float
    at: tuple[float, ...] = ()


@dataclass(frozen=True)
class LeftOut:
    """A rule that could not be applied, and what it would have needed."""

    rule: str
    why: str


@dataclass(frozen=True)
class Rules:
    """The rules that apply, those that do not, and what there is to say about them."""

    applied: tuple[Rule, ...]
    left_out: tuple[LeftOut, ...]
    notes: tuple[str, ...] = ()


def rules_of(inputs: TargetInputs) -> Rules:
    """Every rule that the isotherm and the sheet allow to be applied.

    Parameters
    ----------
    inputs : TargetInputs

    Returns
    -------
    Rules
        Those without the data or the wish they need are left out and named.
    """
    found: list[Rule | LeftOut] = [
        _record(inputs),
        _lift_off(inputs),
        _collapse(inputs),
        *(_transition(inputs, band) for band in inputs.bands),
        _single_phase(inputs),
        _phase(inputs),
        _packing(inputs),
        _loss(inputs),
        _film(inputs),
    ]
    return Rules(
        tuple(item for item in found if isinstance(item, Rule)),
        tuple(item for item in found if isinstance(item, LeftOut)),
    )


def _record(inputs: TargetInputs) -> Rule:
    """Only pressures that the compression went through are known."""
    low, high = inputs.film.lowest, inputs.film.highest

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        return np.minimum(pressure - low, high - pressure)

    reason = f"the compression was recorded from {low:.1f} to {high:.1f} mN/m"
    return Rule("record", "recorded range", reason, slack, "mN/m", high - low)


def _lift_off(inputs: TargetInputs) -> Rule | LeftOut:
    """The film has to stand clear of the gas at lift-off by the uncertainty of zero and controller."""
    foot = inputs.lift_off
    if foot is None:
        return LeftOut("lift-off", "no lift-off in the record")

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        return np.asarray(pressure - foot.value - inputs.guard(foot, above=False, k=k))

    demand = inputs.guard(foot, above=False, k=COVERAGE_FACTOR)
    reason = f"lift-off at {foot.value:.1f} mN/m, guard {_distance(demand)} mN/m"
    return Rule("lift-off", "lift-off", reason, slack, "mN/m", demand, at=(foot.value,))


def _collapse(inputs: TargetInputs) -> Rule:
    """Below collapse by the margin asked for, its uncertainty and the controller's overshoot."""
    end, asked = inputs.end, inputs.wanted.collapse_margin
    margin = asked.value if asked is not None else 0.0

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        return np.asarray(end.value - margin - inputs.guard(end, above=True, k=k) - pressure)

    guard = inputs.guard(end, above=True, k=COVERAGE_FACTOR)
    what = "collapse" if inputs.collapse is not None else "collapse not reached: at least"
    terms = ["u" if inputs.overshoot is None else "u and overshoot"]
    if asked is not None:
        terms.insert(0, f"margin {asked.value:g}")
    reason = (
        f"{what} {end.value:.1f} mN/m less {_distance(margin + guard)} mN/m ({' + '.join(terms)})"
    )
    name, demand = "collapse margin", margin + guard
    return Rule(name, name, reason, slack, "mN/m", demand, at=(end.value,))


def _transition(inputs: TargetInputs, band: Band) -> Rule:
    """Away from a coexistence or a kink on both sides, by the guard band.

    The guard is the sheet's, or where the uncertainty of transition and controller (k = 2) is larger, that.
    """
    asked = inputs.wanted.guard_band.value if inputs.wanted.guard_band is not None else 0.0
    low, high = band.onset, band.end

    def reach(k: float) -> tuple[float, float]:
        """Distances kept below and above the transition; overshoot counts from below only."""
        below = max(asked, inputs.guard(low, above=True, k=k))
        return below, 0.0 if high is None else max(asked, inputs.guard(high, above=False, k=k))

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        below, above = reach(k)
        under = low.value - below - pressure
        if high is None:
            return np.asarray(under)
        return np.maximum(under, pressure - high.value - above)

    below, above = reach(COVERAGE_FACTOR)
    guards = f"{_distance(below)} below"
    if high is not None:
        guards += f" and {_distance(above)} above"
    reason = f"{band.name}, guard {guards} (mN/m)"
    if high is None:
        reason += "; the record stops inside it"
    at = (low.value,) if high is None or band.kind == "kink" else (low.value, high.value)
    return Rule(band.kind, band.name, reason, slack, "mN/m", max(below, above), at=at)


def _single_phase(inputs: TargetInputs) -> Rule | LeftOut:
    """Stiffer than a gas or a coexistence, so that a plateau without sharp ends is not dipped in either.

    The modulus counts over the pressures that the controller may visit (k = 2).
    """
    film, wanted = inputs.film, inputs.wanted.phase
    if wanted is not None and check_phase(wanted, "run sheet") == "gaseous":
        return LeftOut("single phase", "a gas is wanted (target.phase)")

    reach = max(COVERAGE_FACTOR * inputs.set_u, (film.highest - film.lowest) / _FINEST)

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        return film.modulus_across(pressure, reach, k) - GASEOUS_BELOW

    reason = (
        f"modulus above {GASEOUS_BELOW:g} mN/m by its u; softer is a gas or a coexistence by the customary "
        "ranges"
    )
    return Rule("single phase", "single phase", reason, slack, "mN/m", GASEOUS_BELOW)


def _phase(inputs: TargetInputs) -> Rule | LeftOut:
    """In the phase the sheet asks for; left out when it asks for none."""
    wanted = inputs.wanted.phase
    if wanted is None:
        return LeftOut("phase wanted", "the sheet asks for none (target.phase)")
    choice = phase_rule_slack(wanted, inputs.phases, inputs.control_u)
    return Rule(
        "phase wanted", f"phase: {choice.name}", choice.reason, choice.slack, "mN/m", choice.extent
    )


def _packing(inputs: TargetInputs) -> Rule | LeftOut:
    """dA/A = dP / M: what the controller's tolerance does to the packing."""
    limit, tolerance = inputs.wanted.packing_error, inputs.tolerance
    if limit is None:
        return LeftOut("packing error", "the sheet sets no limit (target.packing_error)")
    if tolerance is None:
        return LeftOut(
            "packing error", "the controller's tolerance is not given (dipping.tolerance)"
        )

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        stiff = inputs.film.modulus_at(pressure, k)
        error = (tolerance.value + k * (tolerance.u or 0.0)) / np.where(stiff > 0, stiff, np.nan)
        return np.asarray(limit.value - error)

    reason = (
        f"tolerance {tolerance.value:g} mN/m over the modulus may change the packing by "
        f"{100 * limit.value:.2g} % at most"
    )
    return Rule("packing error", "packing error", reason, slack, "1", limit.value)


def _loss(inputs: TargetInputs) -> Rule | LeftOut:
    """Film lost over the whole dipping time; above the highest pressure held it is not known."""
    limit, loss = inputs.wanted.loss, inputs.loss
    if limit is None:
        return LeftOut("film loss", "the sheet sets no limit (target.loss)")
    if loss is None:
        return LeftOut("film loss", inputs.no_loss)

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        return np.asarray(limit.value - loss.total(pressure, k))

    reason = (
        f"at most {100 * limit.value:.2g} % lost over {_hours(loss.planned)}; not known above "
        f"{loss.pressure[-1]:.1f} mN/m, the highest pressure held"
    )
    return Rule("film loss", "film loss", reason, slack, "1", limit.value)


def _film(inputs: TargetInputs) -> Rule | LeftOut:
    """Area at the pressure less the film of the strokes one filling serves is not below the smallest area."""
    supply, film = inputs.supply, inputs.film
    if supply is None or film.molecules is None:
        return LeftOut(
            "enough film",
            "needs the trough's smallest area, the substrate, the stroke length and the amount spread",
        )
    need = supply.strokes * supply.stroke.value

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        area = film.trough_area_at(pressure)
        parts = (
            supply.smallest_area.u or 0.0,
            supply.strokes * (supply.stroke.u or 0.0),
        )
        u_area = film.u_trough_area_at(pressure, supply.area_relative_u, inputs.set_u)
        u = np.hypot(float(np.linalg.norm(parts)), u_area)
        return np.asarray(area - supply.smallest_area.value - need - k * u)

    strokes = "one stroke takes" if supply.strokes == 1 else f"{supply.strokes} strokes take"
    reason = (
        f"{strokes} {need:.1f} cm² and may leave no less than {supply.smallest_area.value:g} cm², the "
        "smallest area, before the film is renewed"
    )
    return Rule("enough film", "enough film", reason, slack, "cm^2", need)


def _distance(value: float) -> str:
    """A guard, mN/m, rounded up to two figures so that what is printed is never less than what is kept."""
    places = 1 if value >= 1.0 else 2
    step = 10.0**-places
    return f"{np.ceil(value / step - 1e-6) * step:.{places}f}"


def _hours(seconds: float) -> str:
    return f"{seconds / 3600:.1f} h" if seconds >= 3600 else f"{seconds / 60:.0f} min"
