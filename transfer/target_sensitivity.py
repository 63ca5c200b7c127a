"""How the recommended pressure moves when each input moves by its standard uncertainty."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Any, TypeVar

import numpy as np

from isotherm.quantity import Quantity
from isotherm.sheet import Target
from transfer.target_choice import Choice, choose
from transfer.target_inputs import Band, Supply, TargetInputs, moved

__all__ = ["Effect", "combined_u", "sensitivity"]

Owner = TypeVar("Owner", TargetInputs, Supply, Target)


@dataclass(frozen=True)
class Effect:
    """One input, and what moving it by its u does to the recommendation.

    shift_up, shift_down : mN/m the recommended pressure moves when the input is u larger and u smaller; None
    where no pressure is admissible any more. u : of the input, in `unit`.
    """

    name: str
    u: float
    unit: str
    shift_up: float | None
    shift_down: float | None

    @property
    def shift(self) -> float:
        """The larger of the two, mN/m, without sign."""
        return max((abs(s) for s in (self.shift_up, self.shift_down) if s is not None), default=0.0)


@dataclass(frozen=True)
class _Input:
    """An input with u, and how the inputs look when it is moved by k of it."""

    name: str
    u: float
    unit: str
    move: Callable[[float], TargetInputs]


def sensitivity(inputs: TargetInputs, choice: Choice) -> tuple[Effect, ...]:
    """Move every input by its u, up and down, and choose again.

    Parameters
    ----------
    inputs : TargetInputs
    choice : Choice
        What the unmoved inputs give.

    Returns
    -------
    tuple of Effect
        Largest first; empty when nothing is recommended. Zero and scale of the pressure are common to all
        features and move them together.
    """
    if choice.recommended is None:
        return ()
    effects = []
    for item in _inputs(inputs):
        up = choose(item.move(+1.0)).recommended
        down = choose(item.move(-1.0)).recommended
        effects.append(
            Effect(
                item.name,
                item.u,
                item.unit,
                None if up is None else up - choice.recommended,
                None if down is None else down - choice.recommended,
            )
        )
    return tuple(sorted(effects, key=lambda effect: -effect.shift))


def combined_u(effects: tuple[Effect, ...]) -> float:
    """Standard uncertainty of the recommendation, mN/m: half the span of each effect, in quadrature."""
    halves = []
    for effect in effects:
        up, down = effect.shift_up, effect.shift_down
        if up is None or down is None:
            halves.append(effect.shift)
        else:
            halves.append(max(0.5 * abs(up - down), abs(0.5 * (up + down))))
    return float(np.linalg.norm(halves)) if halves else 0.0


def _inputs(inputs: TargetInputs) -> Iterator[_Input]:
    end = inputs.end
    name = "collapse pressure" if inputs.collapse is not None else "highest pressure reached"
    yield from _pressure(name, end, lambda by: _with_end(inputs, by))
    for j, band in enumerate(inputs.bands):
        yield from _band_inputs(inputs, j, band)
    common = max((_common(q) for q in (end, *(b.onset for b in inputs.bands))), default=0.0)
    if common > 0:
        yield _Input(
            "zero and scale of pressure", common, "mN/m", lambda k: _shifted(inputs, k * common)
        )
    for label, field in (("controller tolerance", "tolerance"), ("overshoot", "overshoot")):
        yield from _stated(label, inputs, field, lambda new: new)
    yield _modulus(inputs)
    if inputs.loss is not None and inputs.wanted.loss is not None:
        loss = inputs.loss
        yield _Input(
            "film loss", float(loss.u_loss[:, -1].max()), "1",
            lambda k: replace(inputs, loss=loss.moved(k)),
        )  # fmt: skip
    if inputs.supply is not None:
        yield from _supply_inputs(inputs, inputs.supply)
    yield from _wish_inputs(inputs)


def _pressure(
    name: str, feature: Quantity, move: Callable[[float], TargetInputs]
) -> Iterator[_Input]:
    """The part of a feature's u that is its own."""
    u = feature.u_random if feature.u_random is not None else feature.u
    if u:
        yield _Input(name, u, "mN/m", lambda k: move(k * u))


def _with_end(inputs: TargetInputs, by: float) -> TargetInputs:
    highest = moved(inputs.highest, by)
    if inputs.collapse is None:
        return replace(inputs, highest=highest)
    # the cap by the highest pressure goes along, or it would hide half of the move
    return replace(inputs, collapse=moved(inputs.collapse, by), highest=highest)


def _band_inputs(inputs: TargetInputs, j: int, band: Band) -> Iterator[_Input]:
    def put(new: Band) -> TargetInputs:
        return replace(inputs, bands=(*inputs.bands[:j], new, *inputs.bands[j + 1 :]))

    if band.kind == "kink":
        both = band.onset
        yield from _pressure(
            band.name,
            both,
            lambda by: put(replace(band, onset=moved(both, by), end=moved(both, by))),
        )
        return
    yield from _pressure(
        f"{band.name}, onset",
        band.onset,
        lambda by: put(replace(band, onset=moved(band.onset, by))),
    )
    if band.end is not None:
        end = band.end
        yield from _pressure(
            f"{band.name}, end", end, lambda by: put(replace(band, end=moved(end, by)))
        )


def _common(feature: Quantity) -> float:
    return feature.u_systematic or 0.0


def _shifted(inputs: TargetInputs, by: float) -> TargetInputs:
    """Every pressure of the isotherm moved together; what the sheet says stays."""
    return replace(
        inputs,
        film=inputs.film.with_pressure_moved(by),
        highest=moved(inputs.highest, by),
        collapse=None if inputs.collapse is None else moved(inputs.collapse, by),
        lift_off=None if inputs.lift_off is None else moved(inputs.lift_off, by),
        bands=tuple(
            replace(
                band,
                onset=moved(band.onset, by),
                end=None if band.end is None else moved(band.end, by),
            )
            for band in inputs.bands
        ),
        phases=tuple(
            replace(phase, pressure=(phase.pressure[0] + by, phase.pressure[1] + by))
            for phase in inputs.phases
        ),
    )


def _modulus(inputs: TargetInputs) -> _Input:
    typical = float(np.median(inputs.film.u_modulus))
    return _Input(
        "modulus (median u)", typical, "mN/m",
        lambda k: replace(inputs, film=inputs.film.with_modulus_moved(k)),
    )  # fmt: skip


def _supply_inputs(inputs: TargetInputs, supply: Supply) -> Iterator[_Input]:
    for name, field in (("smallest area", "smallest_area"), ("film a stroke takes", "stroke")):
        yield from _stated(name, supply, field, lambda new: replace(inputs, supply=new))
    relative, count = supply.area_relative_u, inputs.film.molecules
    if relative > 0 and count is not None:
        yield _Input(
            "amount spread", relative, "1",
            lambda k: replace(
                inputs, film=replace(inputs.film, molecules=count * (1.0 + k * relative))
            ),
        )  # fmt: skip


def _wish_inputs(inputs: TargetInputs) -> Iterator[_Input]:
    """Limits the sheet states with an uncertainty of their own."""
    wishes = (
        ("collapse margin asked for", "collapse_margin"), ("guard band asked for", "guard_band"),
        ("packing error allowed", "packing_error"), ("loss allowed", "loss"),
    )  # fmt: skip
    for name, field in wishes:
        yield from _stated(name, inputs.wanted, field, lambda new: replace(inputs, wanted=new))


def _stated(
    name: str, owner: Owner, field: str, put: Callable[[Owner], TargetInputs]
) -> Iterator[_Input]:
    """A quantity held in a field, moved there and put back into the inputs."""
    value: Quantity | None = getattr(owner, field)
    if value is None or not value.u:
        return
    u = value.u

    def move(k: float) -> TargetInputs:
        changes: dict[str, Any] = {field: moved(value, k * u)}
        return put(replace(owner, **changes))

    yield _Input(name, u, value.unit, move)
