"""Compare oscillations with one another and with the isotherm."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

import numpy as np

from isotherm.oscillation_result import AmplitudeCheck, OscillationSegment, QuasiStatic
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.series import two_sided_p

__all__ = ["amplitude_checks", "quasi_static"]

_SAME_FREQUENCY: Final = 1.05  # ratio; drives hold a set frequency far better
_DIFFERENT_AMPLITUDE: Final = 1.3  # ratio from smallest to largest that is worth comparing
_SIGNIFICANCE: Final = 0.05  # customary


def amplitude_checks(segments: Sequence[OscillationSegment]) -> tuple[AmplitudeCheck, ...]:
    """For each frequency with several amplitudes, the χ² of one modulus for all of them."""
    ordered = sorted(segments, key=lambda s: s.frequency.value)
    groups: list[list[OscillationSegment]] = []
    for segment in ordered:
        last = groups[-1][0].frequency.value if groups else 0.0
        if last and segment.frequency.value / last < _SAME_FREQUENCY:
            groups[-1].append(segment)
        else:
            groups.append([segment])
    return tuple(check for group in groups if (check := _check(group)) is not None)


def _check(group: Sequence[OscillationSegment]) -> AmplitudeCheck | None:
    from scipy.special import chdtrc

    size = np.array([s.amplitude.value for s in group])
    if len(group) < 2 or size.max() / size.min() < _DIFFERENT_AMPLITUDE:
        return None
    modulus = np.array([s.modulus.value for s in group])
    u = np.array([max(s.modulus.u or 0.0, 1e-9) for s in group])
    w = 1.0 / u**2
    rest = modulus - float(w @ modulus / w.sum())
    p = float(chdtrc(len(group) - 1, float(w @ rest**2)))
    small, large = int(np.argmin(size)), int(np.argmax(size))
    ratio = modulus[large] / modulus[small]
    u_ratio = ratio * math.hypot(u[large] / modulus[large], u[small] / modulus[small])
    return AmplitudeCheck(
        frequency=float(np.mean([s.frequency.value for s in group])),
        segments=tuple(s.number for s in group),
        amplitudes=(float(size.min()), float(size.max())),
        change=Quantity(float(ratio - 1.0), float(u_ratio), "1"),
        p=p,
        reading="depends on amplitude" if p < _SIGNIFICANCE else "linear",
    )


def quasi_static(
    modulus: Quantity, pressure: Quantity, isotherm: IsothermResult | None
) -> QuasiStatic | None:
    """The isotherm's modulus at the mean pressure of the oscillation; None where it has none there."""
    if isotherm is None:
        return None
    curve = isotherm.headline.curve
    stop = int(np.argmax(curve.pressure)) + 1
    rising = np.maximum.accumulate(curve.pressure[:stop])
    if not rising[0] <= pressure.value <= rising[-1]:
        return None
    value = float(np.interp(pressure.value, rising, curve.modulus[:stop]))
    noise = float(np.interp(pressure.value, rising, curve.u_modulus[:stop]))
    if not value > 0:
        return None
    # the pressure at which it is read is uncertain too
    step = pressure.u or 0.0
    nearby = np.interp([pressure.value - step, pressure.value + step], rising, curve.modulus[:stop])
    u = math.hypot(noise, 0.5 * float(nearby[1] - nearby[0]))
    ratio = modulus.value / value
    u_ratio = ratio * math.hypot((modulus.u or 0.0) / modulus.value, u / value)
    return QuasiStatic(
        Quantity(value, u, "mN/m"),
        Quantity(ratio, u_ratio, "1"),
        two_sided_p(modulus.value - value, math.hypot(modulus.u or 0.0, u)),
    )
