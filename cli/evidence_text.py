"""The printed form of evidence from the substrate, and of what a stack should show."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    join_blocks,
    paragraph,
    pretty_unit,
    scaled,
    shown,
    table,
    with_unit,
)
from isotherm.quantity import Quantity
from transfer.evidence_result import EvidenceResult, KindResult
from transfer.expected_stack import ExpectedStack

__all__ = ["evidence_block", "evidence_text", "expected_block"]

KINDS = [
    Column("kind"),
    Column("layers ± U", "sign"),
    Column("found/expected", "sign"),
    Column("p", "right"),
    Column(""),
]
LINES = [
    Column("kind"),
    Column("per layer ± U", "sign"),
    Column("expected ± U", "sign"),
    Column("unit"),
    Column("p of line", "right"),
]
EXPECTED = [Column(""), Column("as designed", "sign"), Column("as built", "sign"), Column("unit")]

# Small units into readable ones: factor and what to print.
READABLE = {
    "mol/cm^2": (1e12, "pmol/cm²"),
    "L/mol/cm": (1.0, "L/(mol cm)"),
    "cm^2/µF": (1.0, "cm²/µF"),
    "µF/cm^2": (1.0, "µF/cm²"),
}
EXPECTED_ROWS = (
    ("layers", "layers"),
    ("thickness", "thickness"),
    ("mass_per_area", "mass, one face"),
    ("surface_density", "molecules, one face"),
    ("absorbance", "absorbance"),
    ("frequency_shift", "frequency shift"),
    ("elastance", "1/C added"),
    ("capacitance", "film's capacitance"),
)


def evidence_text(result: EvidenceResult, width: int) -> str:
    """Return the printed form on its own, with warnings, laid out for `width` columns."""
    blocks = [evidence_block(result, width), paragraph(COVERAGE_NOTE, width)]
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def evidence_block(result: EvidenceResult, width: int) -> str:
    """Return the printed form as a part of a longer one."""
    rows = [
        [
            "transfer ratios",
            shown(result.joint.ledger_layers),
            "",
            "",
            "disagrees" if "transfer ratios" in result.joint.disagrees else "",
        ],
        *(_kind_row(kind) for kind in result.kinds),
        ["best estimate", shown(result.joint.layers), shown(result.joint.coverage_ratio), "", ""],
    ]
    parts = [
        heading("Evidence from the substrate", width),
        paragraph(result.joint.statement, width),
        table(KINDS, rows, width),
    ]
    reasons = [f"{k.label}: {k.reason}" for k in result.kinds if k.reason and k.bend is None]
    if reasons:
        parts.append(bullets(reasons, width))
    parts.append(table(LINES, [_line_row(k) for k in result.kinds if k.increment], width))
    parts.append(_implied(result, width))
    parts.append(_electrode(result, width))
    if result.joint.surface_density is not None:
        density = _readable(result.joint.surface_density)
        parts.append(
            paragraph(
                f"Molecules on one face, best estimate: {shown(density)} {density.unit}", width
            )
        )
    parts.append(
        paragraph(
            "p: chance of so large a difference from the transfer ratios; p of line: of so much scatter"
            " about a straight line. Both count stated uncertainties only.",
            width,
        )
    )
    return "\n".join(part for part in parts if part)


def _probability(p: float | None) -> str:
    if p is None:
        return ""
    return "< 0.001" if p < 0.001 else f"{p:.2g}"


def _kind_row(kind: KindResult) -> list[str]:
    return [
        kind.label,
        shown(kind.layers),
        shown(kind.ratio),
        _probability(kind.p_value),
        "agrees" if kind.consistent else "disagrees",
    ]


def _readable(quantity: Quantity) -> Quantity:
    factor, unit = READABLE.get(quantity.unit, (1.0, pretty_unit(quantity.unit)))
    return scaled(quantity, factor, unit)


def _line_row(kind: KindResult) -> list[str]:
    increment = kind.increment or Quantity(0.0, None, kind.unit)
    found = _readable(increment)
    expected = None if kind.expected_increment is None else _readable(kind.expected_increment)
    return [
        kind.label,
        shown(found),
        shown(expected),
        found.unit,
        _probability(kind.lack_of_fit),
    ]


def _implied(result: EvidenceResult, width: int) -> str:
    lines = [
        f"{kind.label} implies {name} {with_unit(_readable(quantity))}"
        for kind in result.kinds
        for name, quantity in kind.implied.items()
    ]
    lines += [
        f"{kind.label} bends after stroke {kind.bend.after_stroke}"
        f" (95 %: {kind.bend.strokes[0]} to {kind.bend.strokes[1]}): per layer"
        f" {shown(_readable(kind.bend.increment_before))} before,"
        f" {with_unit(_readable(kind.bend.increment_after))} after"
        for kind in result.kinds
        if kind.bend is not None
    ]
    return bullets(lines, width) if lines else ""


def _electrode(result: EvidenceResult, width: int) -> str:
    lines = []
    if result.roughness is not None:
        lines.append(f"roughness factor {with_unit(result.roughness)}")
    for hole in result.pinholes:
        percent = scaled(hole.fraction, 100.0, "%")
        limit = "" if hole.upper_limit is None else f", below {100 * hole.upper_limit:.2g} % (95 %)"
        lines.append(
            f"bare area by {hole.source} at {hole.layers:.3g} layers: {with_unit(percent)}{limit}:"
            f" {hole.note}"
        )
    return bullets(lines, width) if lines else ""


def expected_block(expected: ExpectedStack, width: int) -> str:
    """Return what the stack should show, as designed and as built; empty when nothing is known."""
    rows = []
    for attribute, name in EXPECTED_ROWS:
        designed = getattr(expected.designed, attribute, None)
        built = getattr(expected.built, attribute, None)
        if designed is None and built is None:
            continue
        both = [None if q is None else _readable(q) for q in (designed, built)]
        unit = next(q.unit for q in both if q is not None)
        rows.append([name, *(shown(q) for q in both), unit])
    if not rows:
        return ""
    parts = [heading("What the stack should show", width), table(EXPECTED, rows, width)]
    packed = expected.contraction
    if packed is not None:
        parts.append(
            paragraph(
                f"The film packs differently on the substrate: a substrate wholly covered takes a"
                f" transfer ratio of {shown(packed.ratio)}; the mean of {shown(packed.measured)} found"
                f" covers {with_unit(scaled(packed.covered, 100.0, '%'))} of it.",
                width,
            )
        )
    return "\n".join(parts)
