"""The printed form of a series of temperatures."""

from __future__ import annotations

from cli.render import (
    COVERAGE_NOTE,
    Column,
    bullets,
    heading,
    interval_text,
    join_blocks,
    paragraph,
    quantity_cells,
    scaled,
    shown,
    table,
)
from isotherm.constants import ZERO_CELSIUS
from isotherm.quantity import Quantity
from isotherm.temperature_result import TemperatureResult, TemperatureRun

__all__ = ["temperature_text"]

RUNS = [
    Column("run"),
    Column("T, °C", "sign"),
    Column("Π_t, mN/m", "sign"),
    Column("ΔA, nm²", "sign"),
    Column("ΔH, kJ/mol", "sign"),
    Column("ΔH full", "sign"),
]
SUMMARY = [
    Column(""),
    Column("value ± U", "sign"),
    Column("95 % interval", "right"),
    Column("unit"),
]
TRENDS = [
    Column("feature, per kelvin"),
    Column("n", "right"),
    Column("slope ± U", "sign"),
    Column("p", "right"),
    Column("unit"),
]
EXPANSIVITY = [
    Column("at, mN/m", "right"),
    Column("side"),
    Column("n", "right"),
    Column("expansivity ± U, 1/K", "sign"),
]


def temperature_text(result: TemperatureResult, width: int) -> str:
    """Return the printed form, laid out for `width` columns."""
    blocks = [
        heading(f"{len(result.runs)} runs over temperature", width),
        table(RUNS, [_run_cells(run) for run in result.runs], width),
        table(SUMMARY, _summary(result), width),
        table(
            TRENDS,
            [
                [
                    trend.name.replace("_", " "),
                    f"{trend.n}",
                    shown(trend.slope),
                    "<0.0001" if trend.p < 1e-4 else f"{trend.p:.2g}",
                    quantity_cells(trend.slope)[3],
                ]
                for trend in result.trends
            ],
            width,
        ),
        table(
            EXPANSIVITY,
            [[f"{e.pressure:g}", e.side, f"{e.n}", shown(e.value)] for e in result.expansivity],
            width,
        ),
        paragraph(
            "Π_t: pressure of the transition. ΔA: area of onset less area of end. ΔH: taken up from "
            "condensed to expanded, T ΔA dΠ_t/dT; full: with the subphase's own entropy, "
            f"T ΔA (dΠ_t/dT − dγ0/dT). {COVERAGE_NOTE}",
            width,
        ),
    ]
    if result.warnings:
        blocks.append(f"{heading('Warnings', width)}\n{bullets(result.warnings, width)}")
    return join_blocks(blocks)


def _celsius(kelvin: Quantity) -> Quantity:
    return Quantity(
        kelvin.value - ZERO_CELSIUS, kelvin.u, "degC", kelvin.u_random, kelvin.u_systematic
    )


def _kilojoules(quantity: Quantity | None) -> str:
    return "–" if quantity is None else shown(scaled(quantity, 1e-3, "kJ/mol"))


def _run_cells(run: TemperatureRun) -> list[str]:
    heat = run.heat
    return [
        run.name,
        shown(_celsius(run.kelvin)),
        shown(run.pressure),
        shown(run.delta_area),
        _kilojoules(heat.enthalpy if heat else None),
        _kilojoules(heat.enthalpy_full if heat else None),
    ]


def _summary(result: TemperatureResult) -> list[list[str]]:
    rows: list[list[str]] = []
    if result.slope is not None:
        interval = interval_text(result.slope_interval)
        rows.append(["dΠ_t/dT", shown(result.slope), interval, "mN/m/K"])
    if result.tension_slope is not None:
        rows.append([f"dγ0/dT, {result.tension_from}", shown(result.tension_slope), "–", "mN/m/K"])
    if result.begins_at is not None:
        begins = result.begins_at
        where = Quantity(begins.value - ZERO_CELSIUS, begins.u, "degC")
        rows.append(
            [
                "Π_t reaches zero",
                shown(where),
                interval_text((begins.low, begins.high), ZERO_CELSIUS),
                "°C",
            ]
        )
    for point in result.critical:
        rows.append(
            [
                f"ΔA closes ({point.law} law)",
                shown(_celsius(point.kelvin)),
                interval_text(point.interval, ZERO_CELSIUS),
                "°C",
            ]
        )
        if point.pressure is not None:
            rows.append(["  at the pressure", shown(point.pressure), "–", "mN/m"])
    return rows
