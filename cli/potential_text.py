"""The printed form of a surface potential."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    join_blocks,
    paragraph,
    quantity_cells,
    shown,
    table,
)
from isotherm.potential_result import PotentialResult

__all__ = ["potential_text"]

PLACES = [
    Column("at"),
    Column("area, nm²", "right"),
    Column("Π, mN/m", "right"),
    Column("potential, mV", "sign"),
    Column("moment, mD", "sign"),
]
ONSET = [
    Column(""),
    Column("value ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("unit"),
]


def potential_text(result: PotentialResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    places = [
        [
            place.name,
            f"{place.area:.3f}",
            f"{place.pressure:.1f}",
            shown(place.potential),
            shown(place.moment),
        ]
        for place in result.at
    ]
    blocks = [
        f"{heading(f'Surface potential of {result.name}', width)}\n"
        + paragraph(result.statement, width),
        table(PLACES, places, width),
    ]
    if result.onset is not None:
        onset = result.onset
        rows = [
            ["onset of potential, area", *quantity_cells(onset.area)],
            ["level before it", *quantity_cells(onset.level)],
        ]
        if result.lift_off is not None:
            rows.append(["lift-off area", *quantity_cells(result.lift_off)])
        if onset.difference is not None:
            rows.append(["onset less lift-off", *quantity_cells(onset.difference)])
        blocks.append(f"{heading(f'Onset: {onset.reading}', width)}\n{table(ONSET, rows, width)}")
    blocks.append(
        paragraph(
            "Effective moment normal to the surface, ε0 A ΔV (Helmholtz). "
            f"Noise {result.noise:.2g} mV. {COVERAGE_NOTE}",
            width,
        )
    )
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)
