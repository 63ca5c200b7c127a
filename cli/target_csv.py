"""The plan of a build as rows of a CSV table."""

from __future__ import annotations

from typing import Any

from transfer.target_result import TargetResult

__all__ = ["plan_rows"]


def plan_rows(result: TargetResult) -> list[dict[str, Any]]:
    """Return one row a stroke: areas in cm^2 with standard uncertainties, times in s.

    Without a plan (the sheet lacks what it needs), one row a rule: what it allows, mN/m.
    """
    if not result.plan:
        return [
            {
                "rule": limit.rule,
                "allowed_from_mN_per_m": None if limit.allowed is None else limit.allowed.low,
                "allowed_to_mN_per_m": None if limit.allowed is None else limit.allowed.high,
                "binding": int(limit.binding),
            }
            for limit in result.limits
        ]
    return [
        {
            "stroke": row.stroke,
            "direction": row.direction,
            "film": row.film,
            "renew_before": int(row.renew_before),
            "starts_s": row.starts_s,
            "film_removed_cm2": row.film_removed.value,
            "u_film_removed_cm2": row.film_removed.u,
            "area_at_start_cm2": row.area_at_start.value,
            "u_area_at_start_cm2": row.area_at_start.u,
            "area_at_end_cm2": row.area_at_end.value,
            "u_area_at_end_cm2": row.area_at_end.u,
        }
        for row in result.plan
    ]
