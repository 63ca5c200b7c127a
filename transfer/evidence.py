"""The one way from an evidence file and a ledger to what they say about each other."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import Final

from isotherm.errors import UpstrokeError
from isotherm.quantity import Quantity
from isotherm.result import IsothermResult
from isotherm.sheet import RunSheet
from transfer.evidence_capacitance import capacitance_reading
from transfer.evidence_common_bend import bend_together
from transfer.evidence_coverage import coverage_reading
from transfer.evidence_from_result import ledger_from_result
from transfer.evidence_implied import (
    LEDGER,
    ledger_member,
    member_of,
    shared_inputs,
)
from transfer.evidence_joint import Joint, Member, combine, judge
from transfer.evidence_ledger import LedgerView
from transfer.evidence_line import KindLine, fit_reading
from transfer.evidence_optical import SURFACE_DENSITY, absorbance_reading
from transfer.evidence_pinholes import blocking_pinholes, capacitance_pinholes
from transfer.evidence_read import read_evidence
from transfer.evidence_report import kind_result, statement_of
from transfer.evidence_resonator import resonator_reading
from transfer.evidence_result import EvidenceResult, JointResult, Pinholes
from transfer.evidence_series import EvidenceSet
from transfer.evidence_thickness import spacing_reading, thickness_reading
from transfer.result import TransferResult

__all__ = ["SCALE_LEVEL", "SHAPE_LEVEL", "assess", "evidence_for"]

# Chance of one or more false alarms, split between the test that all kinds imply the same number of
# layers and the tests of each kind's shape (shared out evenly over the kinds). Together 4.5 %: the
# 5 % allowed, less a margin for the approximations (relative errors of finite size).
SCALE_LEVEL: Final = 0.025
SHAPE_LEVEL: Final = 0.02

_READERS: Final = {
    "absorbance": absorbance_reading,
    "resonator_frequency": resonator_reading,
    "ellipsometric_thickness": thickness_reading,
    "xray_thickness": thickness_reading,
    "bragg_spacing": spacing_reading,
    "electroactive_coverage": coverage_reading,
    "interfacial_capacitance": capacitance_reading,
}


def evidence_for(
    path: str | Path,
    result: TransferResult,
    sheet: RunSheet,
    *,
    isotherm: IsothermResult | None = None,
) -> EvidenceResult:
    """Read the evidence file at `path` and test it against a transfer result.

    Parameters
    ----------
    path : str or Path
        CSV or TOML, see `evidence_read`.
    result : TransferResult
    sheet : RunSheet
    isotherm : IsothermResult or None
        Gives the area per molecule at the dipping pressure when the sheet does not.

    Raises
    ------
    UpstrokeError
        As `read_evidence` and `assess`.
    """
    return assess(read_evidence(path), ledger_from_result(result, sheet, isotherm=isotherm))


def assess(evidence: EvidenceSet, ledger: LedgerView) -> EvidenceResult:
    """Fit every kind against the ledger, test them together, and say which one disagrees.

    Parameters
    ----------
    evidence : EvidenceSet
    ledger : LedgerView
        Layers after each stroke with covariance, and the run sheet's numbers per film.

    Raises
    ------
    UpstrokeError
        Evidence that does not match the log, or that determines nothing.
    """
    if len(ledger.added) == 0 or not ledger.total.value > 0:
        raise UpstrokeError(
            "the log laid down no film, so there is nothing to test evidence against",
            where=evidence.path,
            remedy="check the log's transfer ratios first",
        )
    warnings = [*ledger.warnings, *evidence.warnings]
    readings = []
    pinholes: list[Pinholes] = []
    for series in evidence.series:
        if series.kind == "blocking_test":
            pinholes.extend(blocking_pinholes(series, ledger))
            continue
        reading = _READERS[series.kind](series, ledger)
        warnings.extend(reading.warnings)
        readings.append(reading)
    level = SHAPE_LEVEL / max(len(readings), 1)
    lines = tuple(fit_reading(r, ledger, bend_below=level / 2.0) for r in readings)
    for line in lines:
        if line.reading.kind == "interfacial_capacitance":
            found = capacitance_pinholes(line, ledger)
            if found is not None:
                pinholes.append(found)

    inputs, powers = shared_inputs(lines)
    members = {}
    for line, own in zip(lines, powers, strict=True):
        member = member_of(line, ledger, own)
        if member is not None:
            members[line.reading.label] = member
    crooked = [line.reading.label for line in lines if line.shape_p() < level]
    common = bend_together(lines, crooked, level)
    straight = [m for name, m in members.items() if name not in crooked or name in common]
    counted = [m for m in straight if m.counts]
    anchor = ledger_member(ledger)
    tested = straight if common else [anchor, *straight]
    joint = judge(tested, inputs, ledger.covariance, anchor.value, level=SCALE_LEVEL)
    named = tuple(
        dict.fromkeys(
            [
                *([LEDGER] if common else ()),
                *(c for c in crooked if c not in common),
                *joint.disagrees,
            ]
        )
    )
    kinds = tuple(
        kind_result(
            line, members.get(line.reading.label), anchor, inputs, ledger, joint, named, level
        )
        for line in lines
    )
    result = JointResult(
        agree=not named and joint.agree,
        chi_square=joint.chi_square,
        dof=joint.dof,
        p_value=joint.p_value,
        pull_p=joint.pull_p,
        disagrees=named,
        undecided=joint.undecided,
        layers=joint.estimate if counted else ledger.total,
        ledger_layers=ledger.total,
        surface_density=_surface_density(tested, joint, inputs, ledger),
        coverage_ratio=_over_ledger(tested, joint, inputs, ledger),
        statement="",
    )
    result = replace(result, statement=statement_of(result, kinds, bool(common)))
    return EvidenceResult(
        path=evidence.path,
        sha256=evidence.sha256,
        kinds=kinds,
        joint=result,
        pinholes=tuple(pinholes),
        roughness=_roughness(lines),
        raw_files=evidence.raw_files,
        warnings=tuple(dict.fromkeys(warnings)),
    )


def _agreeing(tested: Sequence[Member], joint: Joint) -> list[Member]:
    return [m for m in tested if m.name not in joint.disagrees]


def _surface_density(
    tested: Sequence[Member], joint: Joint, inputs: dict[str, Quantity], ledger: LedgerView
) -> Quantity | None:
    """Molecules per area of one face after the last stroke, from all members that agree."""
    if joint.estimate is None:
        return None
    amount = 0.0
    parts: dict[str, float] = {}
    for film, added in zip(ledger.films, ledger.added, strict=True):
        described = ledger.film(film)
        if described.molecular_area is None:
            return None
        name = f"area per molecule of {film}" if film else "area per molecule"
        share = float(added) * SURFACE_DENSITY / described.molecular_area.value
        amount += share
        parts[name] = parts.get(name, 0.0) + share
        inputs.setdefault(name, described.molecular_area)
    extra = {name: -part / amount for name, part in parts.items()}
    found = combine(_agreeing(tested, joint), inputs, ledger.covariance, ledger.total.value, extra)
    if found is None:
        return None
    per_layer = amount / ledger.total.value
    return Quantity(
        found.value * per_layer, None if found.u is None else found.u * per_layer, "mol/cm^2"
    )


def _over_ledger(
    tested: Sequence[Member], joint: Joint, inputs: dict[str, Quantity], ledger: LedgerView
) -> Quantity | None:
    """Layers by the evidence alone over the ledger's; None without evidence that counts layers."""
    evidence = [m for m in _agreeing(tested, joint) if m.name != LEDGER]
    if joint.estimate is None or not any(m.counts for m in evidence):
        return None
    total = ledger.total.value
    # the ratio has the ledger's own error taken out of each member: row − 1/total
    rows = [replace(m, ledger_row=m.ledger_row - m.counts / total) for m in evidence]
    found = combine(rows, inputs, ledger.covariance, total)
    if found is None:
        return None
    return Quantity(found.value / total, None if found.u is None else found.u / total, "1")


def _roughness(lines: Sequence[KindLine]) -> Quantity | None:
    for line in lines:
        if "roughness" in line.reading.inputs:
            return line.reading.inputs["roughness"]
    return None
