"""The printed form of barrier oscillations."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    hanging,
    heading,
    join_blocks,
    paragraph,
    plain_number,
    scaled,
    shown,
    table,
    with_unit,
)
from isotherm.oscillation_result import OscillationResult, OscillationSegment

__all__ = ["oscillation_text"]

SEGMENTS = [
    Column("stretch", "right"),
    Column("Hz", "sign"),
    Column("strain, %", "sign"),
    Column("Π, mN/m", "sign"),
    Column("linear"),
]
MODULI = [
    Column("stretch", "right"),
    Column("storage E', mN/m", "sign"),
    Column("loss E'', mN/m", "sign"),
    Column("phase, deg", "sign"),
    Column("viscosity, mN s/m", "sign"),
]


def oscillation_text(result: OscillationResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    stretches = [
        [
            f"{s.number}",
            shown(s.frequency),
            shown(scaled(s.amplitude, 100.0, "%")),
            shown(s.pressure),
            "yes" if s.linear else "no",
        ]
        for s in result.segments
    ]
    moduli = [
        [f"{s.number}", shown(s.storage), shown(s.loss), shown(s.phase), shown(s.viscosity)]
        for s in result.segments
    ]
    blocks = [
        heading(f"Barrier oscillations of {result.name}", width),
        table(SEGMENTS, stretches, width),
        table(MODULI, moduli, width),
        _remarks(result, width),
        paragraph(
            f"Strain: amplitude of ln A. Linear: harmonics below {100 * result.limit:.3g} % of the "
            f"first. {COVERAGE_NOTE}",
            width,
        ),
    ]
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _remarks(result: OscillationResult, width: int) -> str:
    lines = [text for s in result.segments for text in _of_stretch(s)]
    for check in result.amplitude_checks:
        among = ", ".join(str(number) for number in check.segments)
        lines.append(
            f"stretches {among}, {plain_number(check.frequency)} Hz: {check.reading}; |E*| changes by "
            f"{with_unit(scaled(check.change, 100.0, '%'))} from the smallest to the largest "
            f"amplitude (p = {check.p:.2g})"
        )
    return "\n".join(hanging(line, width, indent=2) for line in lines)


def _of_stretch(segment: OscillationSegment) -> list[str]:
    lines = [f"stretch {segment.number}: {flag}" for flag in segment.flags]
    still = segment.quasi_static
    if still is not None:
        lines.append(
            f"stretch {segment.number}: |E*| is {shown(still.ratio)} of the isotherm's modulus, "
            f"{with_unit(still.modulus)} (p = {still.p:.2g})"
        )
    return lines
