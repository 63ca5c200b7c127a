"""The phase wanted: its name as people write it, and the pressures where the film is in it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import COVERAGE_FACTOR
from isotherm.result import Phase

__all__ = ["PhaseChoice", "check_phase", "phase_rule_slack"]

FloatArray = NDArray[np.float64]

# Customary ranges of the modulus, mN/m (Davies & Rideal, Interfacial Phenomena, 2nd ed., Academic Press 1963,
# as widely quoted; practice calls a film above 250 mN/m solid).
_RANGES: Final[dict[str, tuple[float, float]]] = {
    "gaseous": (0.0, 12.5),
    "liquid-expanded": (12.5, 50.0),
    "intermediate": (50.0, 100.0),
    "liquid-condensed": (100.0, 250.0),
    "solid": (250.0, np.inf),
    "condensed": (100.0, np.inf),
}
_SYNONYMS: Final = {
    "gas": "gaseous", "g": "gaseous", "le": "liquid-expanded", "expanded": "liquid-expanded",
    "lc": "liquid-condensed", "s": "solid",
}  # fmt: skip
_MIXED: Final = ("coexistence", "collapsed")


@dataclass(frozen=True)
class PhaseChoice:
    """The phase wanted on this isotherm.

    slack : of (n,) pressures and k, to (n,) mN/m inside the phase; NaN everywhere when it is not there.
    extent : pressure range of its widest stretch, mN/m.
    """

    name: str
    reason: str
    slack: Callable[[FloatArray, float], FloatArray]
    extent: float


def check_phase(wanted: str, where: str) -> str:
    """Return the customary name for what the sheet says.

    Raises
    ------
    UpstrokeError
        When it is none of the customary names.
    """
    name = "-".join(wanted.lower().replace("-", " ").split())
    name = _SYNONYMS.get(name, name)
    if name not in _RANGES:
        raise UpstrokeError(
            f'target.phase is "{wanted}"',
            where=where,
            remedy=f"one of: {', '.join(_RANGES)}",
        )
    return name


def phase_rule_slack(wanted: str, phases: tuple[Phase, ...], control_u: float) -> PhaseChoice:
    """Where the film is in the phase wanted.

    A phase is named after its modulus, which has an uncertainty: a stretch counts when its modulus lies in
    the customary range within 2 u.

    Parameters
    ----------
    wanted : str
    phases : tuple of Phase
    control_u : float
        Standard uncertainty of the pressure held, mN/m: kept from the ends of the phase.

    Returns
    -------
    PhaseChoice
    """
    name = check_phase(wanted, "run sheet")
    low, high = _RANGES[name]
    spans: list[tuple[float, float]] = []
    borderline = False
    for phase in phases:
        if phase.name in _MIXED:
            continue
        reach = COVERAGE_FACTOR * (phase.modulus.u or 0.0)
        value = phase.modulus.value
        if low - reach <= value < high + reach and phase.pressure[1] > phase.pressure[0]:
            spans.append(phase.pressure)
            borderline |= not low <= value < high
    if not spans:
        seen = ", ".join(dict.fromkeys(phase.name for phase in phases)) or "none"
        return PhaseChoice(name, f"no {name} phase in this isotherm (found: {seen})", _nowhere, 1.0)

    def slack(pressure: FloatArray, k: float) -> FloatArray:
        inside = [np.minimum(pressure - a, b - pressure) for a, b in spans]
        return np.asarray(np.max(inside, axis=0) - k * control_u)

    where = " and ".join(f"{a:.1f} to {b:.1f}" for a, b in spans)
    reason = f"{name} from {where} mN/m; names follow the modulus and are a judgement"
    if borderline:
        reason += " (here within 2u of the next name)"
    return PhaseChoice(name, reason, slack, max(b - a for a, b in spans))


def _nowhere(pressure: FloatArray, k: float) -> FloatArray:
    return np.full(np.shape(pressure), np.nan)
