"""What every series of runs shares: area against pressure, names of runs, Student-t intervals."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import PurePath
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.result import Branch, IsothermResult

__all__ = [
    "COVERAGE",
    "AreaSamples",
    "Row",
    "area_against_pressure",
    "effective_freedom",
    "format_p",
    "pressure_range",
    "quantity_cells",
    "random_part",
    "run_names",
    "spoken",
    "student_factor",
    "two_sided_p",
]

FloatArray = NDArray[np.float64]
Row = dict[str, float | int | str | None]  # one line of a CSV

COVERAGE: Final = 0.95  # of every interval of a series, named wherever one is printed
# Below this many noise standard deviations a pressure is not told from zero, so it has no area.
_FLOOR_IN_NOISE: Final = 5.0


@dataclass(frozen=True)
class AreaSamples:
    """Area of one run at chosen surface pressures; NaN where the run never has the pressure.

    pressure : (p,) mN/m. area : (p,) nm^2. u_random : (p,) nm^2, from the noise of the trace.
    softness : (p,) nm^2 per mN/m, -dA/dΠ: what an error of pressure does to the area.
    """

    pressure: FloatArray
    area: FloatArray
    u_random: FloatArray
    softness: FloatArray


def _rising(
    branch: Branch, where: str = ""
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Area, pressure, u and modulus of the curve up to its collapse or highest pressure."""
    curve = branch.curve
    good = np.isfinite(curve.area) & np.isfinite(curve.pressure)
    area, pressure = curve.area[good], curve.pressure[good]
    u, modulus = curve.u_pressure[good], curve.modulus[good]
    stop = int(np.argmax(pressure)) + 1 if len(pressure) else 0
    if branch.collapse is not None:
        before = np.flatnonzero(area >= branch.collapse.area.value)
        if len(before):
            stop = min(stop, int(before[-1]) + 1)
    if stop < 3:
        raise UpstrokeError(
            "fewer than three points rise to the highest pressure",
            where=where,
            remedy="leave this run out of the series",
        )
    return area[:stop], pressure[:stop], u[:stop], modulus[:stop]


def pressure_range(branch: Branch, *, where: str = "") -> tuple[float, float]:
    """Lowest and highest surface pressure (mN/m) at which `branch` has a definite area.

    Raises `UpstrokeError`, naming the run by `where`, when fewer than three points rise.
    """
    _, pressure, _, _ = _rising(branch, where)
    low = max(_FLOOR_IN_NOISE * branch.noise, float(pressure[0]))
    return low, float(pressure.max())


def area_against_pressure(branch: Branch, pressure: FloatArray) -> AreaSamples:
    """Read the area per molecule of `branch` at `pressure`.

    The condensed curve up to its collapse is made monotone by isotonic regression (Barlow et al. 1972),
    so that noise on a plateau gives one area to one pressure, and is then interpolated by the
    shape-preserving cubic of Fritsch & Carlson, SIAM J. Numer. Anal. 1980, 17, 238.

    Parameters
    ----------
    branch : Branch
    pressure : (p,) mN/m

    Returns
    -------
    AreaSamples
        NaN outside `pressure_range`.

    Raises
    ------
    UpstrokeError
        When fewer than three points rise.
    """
    from scipy.interpolate import PchipInterpolator
    from scipy.optimize import isotonic_regression

    wanted = np.asarray(pressure, dtype=np.float64)
    area, raw, u, modulus = _rising(branch)
    low, high = pressure_range(branch)
    noise = np.where(np.isfinite(u) & (u > 0), u, np.inf)
    floor = float(noise.min()) if np.isfinite(noise.min()) else 1.0
    weights = 1.0 / np.where(np.isfinite(noise), noise, floor) ** 2
    fit = isotonic_regression(raw, weights=weights)
    starts = fit.blocks[:-1].astype(np.int64)
    counts = np.diff(fit.blocks)
    knot_pressure = np.asarray(fit.x)[starts]
    knot_area = np.add.reduceat(area, starts) / counts
    # Equal neighbouring blocks (quantised readings) would leave two areas to one pressure.
    apart = np.concatenate(([True], np.diff(knot_pressure) > 1e-12 * max(1.0, abs(high))))
    knot_pressure, knot_area = knot_pressure[apart], knot_area[apart]
    nothing = np.full(wanted.shape, math.nan)
    if len(knot_pressure) < 3:
        return AreaSamples(wanted, nothing, nothing.copy(), nothing.copy())
    inside = (wanted >= low) & (wanted <= min(high, float(knot_pressure[-1])))
    clipped = np.clip(wanted, knot_pressure[0], knot_pressure[-1])
    read = np.asarray(PchipInterpolator(knot_pressure, knot_area)(clipped))
    # Softness from the regression's own modulus; where that is missing or not positive (plateau),
    # from the slope over the neighbouring knots.
    slope = -np.gradient(knot_area, knot_pressure)
    by_knots = np.interp(clipped, knot_pressure, slope)
    backwards = area[::-1]
    local_modulus = np.interp(read, backwards, modulus[::-1])
    local_u = np.interp(read, backwards, np.where(np.isfinite(u), u, 0.0)[::-1])
    with np.errstate(divide="ignore", invalid="ignore"):
        by_modulus = read / local_modulus
    softness = np.where((local_modulus > 0) & np.isfinite(by_modulus), by_modulus, by_knots)
    softness = np.maximum(softness, 0.0)
    # No error of pressure can move the area further than the curve is wide (a uniform distribution).
    widest = (float(area[0]) - float(area[-1])) / math.sqrt(12.0)
    u_area = np.minimum(softness * local_u, widest)
    return AreaSamples(
        wanted,
        np.where(inside, read, math.nan),
        np.where(inside, u_area, math.nan),
        np.where(inside, softness, math.nan),
    )


def run_names(results: Sequence[IsothermResult]) -> tuple[str, ...]:
    """A short name for each run, unique in the series: its title, else its file name."""
    names: list[str] = []
    for number, result in enumerate(results, start=1):
        name = result.title or PurePath(result.source.path).stem or f"run {number}"
        names.append(name)
    titles_repeat = {n for n in names if names.count(n) > 1}
    for i, result in enumerate(results):
        if names[i] in titles_repeat:
            stem = PurePath(result.source.path).stem
            names[i] = stem or names[i]
    still = {n for n in names if names.count(n) > 1}
    return tuple(f"{n} ({i + 1})" if n in still else n for i, n in enumerate(names))


def spoken(name: str) -> str:
    """A feature's name as a person writes it: lift_off_area becomes lift-off area."""
    words = name.replace("lift_off", "lift-off").replace("_", " ")
    return f"{words} mN/m" if " at " in words else words


def random_part(quantity: Quantity) -> float:
    """The random standard uncertainty of `quantity`; the combined one where the parts are unknown."""
    if quantity.u_random is not None:
        return quantity.u_random
    if quantity.u_systematic is not None or quantity.u is None:
        return 0.0
    return quantity.u


def student_factor(freedom: float, coverage: float = COVERAGE) -> float:
    """Two-sided Student-t factor for `freedom` degrees of freedom (inf: normal)."""
    from scipy.special import ndtri, stdtrit

    if freedom <= 0:
        return math.inf
    upper = 0.5 * (1.0 + coverage)
    return float(ndtri(upper)) if math.isinf(freedom) else float(stdtrit(freedom, upper))


def two_sided_p(value: float, u: float, freedom: float = math.inf) -> float:
    """Probability of |value| or more by chance when the truth is zero and `u` its uncertainty."""
    from scipy.special import ndtr, stdtr

    if not (u > 0 and math.isfinite(value)):
        return math.nan
    z = -abs(value) / u
    return float(2.0 * (ndtr(z) if math.isinf(freedom) else stdtr(freedom, z)))


def format_p(p: float | None) -> str:
    """Write a probability for a sentence: `p = 0.012`, `p < 0.0001`."""
    if p is None or not math.isfinite(p):
        return "p unknown"
    return "p < 0.0001" if p < 1e-4 else f"p = {p:.2g}"


def effective_freedom(parts: Sequence[tuple[float, float]]) -> float:
    """Degrees of freedom of a combined uncertainty from (u, freedom) pairs.

    Welch-Satterthwaite, GUM (JCGM 100:2008) G.4.1, equation G.2b.
    """
    total = sum(u * u for u, _ in parts)
    below = sum(u**4 / freedom for u, freedom in parts if u > 0 and math.isfinite(freedom))
    return math.inf if below <= 0 else total * total / below


def quantity_cells(name: str, quantity: Quantity | None) -> Row:
    """Two cells of a CSV row: `name` and `u_name`, both None where there is no quantity."""
    if quantity is None:
        return {name: None, f"u_{name}": None}
    finite = math.isfinite(quantity.value)
    u = quantity.u if quantity.u is not None and math.isfinite(quantity.u) else None
    return {name: quantity.value if finite else None, f"u_{name}": u}
