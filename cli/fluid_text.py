"""The printed form of a fluid branch."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    join_blocks,
    paragraph,
    quantity_cells,
    range_text,
    table,
)
from isotherm.fluid_result import FluidResult, VolmerFit

__all__ = ["fluid_text"]

VALUES = [
    Column(""),
    Column("value ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("unit"),
]


def fluid_text(result: FluidResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [
        f"{heading(f'Fluid branch of {result.name}, {result.kelvin:.1f} K', width)}\n"
        + paragraph(result.statement, width),
        _fit_block("Whole branch", result.whole, width),
    ]
    if result.lower is not None:
        blocks.append(_fit_block("Lower part", result.lower, width))
    if result.gaseous is not None:
        cells = quantity_cells(result.gaseous.ratio)
        title = heading(f"Gaseous limit: {result.gaseous.reading}", width)
        blocks.append(f"{title}\n{table(VALUES, [['ΠA/kT at zero pressure', *cells]], width)}")
    blocks.append(
        paragraph(
            "Π = kT/(A − ω) − Π_coh. The thermal factor is 1 where the equation holds. "
            f"{COVERAGE_NOTE}",
            width,
        )
    )
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _fit_block(name: str, fit: VolmerFit, width: int) -> str:
    holds = "the equation holds" if fit.holds else "the equation does not hold"
    title = f"{name}, {range_text(fit.pressure, 1)} mN/m, {fit.points} points: {holds}"
    rows = [
        ["co-area ω", *quantity_cells(fit.co_area)],
        ["cohesion pressure", *quantity_cells(fit.cohesion)],
        ["thermal factor, left free", *quantity_cells(fit.thermal_factor)],
    ]
    said = (
        f"misfit beyond noise {fit.misfit:.2g} mN/m; p of a smooth misfit {fit.p_smooth:.2g}, "
        f"of its runs {fit.p_runs:.2g}"
    )
    return f"{heading(title, width)}\n{table(VALUES, rows, width)}\n" + paragraph(
        said, width, indent="  "
    )
