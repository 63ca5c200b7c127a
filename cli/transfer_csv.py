"""The strokes of a transfer result as a CSV table."""

from __future__ import annotations

from cli.serialise import csv_bytes
from transfer.result import TransferResult

__all__ = ["transfer_csv"]

HEADER = (
    "stroke",
    "direction",
    "film",
    "start_s",
    "end_s",
    "coated_area_cm2",
    "u_coated_area_cm2",
    "film_removed_cm2",
    "u_film_removed_cm2",
    "ratio",
    "u_ratio",
    "u_ratio_random",
    "u_ratio_systematic",
    "ratio_uncorrected",
    "pressure_mean_mN_per_m",
    "pressure_sd_mN_per_m",
    "speed_mm_per_s",
    "flags",
)


def transfer_csv(result: TransferResult) -> bytes:
    """Return one row for each stroke; u_ columns are standard uncertainties."""
    rows = []
    for stroke in result.strokes:
        ratio = stroke.ratio
        rows.append(
            [
                stroke.number,
                stroke.direction,
                stroke.film,
                stroke.start_s,
                stroke.end_s,
                stroke.coated_area.value,
                stroke.coated_area.u,
                stroke.film_removed.value,
                stroke.film_removed.u,
                None if ratio is None else ratio.value,
                None if ratio is None else ratio.u,
                None if ratio is None else ratio.u_random,
                None if ratio is None else ratio.u_systematic,
                stroke.ratio_uncorrected,
                stroke.pressure_mean,
                stroke.pressure_sd,
                stroke.speed_mm_per_s,
                "; ".join(stroke.flags),
            ]
        )
    return csv_bytes(HEADER, rows)
