"""The marks of many traces as a table a person can read at 80 columns, and as JSON."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from isotherm_marks import Feature, Marks

__all__ = ["summarise", "table"]

KNEES = (
    "lift-off area",
    "onset area",
    "onset pressure",
    "end area",
    "end pressure",
    "kink area",
    "kink pressure",
    "collapse area",
    "collapse pressure",
)
AREA_AT = ("area at 10", "area at 20", "area at 30")
# label, feature names, relative (per cent) or absolute (mN/m), median floor, 90 % floor
ROWS: tuple[tuple[str, tuple[str, ...], bool, float | None, float | None], ...] = (
    ("collapse pressure, mN/m", ("collapse pressure",), False, 0.25, 0.7),
    ("collapse area, %", ("collapse area",), True, 0.1, None),
    ("onset area, %", ("onset area",), True, 0.2, None),
    ("onset pressure, mN/m", ("onset pressure",), False, 0.17, None),
    ("end area, %", ("end area",), True, None, None),
    ("end pressure, mN/m", ("end pressure",), False, None, None),
    ("kink area, %", ("kink area",), True, 0.25, None),
    ("kink pressure, mN/m", ("kink pressure",), False, None, None),
    ("limiting area, %", ("limiting area",), True, 0.15, None),
    ("lift-off area, %", ("lift-off area",), True, 0.06, None),
    ("area at 10, 20, 30, %", AREA_AT, True, 0.12, None),
)


def _share(marks: Sequence[Marks], test: Callable[[Marks], bool | None]) -> dict[str, Any]:
    told = [t for t in map(test, marks) if t is not None]
    return {"percent": 100.0 * float(np.mean(told)) if told else None, "n": len(told)}


def _coverage(features: Sequence[Feature]) -> dict[str, Any]:
    n = len(features)
    return {
        "percent": 100.0 * float(np.mean([f.covered for f in features])) if n else None,
        "without_u": sum(f.u is None for f in features),
        "n": n,
    }


def summarise(marks: Sequence[Marks]) -> dict[str, Any]:
    """The figures of one set of marks."""
    features = [f for m in marks for f in m.features]
    out: dict[str, Any] = {
        "traces": len(marks),
        "failed": sum(bool(m.error) for m in marks),
        "collapse": _share(marks, lambda m: m.collapse_right and not m.error),
        "kind": _share(marks, lambda m: m.kind_right),
        "transitions": _share(marks, lambda m: m.transitions_right and not m.error),
        "missed": {
            "lift-off": sum(m.lift_off_missed for m in marks),
            "limiting area": sum(m.limiting_missed for m in marks),
            "area at": sum(m.area_at_missed for m in marks),
        },
        "errors": {},
        "coverage": {},
        "seconds": {
            "median": float(np.median([m.seconds for m in marks])) if marks else None,
            "largest": float(max(m.seconds for m in marks)) if marks else None,
        },
    }
    for label, names, relative, *_ in ROWS:
        chosen = [f for f in features if f.name in names]
        errors = np.abs([f.relative if relative else f.error for f in chosen])
        out["errors"][label] = {
            "median": float(np.median(errors)) if errors.size else None,
            "p90": float(np.percentile(errors, 90)) if errors.size else None,
            "bias": float(np.median([f.relative if relative else f.error for f in chosen]))
            if chosen
            else None,
            "n": int(errors.size),
            "coverage": _coverage(chosen),
        }
    areas = [f for f in features if f.name in KNEES and f.name.endswith("area")]
    pressures = [f for f in features if f.name in KNEES and f.name.endswith("pressure")]
    out["coverage"] = {
        "knees": _coverage(areas + pressures),
        "knee areas": _coverage(areas),
        "knee pressures": _coverage(pressures),
    }
    return out


def _number(value: float | None, digits: int = 3) -> str:
    return "-" if value is None else f"{value:.{digits}f}"


def table(title: str, figures: dict[str, Any]) -> str:
    """Write one summary as text, at most 80 columns."""
    lines = [f"{title}: {figures['traces']} traces, {figures['failed']} not analysed"]
    for key, label, floor in (
        ("collapse", "collapse called rightly, %", "97"),
        ("kind", "  its kind called rightly, %", ""),
        ("transitions", "transitions called rightly, %", "95"),
    ):
        share = figures[key]
        lines.append(f"  {label:<32}{_number(share['percent'], 1):>8} (n {share['n']}) {floor:>6}")
    head = f"  {'error':<26}{'median':>8}{'90 %':>8}{'bias':>8}{'in 2u %':>9}{'n':>6}{'floor':>11}"
    lines.append(head)
    for label, _, _, median, p90 in ROWS:
        row = figures["errors"][label]
        if not row["n"]:
            continue
        floor = "" if median is None else f"{median:g}" + ("" if p90 is None else f" / {p90:g}")
        cover = row["coverage"]["percent"]
        lines.append(
            f"  {label:<26}{_number(row['median']):>8}{_number(row['p90']):>8}"
            f"{_number(row['bias']):>8}{_number(cover, 1):>9}{row['n']:>6}{floor:>11}"
        )
    for label, row in figures["coverage"].items():
        missing = f", {row['without_u']} without u" if row["without_u"] else ""
        share = f"{label} inside ±2u, %"
        lines.append(f"  {share:<32}{_number(row['percent'], 1):>8} (n {row['n']}{missing})")
    missed = ", ".join(f"{k} {v}" for k, v in figures["missed"].items() if v)
    if missed:
        lines.append(f"  not given though there: {missed}")
    seconds = figures["seconds"]
    if seconds["median"] is not None:
        lines.append(
            f"  time per trace: median {1e3 * seconds['median']:.0f} ms, "
            f"largest {1e3 * seconds['largest']:.0f} ms"
        )
    return "\n".join(lines)
