"""Numbers a line implies beside the layer count, and the kind's place in the joint statement."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Final

import numpy as np

from isotherm.quantity import Quantity
from transfer.evidence_joint import Member
from transfer.evidence_ledger import LedgerView
from transfer.evidence_line import KindLine
from transfer.evidence_reading import Reading

__all__ = [
    "LEDGER",
    "expected_quantity",
    "implied_input",
    "layers_quantity",
    "ledger_member",
    "member_of",
    "shared_inputs",
]

_UNITS: Final = {
    "layer thickness": "nm",
    "absorptivity": "L/mol/cm",
    "area per molecule": "nm^2",
    "permittivity": "1",
}

LEDGER: Final = "transfer ratios"


def shared_inputs(
    lines: tuple[KindLine, ...],
) -> tuple[dict[str, Quantity], tuple[dict[str, float], ...]]:
    """All inputs of all kinds by name, and each kind's powers under those names.

    Two kinds share an input when they give it the same value and u; else it is two inputs (two
    electrodes, two crystals), the second carrying its series' label.
    """
    inputs: dict[str, Quantity] = {}
    powers = []
    for line in lines:
        own: dict[str, float] = {}
        for name, power in line.powers.items():
            quantity = line.reading.inputs[name]
            key = name
            known = inputs.get(name)
            if known is not None and (known.value, known.u) != (quantity.value, quantity.u):
                key = f"{name} of {line.reading.label}"
            inputs[key] = quantity
            own[key] = power
        powers.append(own)
    return inputs, tuple(powers)


def ledger_member(ledger: LedgerView) -> Member:
    """The ledger as a measurement of layers."""
    total = ledger.total.value
    return Member(LEDGER, total, 1.0, 0.0, np.full(len(ledger.added), 1.0 / total), {})


def member_of(line: KindLine, ledger: LedgerView, powers: Mapping[str, float]) -> Member | None:
    """A kind as a measurement of layers (or of an input); None when it implies neither."""
    if line.ratio is None:
        return None
    name = line.reading.label
    if not line.counts_layers:
        return Member(name, line.ratio - 1.0, 0.0, line.u_ratio_values, line.ledger_row, powers)
    total = ledger.total.value
    return Member(
        name,
        line.ratio * total,
        1.0,
        line.u_ratio_values * total,
        line.ledger_row,
        powers,
    )


def layers_quantity(member: Member, inputs: Mapping[str, Quantity], ledger: LedgerView) -> Quantity:
    """Layers implied with u: values and transfer ratios are the random part, inputs the systematic."""
    row = member.ledger_row
    shared = float(row @ ledger.covariance @ row) * member.value**2
    systematic = sum(
        (power * (inputs[name].u or 0.0) / inputs[name].value) ** 2
        for name, power in member.powers.items()
    )
    return Quantity.combine(
        member.value,
        "1",
        u_random=math.sqrt(member.u_own**2 + shared),
        u_systematic=abs(member.value) * math.sqrt(systematic),
    )


def expected_quantity(reading: Reading, line: KindLine) -> Quantity | None:
    """Rise per layer expected, with the u of its inputs; None when an input is unknown."""
    if reading.unknown or line.expected_increment is None:
        return None
    relative = sum(
        (power * (reading.inputs[name].u or 0.0) / reading.inputs[name].value) ** 2
        for name, power in line.powers.items()
    )
    u = abs(line.expected_increment) * math.sqrt(relative)
    return Quantity(line.expected_increment, u if u > 0 else None, reading.unit)


def implied_input(reading: Reading, line: KindLine, ledger: LedgerView) -> dict[str, Quantity]:
    """The input that would bring expectation and line together, if all others are right.

    For a thickness that is the thickness of a layer, for a capacitance the relative permittivity, for an
    absorbance the absorptivity, for mass and coverage the area per molecule in the film.
    """
    name = reading.implies
    power = -line.powers.get(name, 0.0)
    if not name or power == 0.0 or line.expected_increment is None:
        return {}
    ratio = line.ratio
    if ratio is None and line.line is not None:
        ratio = line.line.slope / line.expected_increment
    if ratio is None or ratio <= max(line.u_ratio_values, 0.0):  # not told from zero
        return {}
    value = reading.inputs[name].value * ratio ** (1.0 / power)
    row = line.ledger_row - (1.0 / ledger.total.value if line.counts_layers else 0.0)
    relative = (line.u_ratio_values / ratio) ** 2 + float(row @ ledger.covariance @ row)
    for other, p in line.powers.items():
        if other != name:
            relative += (p * (reading.inputs[other].u or 0.0) / reading.inputs[other].value) ** 2
    unit = next((u for start, u in _UNITS.items() if name.startswith(start)), "1")
    return {name: Quantity(value, value * math.sqrt(relative) / abs(power), unit)}
