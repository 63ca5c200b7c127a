"""Thickness of the film: by ellipsometry, by X-ray fringes, or as the spacing of its Bragg peaks."""

from __future__ import annotations

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from transfer.evidence_ledger import LedgerView
from transfer.evidence_reading import Increment, Reading, build_reading, film_key, films_of
from transfer.evidence_series import EvidenceSeries

__all__ = ["spacing_reading", "thickness_reading"]


def thickness_reading(series: EvidenceSeries, ledger: LedgerView) -> Reading:
    """Reduce a series of film thicknesses (nm). Expected per layer: its layer thickness.

    Raises
    ------
    UpstrokeError
        As `build_reading`.
    """
    shown = films_of(series, ledger)
    increments: dict[str, Increment] = {}
    inputs: dict[str, Quantity | None] = {}
    for film in shown:
        name = film_key("layer thickness", film)
        inputs[name] = film.layer_thickness
        increments[film.name] = Increment(1.0, ((name, 1.0),))
    return build_reading(
        series,
        ledger,
        symbol="thickness",
        unit="nm",
        increments=increments,
        inputs=inputs,
        shown=shown,
        implies=film_key("layer thickness", shown[0]),
    )


def spacing_reading(series: EvidenceSeries, ledger: LedgerView) -> Reading:
    """Reduce Bragg spacings (nm per period) to a thickness per layer.

    A spacing does not count layers: it says how thick one is, so it tests the run sheet's layer
    thickness and through it every kind that leans on that. `y` holds spacing / layers_per_period;
    the intercept is not used.

    Raises
    ------
    UpstrokeError
        As `build_reading`; also for several films, whose spacing is that of their sequence.
    """
    shown = films_of(series, ledger)
    if len(shown) > 1:
        raise UpstrokeError(
            "the Bragg spacing of alternating films does not give the thickness of either",
            where=series.where,
            remedy='name the film it belongs to with the key "film", or leave it out',
        )
    per_period = series.quantity("layers_per_period")
    count = 2.0 if per_period is None else per_period.value
    values = [p.value for p in series.points if p.value is not None]
    has_u = all(v.u is not None and v.u > 0 for v in values)
    if not has_u:
        raise UpstrokeError(
            "a Bragg spacing needs its standard uncertainty",
            where=series.where,
            remedy='write it as "5.52 ± 0.03 nm"',
        )
    name = film_key("layer thickness", shown[0])
    return build_reading(
        series,
        ledger,
        symbol="thickness of a layer",
        unit="nm",
        increments={shown[0].name: Increment(1.0, ((name, 1.0),))},
        inputs={name: shown[0].layer_thickness},
        shown=shown,
        implies=name,
        values=[Quantity(v.value / count, (v.u or 0.0) / count, "nm") for v in values],
        details={"layers_per_period": count},
        notes=[f"{series.label}: a spacing counts no layers; it tests the layer thickness"],
        zero_is_natural=True,
    )
