"""Straight line (or hinged line) through measured value against layers, with errors in both."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError

__all__ = ["LineFit", "fit_line", "hinge_column", "lack_of_fit"]

FloatArray = NDArray[np.float64]

# The fixed-point iteration shrinks its step many times over at each turn; 1e-7 of the step's own
# standard uncertainty is far below anything printed.
_TOLERANCE = 1e-7
_TURNS = 100


@dataclass(frozen=True)
class LineFit:
    """A fitted line y = intercept + slope x (+ change max(0, x − hinge)).

    Parameters
    ----------
    parameters : (p,) array
        Intercept (when free), slope, change of slope (when hinged), in units of y and layers.
    covariance : (p, p) array
        Of `parameters`.
    operator : (p, m) array
        To first order parameters = operator @ y: what carries errors of y (and, times the local
        slope, of x) into the parameters.
    local_slope : (m,) array
        Slope at each point: an error of x moves y by this much.
    residuals : (m,) array
        y minus line.
    weight : (m, m) array
        Inverse of the covariance of `residuals`.
    chi_square, dof : float, int
        Least sum of squares and degrees of freedom.
    free_intercept : bool
    hinge : float or None
        Layers at which the line bends.
    noise_scale : float or None
        Factor the scatter asked for on stated u; None when the u given were used as they are.
    """

    parameters: FloatArray
    covariance: FloatArray
    operator: FloatArray
    local_slope: FloatArray
    residuals: FloatArray
    weight: FloatArray
    chi_square: float
    dof: int
    free_intercept: bool
    hinge: float | None = None
    noise_scale: float | None = None

    @property
    def intercept(self) -> float:
        """Value at no layers."""
        return float(self.parameters[0]) if self.free_intercept else 0.0

    @property
    def slope(self) -> float:
        """Increment per layer (before the bend, when hinged)."""
        return float(self.parameters[self.slope_index])

    @property
    def slope_index(self) -> int:
        """Place of the slope among the parameters."""
        return 1 if self.free_intercept else 0

    @property
    def u_slope(self) -> float:
        """Standard uncertainty of `slope`."""
        return float(np.sqrt(self.covariance[self.slope_index, self.slope_index]))

    def design(self, x: FloatArray) -> FloatArray:
        """Rows that give the line at `x` when multiplied by `parameters`, (m, p)."""
        return _design(np.asarray(x, dtype=float), self.free_intercept, self.hinge)

    def line(self, x: FloatArray) -> FloatArray:
        """The line at `x` (layers), (m,)."""
        drawn: FloatArray = self.design(x) @ self.parameters
        return drawn

    def rise_row(self, x: float) -> FloatArray:
        """Row that gives line(x) − line(0) when multiplied by `parameters`, (p,)."""
        row: FloatArray = (self.design(np.array([x])) - self.design(np.array([0.0])))[0]
        return row


def fit_line(
    x: FloatArray,
    y: FloatArray,
    cov_y: FloatArray,
    cov_x: FloatArray,
    *,
    free_intercept: bool = True,
    hinge: float | None = None,
    scale_from_scatter: bool = False,
) -> LineFit:
    """Fit by least squares with errors in both variables, correlated or not.

    Minimises r' (V_y + S V_x S)⁻¹ r with r = y − line(x) and S the local slopes. For independent
    errors this is York's solution; the covariance is taken at the adjusted points, as there.

    Parameters
    ----------
    x : (m,) array, layers
    y : (m,) array, unit of the kind
    cov_y : (m, m) array
        Covariance of y. With `scale_from_scatter` only its shape counts.
    cov_x : (m, m) array, layers^2
        Covariance of x (cumulative transfer ratios: errors add up from stroke to stroke).
    free_intercept : bool
        False forces the line through zero at no layers.
    hinge : float or None, layers
        Where a continuous change of slope is allowed.
    scale_from_scatter : bool
        Take the size of the errors of y from the scatter about the line.

    Returns
    -------
    LineFit

    Raises
    ------
    UpstrokeError
        When the points do not determine the line.

    Source: York, Evensen, López Martínez & De Basabe Delgado, Am. J. Phys. 2004, 72, 367,
    written for full covariance matrices instead of single points.
    """
    x = np.asarray(x, dtype=float)
    y = np.asarray(y, dtype=float)
    design = _design(x, free_intercept, hinge)
    count = design.shape[1]
    if np.linalg.matrix_rank(design) < count:
        raise UpstrokeError(
            f"a line of {count} parameters is not determined by points at"
            f" {len(np.unique(x))} different numbers of layers",
            remedy="measure at more numbers of layers",
        )
    scale = None
    if scale_from_scatter:
        plain = _solve(x, y, cov_y, np.zeros_like(cov_x), design, free_intercept, hinge)
        if plain.dof < 1:
            raise UpstrokeError(
                "without u of the values their scatter has to give it, and there are too few points",
                remedy="give u, or more points",
            )
        scale = float(np.sqrt(plain.chi_square / plain.dof))
        cov_y = cov_y * max(scale, 1e-12) ** 2
    return _solve(x, y, cov_y, cov_x, design, free_intercept, hinge, scale)


def lack_of_fit(fit: LineFit) -> float | None:
    """Probability of a χ² as large as this by chance alone; None without degrees of freedom."""
    if fit.dof < 1 or fit.noise_scale is not None:
        return None
    from scipy.special import gammaincc

    return float(gammaincc(fit.dof / 2.0, fit.chi_square / 2.0))


def hinge_column(x: FloatArray, hinge: float) -> FloatArray:
    """max(0, x − hinge)."""
    column: FloatArray = np.maximum(0.0, np.asarray(x, dtype=float) - hinge)
    return column


def _design(x: FloatArray, free_intercept: bool, hinge: float | None) -> FloatArray:
    columns = [np.ones_like(x)] if free_intercept else []
    columns.append(x)
    if hinge is not None:
        # measured from where the line is pinned, so that line(0) stays the intercept
        columns.append(hinge_column(x, hinge))
    return np.column_stack(columns)


def _local_slope(
    x: FloatArray, parameters: FloatArray, free_intercept: bool, hinge: float | None
) -> FloatArray:
    first = 1 if free_intercept else 0
    slope = np.full(len(x), parameters[first])
    if hinge is not None:
        slope = slope + parameters[first + 1] * (x > hinge)
    return slope


def _solve(
    x: FloatArray,
    y: FloatArray,
    cov_y: FloatArray,
    cov_x: FloatArray,
    design: FloatArray,
    free_intercept: bool,
    hinge: float | None,
    scale: float | None = None,
) -> LineFit:
    start: FloatArray = np.linalg.lstsq(design, y, rcond=None)[0].astype(np.float64)
    problem = _Problem(x, y, cov_y, cov_x, design, free_intercept, hinge)
    parameters = problem.iterate(start, adjust=True)
    exact = parameters is not None
    if parameters is None:
        # far outliers let a steep line with huge errors of layers win: keep the layers where they are
        parameters = problem.iterate(start, adjust=False)
    if parameters is None:
        raise UpstrokeError(
            "no line goes through the values, they differ too wildly",
            remedy="check their numbers and units",
        )
    slope = _local_slope(x, parameters, free_intercept, hinge)
    weight = _inverse(cov_y + slope[:, None] * cov_x * slope[None, :])
    residuals = y - design @ parameters
    shift = cov_x @ (slope * (weight @ residuals)) if exact else 0.0
    adjusted = _design(x + shift, free_intercept, hinge)
    return LineFit(
        parameters=parameters,
        covariance=np.linalg.inv(adjusted.T @ weight @ adjusted).astype(np.float64),
        operator=np.linalg.solve(adjusted.T @ weight @ design, adjusted.T @ weight).astype(
            np.float64
        ),
        local_slope=slope,
        residuals=residuals,
        weight=weight,
        chi_square=float(residuals @ weight @ residuals),
        dof=len(y) - design.shape[1],
        free_intercept=free_intercept,
        hinge=hinge,
        noise_scale=scale,
    )


@dataclass(frozen=True)
class _Problem:
    """Points and their covariances, solved by repeated linear least squares."""

    x: FloatArray
    y: FloatArray
    cov_y: FloatArray
    cov_x: FloatArray
    design: FloatArray
    free_intercept: bool
    hinge: float | None

    def iterate(self, start: FloatArray, *, adjust: bool) -> FloatArray | None:
        """Parameters where the step has died out; None when it does not.

        With `adjust`, the design is taken at the adjusted points, whose fixed point is the minimum
        itself; without, at the points as read, which always settles but near the minimum only.
        """
        parameters = start
        for _ in range(_TURNS):
            slope = _local_slope(self.x, parameters, self.free_intercept, self.hinge)
            residuals = self.y - self.design @ parameters
            # where the true layers most likely lie, given line and point (York's adjusted points)
            try:
                weight = _inverse(self.cov_y + slope[:, None] * self.cov_x * slope[None, :])
                shift = self.cov_x @ (slope * (weight @ residuals)) if adjust else 0.0
                at = _design(self.x + shift, self.free_intercept, self.hinge)
                step = np.linalg.solve(at.T @ weight @ self.design, at.T @ weight @ residuals)
                spread = np.sqrt(np.abs(np.diag(np.linalg.inv(at.T @ weight @ at))))
            except np.linalg.LinAlgError:
                return None
            if not np.all(np.isfinite(step)):
                return None
            parameters = parameters + step
            if np.all(np.abs(step) <= _TOLERANCE * spread):
                return parameters
        return None


def _inverse(covariance: FloatArray) -> FloatArray:
    # scaled to unit diagonal first: the values may be 1e-10 mol/cm^2 or 1e6 Hz
    size = np.sqrt(np.diag(covariance))
    if np.any(size <= 0) or not np.all(np.isfinite(size)):
        raise UpstrokeError(
            "a point without uncertainty cannot be weighed against the others",
            remedy="give u greater than zero",
        )
    inverse: FloatArray = np.linalg.inv(covariance / np.outer(size, size)) / np.outer(size, size)
    return inverse
