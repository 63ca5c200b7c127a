"""A kind of evidence made ready for its line: numbers against strokes, and what to expect."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_ledger import FilmInputs, LedgerView
from transfer.evidence_series import EvidenceSeries

__all__ = ["Increment", "Reading", "build_reading", "film_key", "films_of", "from_sheet", "setting"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Increment:
    """Rise expected per layer: constant × Π input^power, in the unit of the measured value.

    A measured value that was itself computed from an input (a charge divided by an electrode area)
    carries that input here with the opposite power, so that one law holds every dependence.
    """

    constant: float
    powers: tuple[tuple[str, float], ...] = ()

    def value(self, inputs: Mapping[str, float]) -> float:
        """Evaluate the law at `inputs`."""
        out = self.constant
        for name, power in self.powers:
            out *= inputs[name] ** power
        return out


@dataclass(frozen=True)
class Reading:
    """One kind, reduced to numbers.

    Parameters
    ----------
    kind, label : str
        Kind of evidence and what to call this series.
    symbol, unit : str
        Of the measured value, for tables and figures.
    index : (m,) int array
        Strokes made before each measurement.
    y, u : (m,) arrays
        Measured value and its standard uncertainty (ones where `u_from_scatter`).
    increments : dict of film name -> Increment
        Films that do not show in this kind are absent.
    inputs : dict of input name -> Quantity
        Inputs of the increments; 1 stands in for an unknown one.
    unknown : tuple of str
        Inputs nobody gave. With any of them no number of layers is implied.
    implies : str
        The input that the increment per layer gives when all others are known ("" for none).
    shown : tuple of str
        Films the kind sees.
    free_intercept, u_from_scatter : bool
    details : dict
        What else the raw data gave, ready for JSON.
    """

    kind: str
    label: str
    symbol: str
    unit: str
    index: NDArray[np.int64]
    y: FloatArray
    u: FloatArray
    increments: dict[str, Increment]
    inputs: dict[str, Quantity]
    shown: tuple[str, ...]
    unknown: tuple[str, ...] = ()
    implies: str = ""
    free_intercept: bool = True
    u_from_scatter: bool = False
    details: dict[str, Any] = field(default_factory=dict)
    warnings: tuple[str, ...] = ()
    where: tuple[str, ...] = ()


def setting(series: EvidenceSeries, key: str, default: float, notes: list[str]) -> Quantity:
    """Return a setting; when absent, the exact `default`, and a note that says so."""
    found = series.quantity(key)
    if found is not None:
        return found
    notes.append(f"{series.label}: {key.replace('_', ' ')} not given, {default:g} taken")
    return Quantity(default, 0.0, "1")


def films_of(series: EvidenceSeries, ledger: LedgerView) -> tuple[FilmInputs, ...]:
    """Films this kind sees: the one it names, else all that were deposited.

    Raises
    ------
    UpstrokeError
        When it names a film that was not deposited.
    """
    names = tuple(dict.fromkeys(ledger.films))
    wanted = series.text("film")
    if wanted is None:
        return tuple(ledger.film(name) for name in names)
    if wanted not in names:
        known = ", ".join(f'"{name}"' for name in names if name) or "one film without a name"
        raise UpstrokeError(
            f'film "{wanted}" was not deposited; the build holds {known}',
            where=series.where,
            remedy="name a film as the run sheet does",
        )
    return (ledger.film(wanted),)


def from_sheet(series: EvidenceSeries, key: str, shown: tuple[FilmInputs, ...]) -> Quantity | None:
    """Return a setting; when the evidence file lacks it, what the run sheet says for all films shown."""
    given = series.quantity(key)
    if given is not None:
        return given
    found = {getattr(film, key) for film in shown}
    only = next(iter(found)) if len(found) == 1 else None
    return only if isinstance(only, Quantity) else None


def film_key(what: str, film: FilmInputs) -> str:
    """Name of a film's input, e.g. "layer thickness" or "layer thickness of spacer"."""
    return f"{what} of {film.name}" if film.name else what


def build_reading(
    series: EvidenceSeries,
    ledger: LedgerView,
    *,
    symbol: str,
    unit: str,
    increments: dict[str, Increment],
    inputs: Mapping[str, Quantity | None],
    shown: tuple[FilmInputs, ...],
    implies: str = "",
    values: Sequence[Quantity] | None = None,
    details: dict[str, Any] | None = None,
    notes: list[str] | None = None,
    zero_is_natural: bool = False,
) -> Reading:
    """Put points and expectation together; shared by every kind.

    Inputs nobody gave are None. `values` default to the points' values as read. A common relative
    uncertainty of the values becomes one more input. The intercept is free as soon as two different
    numbers of layers were measured.

    Raises
    ------
    UpstrokeError
        When some points carry u and others do not, or layers do not match the log.
    """
    notes = list(notes or [])
    index = np.array(
        [ledger.index_after(p.axis, p.position, p.where) for p in series.points], dtype=np.int64
    )
    if values is None:
        values = [p.value for p in series.points if p.value is not None]
    given = [v.u is not None and v.u > 0 for v in values]
    if any(given) and not all(given):
        raise UpstrokeError(
            f"{series.kind} has u for some values and not for others",
            where=series.points[given.index(False)].where,
            remedy="give u for all of them, or for none to have it taken from the scatter",
        )
    scatter = not all(given)
    y = np.array([v.value for v in values])
    u = np.ones(len(y)) if scatter else np.array([v.u or 0.0 for v in values])
    unknown = tuple(name for name, value in inputs.items() if value is None)
    if unknown:
        notes.append(f"{series.label}: {' and '.join(unknown)} unknown, so no layers are implied")
    known = {n: Quantity(1.0, 0.0, "1") if q is None else q for n, q in inputs.items()}
    common = series.quantity("common_uncertainty")
    if common is not None:
        name = f"scale of {series.label}"
        known[name] = Quantity(1.0, common.value, "1")
        increments = {
            film: Increment(law.constant, (*law.powers, (name, 1.0)))
            for film, law in increments.items()
        }
    free = series.text("intercept") != "zero" and len(np.unique(index)) > 1
    if not free and series.text("intercept") != "zero" and not zero_is_natural:
        notes.append(
            f"{series.label}: measured at one number of layers and without a blank; the value of the"
            " bare substrate was taken as zero"
        )
    smallest = 5 if free else 4
    if scatter and len(y) < smallest:
        raise UpstrokeError(
            f"{series.kind} has no u, and {len(y)} values are too few to take it from their scatter",
            where=series.where,
            remedy=f"give u, or at least {smallest} values",
        )
    if scatter:
        notes.append(
            f"{series.label}: u not given; taken from the scatter about the line, so the line's fit"
            " cannot be tested"
        )
    return Reading(
        kind=series.kind,
        label=series.label,
        symbol=symbol,
        unit=unit,
        index=index,
        y=y,
        u=u,
        increments=increments,
        inputs=known,
        shown=tuple(f.name for f in shown),
        unknown=unknown,
        implies=implies if len(shown) == 1 else "",
        free_intercept=free,
        u_from_scatter=scatter,
        details=dict(details or {}),
        warnings=tuple(notes),
        where=tuple(p.where for p in series.points),
    )
