"""What repeated runs of one film say together, as frozen data that knows its JSON form."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.quantity import Quantity, json_number
from isotherm.series import COVERAGE, Row, quantity_cells

__all__ = ["FeatureSpread", "MeanCurve", "ReplicateRun", "ReplicatesResult"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class ReplicateRun:
    """One run of the series.

    area_factor : its areas divided by those of the median run, unit "1" (spreading and trough scale).
    shape : rms relative deviation from the median curve once `area_factor` is divided out, unit "1".
    reasons : why the run is called outlying; empty where it is not.
    values : feature name -> what this run gave (missing features are absent).
    """

    name: str
    path: str
    kept: bool
    area_factor: Quantity | None
    shape: float | None
    reasons: tuple[str, ...] = ()
    values: dict[str, Quantity] = field(default_factory=dict)

    @property
    def outlying(self) -> bool:
        """True where at least one reason was found."""
        return bool(self.reasons)

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "name": self.name,
            "path": self.path,
            "kept": self.kept,
            "outlying": self.outlying,
            "reasons": list(self.reasons),
            "area_factor": None if self.area_factor is None else self.area_factor.to_json(),
            "shape": json_number(self.shape),
            "features": {name: value.to_json() for name, value in self.values.items()},
        }


@dataclass(frozen=True)
class FeatureSpread:
    """One feature over the kept runs.

    mean : u_random is s/√n, u_systematic the part every run shares (not divided by √n).
    s : standard deviation between runs, in the unit of `mean`; None for n = 1.
    interval : Student-t interval of the mean from the scatter alone, coverage 95 %; None for n = 1.
    interval_combined : the same with the shared systematic part.
    repeatability_s : s_r, equal to `s` for one series under repeatability conditions.
    repeatability_s_interval : its chi-square interval, coverage 95 %.
    repeatability_limit : r = 2.8 s_r.
    """

    name: str
    n: int
    mean: Quantity
    s: float | None
    interval: tuple[float, float] | None
    interval_combined: tuple[float, float] | None
    repeatability_s: float | None
    repeatability_s_interval: tuple[float, float] | None
    repeatability_limit: float | None

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""

        def pair(interval: tuple[float, float] | None) -> list[float | None] | None:
            return None if interval is None else [json_number(v) for v in interval]

        return {
            "name": self.name,
            "n": self.n,
            "mean": self.mean.to_json(),
            "s": json_number(self.s),
            "coverage": COVERAGE,
            "interval": pair(self.interval),
            "interval_combined": pair(self.interval_combined),
            "repeatability": {
                "s_r": json_number(self.repeatability_s),
                "s_r_interval": pair(self.repeatability_s_interval),
                "limit": json_number(self.repeatability_limit),
            },
        }


@dataclass(frozen=True)
class MeanCurve:
    """Mean area at each surface pressure, over the pressures every kept run has. All (p,).

    pressure mN/m; mean, s (between runs), u_systematic, low, high nm^2. low and high bound the
    pointwise Student-t interval of the mean from the scatter alone, coverage 95 %.
    """

    pressure: FloatArray
    mean: FloatArray
    s: FloatArray
    n: int
    u_systematic: FloatArray
    low: FloatArray
    high: FloatArray

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form."""
        return {
            "n": self.n,
            "coverage": COVERAGE,
            "pressure": [json_number(float(v)) for v in self.pressure],
            "area": [json_number(float(v)) for v in self.mean],
            "s": [json_number(float(v)) for v in self.s],
            "u_systematic": [json_number(float(v)) for v in self.u_systematic],
            "low": [json_number(float(v)) for v in self.low],
            "high": [json_number(float(v)) for v in self.high],
        }


@dataclass(frozen=True)
class ReplicatesResult:
    """Everything repeated runs gave. `curves` holds each run's area at `curve.pressure`, (runs, p)."""

    runs: tuple[ReplicateRun, ...]
    curve: MeanCurve
    features: tuple[FeatureSpread, ...]
    curves: FloatArray
    alpha: float
    warnings: tuple[str, ...] = ()

    def feature(self, name: str) -> FeatureSpread | None:
        """The spread of the feature called `name`; None where no kept run has it."""
        return next((f for f in self.features if f.name == name), None)

    def to_json(self) -> dict[str, Any]:
        """Return the JSON form, schema upstroke.replicates/1."""
        return {
            "schema": "upstroke.replicates/1",
            "settings": {"coverage": COVERAGE, "outlier_alpha": self.alpha},
            "warnings": list(self.warnings),
            "runs": [r.to_json() for r in self.runs],
            "features": [f.to_json() for f in self.features],
            "curve": self.curve.to_json(),
        }

    def rows(self) -> list[Row]:
        """One row a run: name, kept, outlying, reasons, then every feature with its u."""
        names = list(dict.fromkeys(name for run in self.runs for name in run.values))
        rows: list[Row] = []
        for run in self.runs:
            row: Row = {
                "name": run.name,
                "path": run.path,
                "kept": int(run.kept),
                "outlying": int(run.outlying),
                "reasons": "; ".join(run.reasons),
            }
            row.update(quantity_cells("area_factor", run.area_factor))
            row["shape"] = run.shape
            for name in names:
                row.update(quantity_cells(name, run.values.get(name)))
            rows.append(row)
        return rows

    def curve_rows(self) -> list[Row]:
        """One row a pressure of the mean curve."""
        c = self.curve
        return [
            {
                "pressure": float(c.pressure[i]),
                "area": float(c.mean[i]),
                "s": float(c.s[i]),
                "n": c.n,
                "u_systematic": float(c.u_systematic[i]),
                "low": float(c.low[i]),
                "high": float(c.high[i]),
            }
            for i in range(len(c.pressure))
        ]
