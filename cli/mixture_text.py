"""The printed form of mixtures compared with their components."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    join_blocks,
    paragraph,
    plain_number,
    shown,
    table,
    with_unit,
)
from isotherm.mixture_result import MixtureResult, MixturesAt, SurfacePhaseRule

__all__ = ["mixture_text"]


def mixture_text(result: MixtureResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [heading("Mixtures of " + " and ".join(result.components), width)]
    if result.kelvin is not None:
        blocks[0] += f"\n{paragraph(f'at {result.kelvin:.1f} K', width)}"
    for group in result.at:
        blocks.append(_group(result, group, width))
    for rule in result.phase_rule:
        blocks.append(_rule(result, rule, width))
    blocks.append(
        paragraph(
            "x: mole fraction. p: probability of an excess this large in an ideal film. ΔG: of "
            f"excess and of mixing, J per mole of molecules. {COVERAGE_NOTE}",
            width,
        )
    )
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _fractions(result: MixtureResult, fractions: tuple[float, ...]) -> str:
    """The mole fraction of the second component where there are two, else of each."""
    told = fractions[1:] if len(result.components) == 2 else fractions
    return " ".join(plain_number(x, 3) for x in told)


def _fraction_title(result: MixtureResult) -> str:
    return f"x {result.components[1]}" if len(result.components) == 2 else "x of each"


def _p(p: float | None) -> str:
    if p is None:
        return "–"
    return "<.0001" if p < 1e-4 else f"{p:.2g}"


def _group(result: MixtureResult, group: MixturesAt, width: int) -> str:
    columns = [
        Column(_fraction_title(result)),
        Column("area, nm²", "sign"),
        Column("excess, nm²", "sign"),
        Column("p", "right"),
        Column("ΔG ex", "sign"),
        Column("ΔG mix", "sign"),
    ]
    rows = [
        [
            _fractions(result, state.fractions),
            shown(state.area),
            shown(state.excess),
            _p(state.p),
            shown(state.gibbs_excess),
            shown(state.gibbs_mixing),
        ]
        for state in sorted(group.states, key=lambda state: state.fractions[::-1])
    ]
    lines = [
        heading(f"At {group.pressure:g} mN/m: {group.verdict}", width),
        table(columns, rows, width),
        paragraph(group.statement, width, indent="  "),
    ]
    if group.interaction is not None:
        said = f"Interaction ω of ω x(1 − x): {with_unit(group.interaction)}."
        lines.append(paragraph(said, width, indent="  "))
    return "\n".join(lines)


def _rule(result: MixtureResult, rule: SurfacePhaseRule, width: int) -> str:
    columns = [
        Column(_fraction_title(result)),
        Column("runs", "right"),
        Column(f"{rule.kind} pressure, mN/m", "sign"),
    ]
    rows = [
        [_fractions(result, point.fractions), f"{point.runs}", shown(point.pressure)]
        for point in sorted(rule.points, key=lambda point: point.fractions[::-1])
    ]
    title = heading(f"Surface phase rule, {rule.kind}: {rule.reading}", width)
    said = paragraph(rule.statement, width, indent="  ")
    return f"{title}\n{table(columns, rows, width)}\n{said}"
