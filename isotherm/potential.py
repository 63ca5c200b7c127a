"""Surface potential along a compression: effective dipole moment, and where the potential begins."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.branches import robust_noise
from isotherm.constants import EPSILON_0
from isotherm.errors import UpstrokeError
from isotherm.potential_onset import find_onset
from isotherm.potential_result import MomentAt, PotentialOnset, PotentialResult
from isotherm.quantity import Quantity, format_quantity
from isotherm.result import Branch, IsothermResult
from isotherm.series import format_p, random_part, run_names, two_sided_p

__all__ = ["MILLIDEBYE_PER_MV_NM2", "analyse_potential"]

FloatArray = NDArray[np.float64]

# 1 D = 1e-18 statC cm = 1e-21/c C m with c in m/s (definition).
_DEBYE: Final = 1e-21 / 299792458.0  # C m
# ε0 A ΔV in millidebye for A in nm^2 and ΔV in mV: (F/m) (1e-18 m^2) (1e-3 V) / (1e-3 D).
MILLIDEBYE_PER_MV_NM2: Final = EPSILON_0 * 1e-18 / _DEBYE
_FEWEST: Final = 12  # points of the condensed curve
_SIGNIFICANCE: Final = 0.05  # customary


def analyse_potential(
    result: IsothermResult,
    *,
    baseline: Quantity | None = None,
    potential_u: float | None = None,
) -> PotentialResult:
    """Effective dipole moment against area, and the onset of potential against lift-off.

    Parameters
    ----------
    result : IsothermResult
        Its first compression must carry a potential.
    baseline : Quantity, optional
        Reading on the clean subphase, mV, subtracted. Without it the recorded values are taken as ΔV.
    potential_u : float, optional
        Standard uncertainty of the potential's scale, mV, common to the run.

    Returns
    -------
    PotentialResult

    Raises
    ------
    UpstrokeError
        Without a potential column, or fewer than twelve points of it.

    Notes
    -----
    μ⊥ = ε0 A ΔV (Helmholtz; Gaines, Insoluble Monolayers, 1966, ch. 4, from memory). It is an effective
    moment: chains, head groups, ions and reoriented water together.
    """
    branch = result.headline
    if branch.curve.potential is None:
        raise UpstrokeError(
            "no surface potential in this run",
            where=result.source.path,
            remedy='name its column in the sheet: [[columns]] role = "potential"',
        )
    curve = branch.curve
    recorded = np.asarray(branch.curve.potential, dtype=np.float64)
    good = np.isfinite(recorded) & np.isfinite(curve.area)
    if good.sum() < _FEWEST:
        raise UpstrokeError(
            f"{int(good.sum())} points with a surface potential; {_FEWEST} are needed",
            where=result.source.path,
            remedy="export the whole run",
        )
    area, pressure = curve.area[good], curve.pressure[good]
    noise = robust_noise(recorded[good])
    zero = 0.0 if baseline is None else baseline.value
    potential = recorded[good] - zero
    u_scale = math.hypot(potential_u or 0.0, (baseline.u or 0.0) if baseline else 0.0)
    warnings = []
    if u_scale == 0:
        warnings.append(
            "no uncertainty of the potential's scale given: u holds noise and area only"
        )
    moment = MILLIDEBYE_PER_MV_NM2 * area * potential
    onset = _onset(area, potential, noise, branch, result.area_relative_u or 0.0)
    if baseline is None:
        level = (
            ""
            if onset is None
            else f" It reads {format_quantity(onset.level)} mV before its onset."
        )
        warnings.append(
            f"recorded potentials are taken as differences from the clean subphase.{level}"
        )
    places = _places(
        branch, area, pressure, potential, noise, u_scale, result.area_relative_u or 0.0
    )
    return PotentialResult(
        name=run_names([result])[0],
        path=result.source.path,
        area=area,
        pressure=pressure,
        potential=potential,
        moment=moment,
        u_moment=MILLIDEBYE_PER_MV_NM2 * area * noise,
        noise=noise,
        onset=onset,
        lift_off=branch.lift_off,
        at=places,
        statement=_statement(onset, branch.lift_off, places),
        warnings=tuple(warnings),
    )


def _onset(
    area: FloatArray, potential: FloatArray, noise: float, branch: Branch, relative: float
) -> PotentialOnset | None:
    found = find_onset(area, potential, noise)
    if found is None:
        return None
    where = Quantity.combine(
        found.area, "nm^2", u_random=found.u_area, u_systematic=relative * found.area or None
    )
    level = Quantity(found.level, found.u_level, "mV")
    lift = branch.lift_off
    if lift is None:
        return PotentialOnset(where, level, None, None, "no lift-off")
    difference = found.area - lift.value
    # the scale error of the area moves both alike: it only multiplies the difference
    random = math.hypot(found.u_area, random_part(lift))
    p = two_sided_p(difference, random) if random > 0 else None
    apart = Quantity.combine(
        difference, "nm^2", u_random=random, u_systematic=relative * abs(difference) or None
    )
    if p is None or p >= _SIGNIFICANCE:
        reading = "with lift-off"
    else:
        reading = "before lift-off" if difference > 0 else "after lift-off"
    return PotentialOnset(where, level, apart, p, reading)


def _places(
    branch: Branch,
    area: FloatArray,
    pressure: FloatArray,
    potential: FloatArray,
    noise: float,
    u_scale: float,
    relative: float,
) -> tuple[MomentAt, ...]:
    """Moment at lift-off, transitions, requested pressures, collapse, and its largest value."""
    named: list[tuple[str, float]] = []
    if branch.lift_off is not None:
        named.append(("lift-off", branch.lift_off.value))
    for number, transition in enumerate(branch.transitions, start=1):
        suffix = f" {number}" if len(branch.transitions) > 1 else ""
        for what, point in (
            (transition.kind, transition.at),
            (f"{transition.kind} onset", transition.onset),
            (f"{transition.kind} end", transition.end),
        ):
            if point is not None:
                named.append((f"{what}{suffix}", point.area.value))
    for at in branch.area_at:
        if at.area is not None:
            named.append((f"{at.pressure:g} mN/m", at.area.value))
    if branch.collapse is not None:
        named.append(("collapse", branch.collapse.area.value))
    stop = len(area)
    if branch.collapse is not None:
        stop = max(int(np.count_nonzero(area >= branch.collapse.area.value)), 1)
    largest = int(np.argmax(np.abs(area[:stop] * potential[:stop])))
    named.append(("largest moment", float(area[largest])))
    found = []
    for name, place in named:
        if not area[-1] <= place <= area[0]:
            continue
        # a straight line through the nearest points carries the noise of about two of them
        v = float(np.interp(-place, -area, potential))
        moment = MILLIDEBYE_PER_MV_NM2 * place * v
        found.append(
            MomentAt(
                name,
                place,
                float(np.interp(-place, -area, pressure)),
                Quantity.combine(v, "mV", u_random=noise, u_systematic=u_scale),
                Quantity.combine(
                    moment,
                    "mD",
                    u_random=MILLIDEBYE_PER_MV_NM2 * place * noise,
                    u_systematic=math.hypot(
                        relative * moment, MILLIDEBYE_PER_MV_NM2 * place * u_scale
                    ),
                ),
            )
        )
    return tuple(found)


def _statement(
    onset: PotentialOnset | None, lift_off: Quantity | None, places: tuple[MomentAt, ...]
) -> str:
    if onset is None:
        text = "no onset of potential is seen: it does not leave a level within this run"
    elif onset.difference is None:
        text = f"the potential begins at {onset.area}; the film has no lift-off to compare with"
    elif lift_off is not None:
        text = (
            f"the potential begins at {onset.area}, {onset.reading} at {lift_off} (difference "
            f"{onset.difference}, {format_p(onset.p)})"
        )
    largest = next((p for p in places if p.name == "largest moment"), None)
    if largest is not None:
        text += f"; largest effective moment {largest.moment} at {largest.pressure:.1f} mN/m"
    return text
