"""One kind of evidence against the ledger: its line, its bend, the layers it implies."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from transfer.evidence_bend import Bend, find_bend
from transfer.evidence_fit import LineFit, fit_line, lack_of_fit
from transfer.evidence_ledger import LedgerView
from transfer.evidence_reading import Reading

__all__ = ["KindLine", "fit_reading", "scatter_inflation"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class KindLine:
    """What one kind says.

    Parameters
    ----------
    reading : Reading
    x : (m,) array, layers
        Layers the kind sees at each point, by the ledger (films weighted by what each should add).
    u_x : (m,) array, layers
    line : LineFit or None
        Straight line; None where the intercept and slope are not asked for (Bragg spacing).
    bend : Bend or None
        Strongest hinge, whether or not chance explains it.
    lack_of_fit : float or None
        Probability of the scatter about the line (χ²).
    expected_increment : float or None
        Rise per layer from the inputs, unit of the reading.
    ratio : float or None
        Rise found over rise expected at the last point.
    u_ratio_values : float
        Part of u(ratio) that comes from the measured values alone.
    ledger_row : (n,) array
        Relative change of the layers implied per change of each stroke's transfer ratio.
    powers : dict of input name -> float
        Relative change of the layers implied per relative change of an input.
    counts_layers : bool
        False for a kind that tests an input (Bragg spacing).
    last_index : int
        Strokes made before the last measurement.
    worst, worst_fall : int, float
        The point whose absence would lower χ² most, and by how much.
    """

    reading: Reading
    x: FloatArray
    u_x: FloatArray
    line: LineFit | None
    bend: Bend | None
    lack_of_fit: float | None
    expected_increment: float | None
    ratio: float | None
    u_ratio_values: float
    ledger_row: FloatArray
    powers: dict[str, float] = field(default_factory=dict)
    counts_layers: bool = True
    last_index: int = 0
    worst: int = 0
    worst_fall: float = 0.0

    def bends(self, below: float) -> bool:
        """Whether the line bends: likelier than chance allows, and no single point explains it better."""
        if self.bend is None or self.line is None or not self.bend.p_value < below:
            return False
        return self.line.chi_square - self.bend.fit.chi_square >= self.worst_fall

    def shape_p(self) -> float:
        """Smallest probability of the tests of shape (bend, scatter), each taken twice."""
        bend = 1.0 if self.bend is None else self.bend.p_value
        scatter = 1.0 if self.lack_of_fit is None else self.lack_of_fit
        return min(1.0, 2.0 * min(bend, scatter))


def scatter_inflation(line: LineFit | None) -> float:
    """Variance of Student's t with the line's degrees of freedom over a normal one's.

    u taken from few residuals is itself uncertain; 1 where u was given.
    """
    if line is None or line.noise_scale is None:
        return 1.0
    return line.dof / (line.dof - 2.0) if line.dof > 2 else math.inf


def fit_reading(reading: Reading, ledger: LedgerView, *, bend_below: float) -> KindLine:
    """Fit the line of `reading` through the ledger's layers.

    The number of layers implied is ratio × the ledger's total, so a kind measured only part of the way
    leans on the ledger for the rest. A bend likelier than chance (p < `bend_below`) is followed.

    Raises
    ------
    UpstrokeError
        When the points do not determine a line.
    """
    if reading.kind == "bragg_spacing":
        return _spacing(reading, ledger)
    weights, expected = _weights(reading, ledger)
    cumulative = ledger.weighted(weights)
    x = cumulative[reading.index]
    rows = ledger.weighted_rows(reading.index, weights)
    cov_x = rows @ ledger.covariance @ rows.T
    cov_y = np.diag(reading.u**2)
    try:
        line = fit_line(
            x,
            reading.y,
            cov_y,
            cov_x,
            free_intercept=reading.free_intercept,
            scale_from_scatter=reading.u_from_scatter,
        )
    except UpstrokeError as error:
        raise UpstrokeError(
            f"{reading.label}: {error.what}", where=reading.where[0], remedy=error.remedy
        ) from None
    bend = find_bend(x, reading.y, cov_y, cov_x, line, cumulative)
    worst, worst_fall = _worst_point(line, x)
    draft = KindLine(
        reading=reading,
        x=x,
        u_x=np.sqrt(np.diag(cov_x)),
        line=line,
        bend=bend,
        lack_of_fit=lack_of_fit(line),
        expected_increment=expected,
        ratio=None,
        u_ratio_values=math.nan,
        ledger_row=np.zeros(len(ledger.added)),
        worst=worst,
        worst_fall=worst_fall,
    )
    followed = bend.fit if bend is not None and draft.bends(bend_below) else line
    last = int(np.max(reading.index))
    reach = float(cumulative[last])
    ratio, u_values, ledger_row = draft.ratio, draft.u_ratio_values, draft.ledger_row
    if expected is not None and reach > 0:
        lever = followed.rise_row(reach) @ followed.operator
        rise = float(followed.rise_row(reach) @ followed.parameters)
        ratio = rise / (expected * reach)
        scale = 1.0 if line.noise_scale is None else line.noise_scale**2
        variance = float(lever @ (cov_y * scale) @ lever) * scatter_inflation(line)
        u_values = math.sqrt(variance) / abs(expected * reach)
        # local slopes relative to the mean one: 1 throughout when the line is straight
        relative = followed.local_slope * reach / rise if rise else np.ones(len(x))
        total = ledger.total.value
        ledger_row = 1.0 / total - (lever * relative) @ rows / reach
    return replace(
        draft,
        ratio=None if reading.unknown else ratio,
        u_ratio_values=u_values,
        ledger_row=ledger_row,
        powers=_powers(reading, ledger, last) if expected is not None else {},
        last_index=last,
    )


def _worst_point(line: LineFit, x: FloatArray) -> tuple[int, float]:
    """Index of the point whose absence would lower χ² most, and the fall (0 where none can)."""
    design, weight = line.design(x), line.weight
    inner = weight - weight @ design @ np.linalg.solve(
        design.T @ weight @ design, design.T @ weight
    )
    own = np.diag(inner)
    testable = own > 1e-9 * np.diag(weight)  # a point the line must pass through tells nothing
    falls = np.where(testable, (weight @ line.residuals) ** 2, 0.0) / np.where(testable, own, 1.0)
    worst = int(np.argmax(falls))
    return worst, float(falls[worst])


def _spacing(reading: Reading, ledger: LedgerView) -> KindLine:
    weight = 1.0 / reading.u**2
    mean = float(np.sum(weight * reading.y) / np.sum(weight))
    chi_square = float(np.sum(weight * (reading.y - mean) ** 2))
    dof = len(reading.y) - 1
    p_value = None
    if dof > 0:
        from scipy.special import gammaincc

        p_value = float(gammaincc(dof / 2.0, chi_square / 2.0))
    expected = None
    if not reading.unknown:
        law = next(iter(reading.increments.values()))
        expected = law.value({n: q.value for n, q in reading.inputs.items()})
    return KindLine(
        reading=reading,
        x=ledger.cumulative[reading.index],
        u_x=np.zeros(len(reading.y)),
        line=None,
        bend=None,
        lack_of_fit=p_value,
        expected_increment=expected,
        ratio=None if expected is None else mean / expected,
        u_ratio_values=0.0 if expected is None else float(1.0 / math.sqrt(weight.sum())) / expected,
        ledger_row=np.zeros(len(ledger.added)),
        powers={n: -p for law in reading.increments.values() for n, p in law.powers},
        counts_layers=False,
        last_index=int(np.max(reading.index)),
    )


def _expected(reading: Reading) -> dict[str, float]:
    values = {name: q.value for name, q in reading.inputs.items()}
    return {film: law.value(values) for film, law in reading.increments.items()}


def _weights(reading: Reading, ledger: LedgerView) -> tuple[FloatArray, float | None]:
    """Weight of each stroke's layers, 1 on average over those the kind sees, and that average's rise."""
    expected = _expected(reading)
    seen = np.array([film in reading.shown for film in ledger.films])
    rise = np.array([expected.get(film, 0.0) for film in ledger.films])
    amount = np.where(seen, np.abs(ledger.added), 0.0)
    mean = float(np.sum(rise * amount) / np.sum(amount)) if np.any(amount > 0) else 0.0
    only_implied = reading.unknown in ((), (reading.implies,))
    if not only_implied or mean == 0.0 or not math.isfinite(mean):
        return seen.astype(np.float64), None
    weights: FloatArray = rise / mean
    return weights, mean


def _powers(reading: Reading, ledger: LedgerView, last: int) -> dict[str, float]:
    """Relative change of the layers implied per relative change of each input."""
    expected = _expected(reading)
    part: dict[str, float] = {}
    for film, added in zip(ledger.films[:last], ledger.added[:last], strict=True):
        part[film] = part.get(film, 0.0) + float(added) * expected.get(film, 0.0)
    whole = sum(part.values())
    out: dict[str, float] = {}
    for film, law in reading.increments.items():
        share = part.get(film, 0.0) / whole if whole else 0.0
        for name, power in law.powers:
            out[name] = out.get(name, 0.0) - power * share
    return out
