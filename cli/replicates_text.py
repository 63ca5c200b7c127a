"""The printed form of a comparison of repeated runs."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    interval_text,
    join_blocks,
    paragraph,
    plain_number,
    quantity_cells,
    shown,
    table,
)
from isotherm.replicates_result import FeatureSpread, ReplicatesResult

__all__ = ["replicates_text"]

RUNS = [
    Column("run"),
    Column("area, of the median's", "sign"),
    Column("kept"),
    Column("outlying"),
]
FEATURES = [
    Column("feature"),
    Column("n", "right"),
    Column("mean ± U", "sign"),
    Column("random", "right"),
    Column("common", "right"),
    Column("s", "right"),
    Column("unit"),
]
INTERVALS = [
    Column("feature"),
    Column("from scatter", "right"),
    Column("with common part", "right"),
    Column("r", "right"),
]


def replicates_text(result: ReplicatesResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    kept = sum(run.kept for run in result.runs)
    runs = [
        [
            run.name,
            shown(run.area_factor),
            "yes" if run.kept else "no",
            "yes" if run.outlying else "",
        ]
        for run in result.runs
    ]
    blocks = [
        heading(f"{len(result.runs)} runs, {kept} kept", width),
        table(RUNS, runs, width),
        _reasons(result, width),
        table(FEATURES, [_mean_cells(f) for f in result.features], width),
        f"{heading('Intervals of the mean, coverage 95 % (Student t)', width)}\n"
        + table(INTERVALS, [_interval_cells(f) for f in result.features if f.n > 1], width),
        paragraph(
            "s: standard deviation between runs. r: repeatability limit, the difference two runs "
            f"exceed in 5 % of cases. {COVERAGE_NOTE}",
            width,
        ),
    ]
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _reasons(result: ReplicatesResult, width: int) -> str:
    lines = [f"{run.name}: {reason}" for run in result.runs for reason in run.reasons]
    if not lines:
        return "  No run is outlying."
    return f"{heading('Outlying runs', width)}\n{bullets(lines, width)}"


def _words(name: str) -> str:
    return name.replace("_", " ")


def _mean_cells(feature: FeatureSpread) -> list[str]:
    mean, random, common, unit = quantity_cells(feature.mean)
    s = plain_number(feature.s, 2)
    return [_words(feature.name), f"{feature.n}", mean, random, common, s, unit]


def _interval_cells(feature: FeatureSpread) -> list[str]:
    return [
        _words(feature.name),
        interval_text(feature.interval),
        interval_text(feature.interval_combined),
        plain_number(feature.repeatability_limit, 2),
    ]
