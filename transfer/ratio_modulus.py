"""What is known of the film's compressibility before the log is looked at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet

__all__ = ["Compressibility", "known_compressibility"]

# Films that are dipped are condensed or fluid-condensed: moduli of 60 to 500 mN/m cover them (the customary
# ranges of Davies & Rideal, Interfacial Phenomena, 1963, widened). As C_s = 1/modulus, m/mN.
_USUAL = 0.007
_USUAL_U = 0.004
# A modulus stated without an uncertainty is taken as good to 5 %: it changes by more than that over the
# few mN/m of doubt in where on the isotherm the film sits.
_STATED_PART = 0.05


@dataclass(frozen=True)
class Compressibility:
    """C_s = 1/modulus in m/mN with its standard uncertainty, and where it came from.

    origin : "sheet" | "isotherm" | "dwells" (nothing known: the usual range, for the dwells to narrow).
    """

    value: float
    u: float
    origin: str
    warnings: tuple[str, ...] = ()


def known_compressibility(
    sheet: RunSheet, isotherm: IsothermResult | None, pressure: float
) -> Compressibility:
    """Take the modulus from the sheet, else from the isotherm at the dipping pressure, else the usual range.

    Parameters
    ----------
    sheet : RunSheet
        dipping.modulus, mN/m.
    isotherm : IsothermResult or None
        Its headline branch's modulus curve.
    pressure : float
        Dipping pressure, mN/m.

    Returns
    -------
    Compressibility
    """
    given = sheet.dipping.modulus
    if given is not None and given.value > 0:
        value = 1.0 / given.value
        if given.u:
            return Compressibility(value, given.u / given.value**2, "sheet")
        note = f"dipping.modulus has no uncertainty: {100 * _STATED_PART:.0f} % was taken"
        return Compressibility(value, _STATED_PART * value, "sheet", (note,))
    if isotherm is not None:
        found = _from_isotherm(isotherm, pressure)
        if found is not None:
            return found
        note = f"the isotherm gives no modulus at {pressure:.1f} mN/m; the dwells' own scatter was used"
        return Compressibility(_USUAL, _USUAL_U, "dwells", (note,))
    return Compressibility(_USUAL, _USUAL_U, "dwells")


def _from_isotherm(isotherm: IsothermResult, pressure: float) -> Compressibility | None:
    """Modulus of the headline branch at a pressure, by interpolation along its curve."""
    curve = isotherm.headline.curve
    good = np.isfinite(curve.modulus) & np.isfinite(curve.pressure) & (curve.modulus > 0)
    if good.sum() < 2 or not curve.pressure[good].min() <= pressure <= curve.pressure[good].max():
        return None
    order = np.argsort(curve.pressure[good], kind="stable")
    at = curve.pressure[good][order]
    modulus = float(np.interp(pressure, at, curve.modulus[good][order]))
    u = float(np.interp(pressure, at, curve.u_modulus[good][order]))
    if not np.isfinite(u):
        u = 0.0
    # the isotherm was compressed, the dipped film rests: the two moduli agree no better than this
    u = float(np.hypot(u, _STATED_PART * modulus))
    return Compressibility(1.0 / modulus, u / modulus**2, "isotherm")
