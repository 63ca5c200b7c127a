"""Fits of the laws turned into results: parameters with uncertainty, weights, and the choice."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.hold_average import law_loss, law_weights, node_moments
from isotherm.hold_fit import LawFit
from isotherm.hold_models import nucleation_type
from isotherm.hold_result import LawResult
from isotherm.quantity import COVERAGE_FACTOR, Quantity

__all__ = ["choose_law", "law_results"]

FloatArray = NDArray[np.float64]

# A simpler law within this much of the least AICc is as well supported (Burnham & Anderson 2002, sec. 2.6:
# "substantial support" up to 2), so its further parameters say nothing (Arnold, J. Wildl. Manage. 2010, 74,
# 1175).
SUBSTANTIAL: Final = 2.0

_EQUATIONS: Final = {
    "constant": "y = y0",
    "desorption": "y = y0 (1 - k sqrt t)",
    "dissolution": "y = y0 (1 - r t)",
    "relaxation": "y = y0 (1 - L [1 - exp(-t/tau)])",
    "nucleation": "y = y0 (1 - L [1 - exp(-K t^x)]), K = ln 2 / t_half^x",
}


def choose_law(fits: tuple[LawFit, ...], seconds: float) -> LawFit:
    """Choose the law that describes a hold.

    Parameters
    ----------
    fits : tuple of LawFit
        Every law fitted to it.
    seconds : float
        Its duration, s.

    Returns
    -------
    LawFit
        The simplest law within 2 of the least AICc, of equally simple ones the better supported; the
        constant one where the loss so described over the hold is not beyond its own expanded uncertainty
        (U = 2 u): the criterion counts parameters against the likelihood's peak, and correlated noise makes
        that peak look sharper than the loss is known.
    """
    least = min(fit.aicc for fit in fits)
    supported = [fit for fit in fits if fit.aicc - least <= SUBSTANTIAL]
    chosen = min(supported, key=lambda fit: (fit.parameters, fit.aicc))
    loss = law_loss(chosen, seconds)
    if abs(loss.value) > COVERAGE_FACTOR * loss.u:
        return chosen
    return next(fit for fit in fits if fit.name == "constant")


def _parameters(fit: LawFit, unit: str) -> dict[str, Quantity]:
    """Parameters of one law: most likely value, u from the nodes."""

    def one(
        value: FloatArray, by_level: FloatArray | float, by_drop: FloatArray | float, name: str
    ) -> Quantity:
        moments = node_moments(fit, value, by_level, by_drop)
        return Quantity(float(value[fit.best]), moments.u, name)

    part = fit.drop / fit.level
    by_level, by_drop = -part / fit.level, 1.0 / fit.level
    out = {"y0": one(fit.level, 1.0, 0.0, unit)}
    if fit.name == "desorption":
        out["k"] = one(part, by_level, by_drop, "s^-0.5")
    elif fit.name == "dissolution":
        out["r"] = one(part, by_level, by_drop, "1/s")
    elif fit.name in ("relaxation", "nucleation"):
        out["L"] = one(part, by_level, by_drop, "1")
        key = "tau" if fit.name == "relaxation" else "t_half"
        out[key] = one(fit.time_constant, 0.0, 0.0, "s")
    if fit.name == "nucleation":
        out["x"] = one(fit.exponent, 0.0, 0.0, "1")
    return out


def law_results(fits: tuple[LawFit, ...], seconds: float, unit: str) -> tuple[LawResult, ...]:
    """Make results of the fits, best supported first.

    Parameters
    ----------
    fits : tuple of LawFit
        Every law fitted to one hold.
    seconds : float
        Time over which each law's own loss is given, s.
    unit : str
        Unit of the level.

    Returns
    -------
    tuple of LawResult
    """
    weights = law_weights(fits)
    least = min(fit.aicc for fit in fits)
    results = []
    for fit, weight in zip(fits, weights.tolist(), strict=True):
        loss = law_loss(fit, seconds)
        parameters = _parameters(fit, unit)
        remark = ""
        if fit.name == "nucleation":
            remark = f"nearest: {nucleation_type(parameters['x'].value)}"
        results.append(
            LawResult(
                name=fit.name,
                equation=_EQUATIONS[fit.name],
                parameters=parameters,
                aicc=fit.aicc,
                delta=fit.aicc - least,
                weight=weight,
                loss=Quantity(loss.value, loss.u, "1"),
                remark=remark,
            )
        )
    return tuple(results)
