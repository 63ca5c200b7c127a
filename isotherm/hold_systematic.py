"""What is common to every row of a hold: the probe's zero and drift, the scales of area and pressure."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from isotherm.sheet import RunSheet

if TYPE_CHECKING:
    from isotherm.check_result import CheckResult

__all__ = ["Systematic", "systematic"]


@dataclass(frozen=True)
class Systematic:
    """Corrections to the pressure and what they leave uncertain.

    zero : mN/m, drift : mN/m per s; both subtracted from the recorded pressure.
    zero_u, drift_u : their standard uncertainty.  scale_u : of the pressure, mN/m, from the sheet.
    area_u : of the trough area, cm^2.  modulus : of the film, mN/m, where the sheet gives it.
    """

    zero: float = 0.0
    zero_u: float = 0.0
    drift: float = 0.0
    drift_u: float = 0.0
    scale_u: float = 0.0
    area_u: float = 0.0
    modulus: float | None = None
    warnings: tuple[str, ...] = field(default=())

    @property
    def pressure_u(self) -> float | None:
        """Systematic u of a pressure, mN/m; None where nothing is known of it."""
        return float(np.hypot(self.zero_u, self.scale_u)) or None

    def relative_u(self, kind: str, level: float, area_unit: str) -> float:
        """Systematic u of a relative loss as a part of it: an offset of the level rescales the loss."""
        if kind == "isochoric":
            return (self.pressure_u or 0.0) / abs(level)
        return self.area_u / abs(level) if area_unit == "cm^2" else 0.0

    def rate_u(self, kind: str, level: float) -> float:
        """Systematic u of a relative rate of loss, 1/s, from the probe's drift.

        Isochoric: the drift's u over the pressure. Isobaric: the controller follows the probe, so a drift
        dPi/dt moves the film along its isotherm by (dPi/dt) / modulus; what was recorded cannot show it, so
        the whole drift counts as uncertain.
        """
        if kind == "isochoric":
            return self.drift_u / abs(level)
        if self.modulus is None:
            return 0.0
        return float(np.hypot(self.drift, self.drift_u)) / self.modulus


def systematic(sheet: RunSheet, check: CheckResult | None) -> Systematic:
    """Gather what the sheet and a check of the bare subphase say.

    Parameters
    ----------
    sheet : RunSheet
        Trough uncertainties, film modulus at the dipping pressure.
    check : CheckResult or None
        Zero offset (mN/m) and drift rate (mN/m per hour).

    Returns
    -------
    Systematic
    """
    warnings: list[str] = []
    zero = check.zero_offset if check is not None else None
    drift = check.drift_rate if check is not None else None
    modulus = sheet.dipping.modulus.value if sheet.dipping.modulus is not None else None
    if drift is not None and modulus is None:
        warnings.append(
            "probe drift is known but not the film's modulus: its effect on an area at constant pressure is "
            "not in u (give [dipping] modulus)"
        )
    pressure_u = sheet.trough.pressure_uncertainty
    area_u = sheet.trough.area_uncertainty
    return Systematic(
        zero=zero.value if zero is not None else 0.0,
        zero_u=(zero.u or 0.0) if zero is not None else 0.0,
        drift=drift.value / 3600.0 if drift is not None else 0.0,
        drift_u=(drift.u or 0.0) / 3600.0 if drift is not None else 0.0,
        scale_u=pressure_u.value if pressure_u is not None else 0.0,
        area_u=area_u.value if area_u is not None else 0.0,
        modulus=modulus,
        warnings=tuple(warnings),
    )
