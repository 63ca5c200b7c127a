"""Say whether mixtures depart from ideal areas, by probability and not by sign."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.mixture_excess import Excess
from isotherm.quantity import Quantity, format_quantity
from isotherm.series import format_p, student_factor

__all__ = ["DepartureVerdict", "departure_verdict"]

FloatArray = NDArray[np.float64]

# Customary 5 %, half for all mixtures together and half for single ones; the probabilities themselves
# are always reported.
_SIGNIFICANCE: Final = 0.025


@dataclass(frozen=True)
class DepartureVerdict:
    """A word, the joint probability under ideality, and a sentence."""

    word: str
    p: float
    statement: str


def _holm(p_values: FloatArray) -> NDArray[np.bool_]:
    """Which are significant when all are tested together (Holm, Scand. J. Statist. 1979, 6, 65)."""
    order = np.argsort(p_values)
    passed = np.zeros(len(p_values), dtype=bool)
    for rank, place in enumerate(order):  # over compositions
        if not p_values[place] * (len(p_values) - rank) < _SIGNIFICANCE:
            break
        passed[place] = True
    return passed


def _joint_p(excess: Excess) -> float:
    """χ² of all excess areas; an F probability where the scatter has few degrees of freedom."""
    from scipy.special import chdtrc, fdtrc

    m = len(excess.area_excess)
    inverse = np.linalg.pinv(excess.cov_area, hermitian=True)
    chi2 = float(excess.area_excess @ inverse @ excess.area_excess)
    freedom = float(excess.freedom.min())
    return float(chdtrc(m, chi2) if math.isinf(freedom) else fdtrc(m, freedom, chi2 / m))


def departure_verdict(
    pressure: float, excess: Excess, p_values: Sequence[float], labels: Sequence[str]
) -> DepartureVerdict:
    """Judge all mixtures at one pressure together, then each with Holm's correction.

    Parameters
    ----------
    pressure : float
        mN/m, for the sentence.
    excess : Excess
    p_values : (m,) probability of each excess alone, under ideality
    labels : (m,) how each mixture is called

    Returns
    -------
    DepartureVerdict
        "condensation" (areas smaller than ideal), "expansion", "both signs" or "no departure found".
    """
    joint = _joint_p(excess)
    null_u = np.sqrt(np.diag(excess.cov_area))
    clear = _holm(np.asarray(p_values))
    signs = set(np.sign(excess.area_excess[clear]).astype(int).tolist())
    at = f"at {pressure:g} mN/m"
    if joint >= _SIGNIFICANCE and not signs:
        factors = np.array([student_factor(float(f)) for f in excess.freedom])
        limit = 100.0 * float(np.max(factors * null_u / excess.area_ideal))
        return DepartureVerdict(
            "no departure found",
            joint,
            f"{at} no departure from additive areas ({format_p(joint)}); these data would show one of "
            f"{limit:.1f} %. Additive areas mean ideal mixing or no mixing: the phase rule tells which",
        )
    if not signs:
        # no single mixture stands out: the precision-weighted mean has the sign
        inverse = np.linalg.pinv(excess.cov_area, hermitian=True)
        signs = {int(np.sign(float(np.ones(len(null_u)) @ inverse @ excess.area_excess)))}
    word = {(-1,): "condensation", (1,): "expansion"}.get(tuple(signs), "both signs")
    # the largest departure in units of its uncertainty carries the sentence
    strongest = int(np.argmax(np.abs(excess.area_excess) / null_u))
    relative = Quantity(
        100.0 * float(excess.area_excess[strongest] / excess.area_ideal[strongest]),
        100.0 * float(null_u[strongest] / excess.area_ideal[strongest]),
        "%",
    )
    meaning = {
        "condensation": "areas are smaller than additive: condensation",
        "expansion": "areas are larger than additive: expansion",
        "both signs": "areas are smaller than additive in some mixtures and larger in others",
    }[word]
    return DepartureVerdict(
        word,
        joint,
        f"{at} {meaning} ({format_p(joint)} for all mixtures; clearest at {labels[strongest]}: "
        f"{format_quantity(relative)} %, {format_p(p_values[strongest])})",
    )
