"""Figures drawn for the page: small enough for a phone, with everything that can be read off them."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from cli.page_blocks import unit_text
from cli.page_figure import MOST_POINTS, Picture, Series, picture_of, place
from isotherm.quantity import Quantity, format_quantity

if TYPE_CHECKING:
    from isotherm.result import IsothermResult
    from isotherm.sheet import RunSheet

__all__ = [
    "evidence_picture",
    "isotherm_picture",
    "limits_picture",
    "result_pictures",
    "strokes_picture",
]

PAPER = (4.3, 4.5)  # inches: at the width of a phone its letters have the size of the page's
FLAT_PAPER = (4.3, 3.0)


def isotherm_picture(result: IsothermResult, sheet: RunSheet | None = None) -> Picture:
    """Draw the headline branch with a cursor that reads everything known at a pressure.

    Parameters
    ----------
    result : IsothermResult
    sheet : RunSheet, optional
        Gives packing error and strokes left, as far as it says enough.
    """
    from matplotlib.figure import Figure

    from isotherm.figures_modulus import scale_modulus
    from isotherm.figures_style import ACCENT, INK, SECOND, style

    curve = result.headline.curve
    with style():
        figure = Figure(figsize=PAPER)
        upper = figure.add_axes((0.14, 0.42, 0.83, 0.55))
        lower = figure.add_axes((0.14, 0.11, 0.83, 0.26), sharex=upper)
        upper.plot(curve.area, curve.pressure, color=INK)
        lower.plot(curve.area, curve.modulus, color=SECOND)
        for point in _found(result):
            upper.plot([point[0]], [point[1]], marker="o", color=ACCENT, markersize=5)
        upper.set_xlim(*_frame(result))
        scale_modulus(lower, float(np.nanmax(curve.modulus)))
        upper.tick_params(labelbottom=False)
        upper.set_ylabel("surface pressure Π (mN/m)")
        lower.set_ylabel("modulus (mN/m)")
        lower.set_xlabel("area per molecule A (nm²)")
        inside = np.flatnonzero(curve.area <= upper.get_xlim()[1])
        step = np.linspace(0, inside.size - 1, min(inside.size, MOST_POINTS)).round()
        kept = inside[np.unique(step).astype(np.int64)]
        x, y = place(upper, curve.area[kept], curve.pressure[kept])
        said = _readings(result, sheet, kept)
        name = f"{result.headline.direction} {result.headline.cycle}"
        return picture_of(
            figure,
            "Isotherm above, modulus below; dots mark what was found. The cursor reads both.",
            series=[Series(name, x, y, said)],
            narrow=True,
            cursor=True,
        )


def _frame(result: IsothermResult) -> tuple[float, float]:
    """Horizontal limits, nm^2: a long gas tail is cut so that the rise has room."""
    area, rise = result.headline.curve.area, result.headline.lift_off
    left, right = float(area.min()), float(area.max())
    if rise is not None:
        right = min(right, rise.value + 0.6 * (rise.value - left))
    room = 0.03 * (right - left)
    return left - room, right + room


def _found(result: IsothermResult) -> list[tuple[float, float]]:
    branch = result.headline
    points = [p for t in branch.transitions for p in (t.at, t.onset, t.end) if p is not None]
    found = [(p.area.value, p.pressure.value) for p in points]
    if branch.lift_off is not None:
        found.append((branch.lift_off.value, 0.0))
    if branch.collapse is not None:
        found.append((branch.collapse.area.value, branch.collapse.pressure.value))
    return found


def _readings(result: IsothermResult, sheet: RunSheet | None, kept: Any) -> tuple[str, ...]:
    """What is known at each point, in words."""
    from transfer.film_reading import FilmReading, film_reading

    branch = result.headline
    curve = branch.curve
    film = FilmReading() if sheet is None else film_reading(curve, sheet)
    common = [u for u in (result.pressure_u, branch.zero_offset.u) if u is not None]
    said = []
    for i in kept:
        area = float(curve.area[i])
        u_area = None if result.area_relative_u is None else area * result.area_relative_u
        u_pressure = float(np.linalg.norm([float(curve.u_pressure[i]), *common]))
        parts = [
            f"A {_text(area, u_area)} nm²",
            f"Π {_text(float(curve.pressure[i]), u_pressure)} mN/m",
            f"modulus {_text(float(curve.modulus[i]), float(curve.u_modulus[i]))} mN/m",
        ]
        if film.packing_error is not None and film.u_packing_error is not None:
            error, u = float(film.packing_error[i]), float(film.u_packing_error[i])
            if np.isfinite(error) and error < 1.0:
                parts.append(f"packing error {_text(100.0 * error, 100.0 * u)} %")
            else:
                parts.append("packing error not below 100 %")
        if film.strokes_left is not None:
            parts.append(f"strokes left {film.strokes_left[i]:.0f}")
        if curve.trough_area is not None:
            parts.append(f"trough area {curve.trough_area[i]:.1f} cm²")
        said.append("\n".join(parts))
    return tuple(said)


def _text(value: float, u: float | None) -> str:
    return format_quantity(Quantity(value, u, "1"))


def strokes_picture(payload: dict[str, Any]) -> Picture | None:
    """Draw the ratio of every stroke with U = 2u, between the limits; None without strokes."""
    strokes = [s for s in payload.get("strokes") or [] if s.get("ratio")]
    if not strokes:
        return None
    from matplotlib.figure import Figure
    from matplotlib.ticker import MaxNLocator

    from isotherm.figures_style import ACCENT, BAND_SHADED, INK, style

    with style():
        figure = Figure(figsize=FLAT_PAPER)
        axes = figure.add_axes((0.14, 0.16, 0.83, 0.7))
        limits = payload.get("limits")
        if limits and None not in limits:
            axes.axhspan(*limits, facecolor=BAND_SHADED, edgecolor="none", zorder=0)
        series = []
        for way, colour, marker, face in (("down", INK, "v", INK), ("up", ACCENT, "^", "white")):
            own = [s for s in strokes if s["direction"] == way]
            if not own:
                continue
            x = np.array([float(s["number"]) for s in own])
            y = np.array([float(s["ratio"]["value"]) for s in own])
            u = np.array([2.0 * float(s["ratio"]["u"] or 0.0) for s in own])
            axes.errorbar(
                x, y, yerr=u, fmt=marker, color=colour, markersize=4.5, elinewidth=1.0,
                markerfacecolor=face, label=f"{way}-strokes",
            )  # fmt: skip
            said = tuple(_stroke_text(s) for s in own)
            series.append((f"{way}-stroke", x, y, said))
        axes.set_xlabel("stroke")
        axes.set_ylabel("transfer ratio")
        axes.xaxis.set_major_locator(MaxNLocator(integer=True))
        axes.legend(
            loc="lower left", bbox_to_anchor=(-0.02, 1.0), ncols=2, frameon=False, fontsize=8.5
        )
        placed = [Series(n, *place(axes, x, y), said) for n, x, y, said in series]
        return picture_of(
            figure,
            "Transfer ratio of every stroke; bars are U = 2u, the band is what the sheet accepts.",
            series=placed,
            narrow=True,
        )


def _stroke_text(stroke: dict[str, Any]) -> str:
    ratio = stroke["ratio"]
    text = f"{stroke['number']}, ratio {_text(float(ratio['value']), ratio['u'])}"
    flags = "; ".join(stroke.get("flags") or [])
    return f"{text}; {flags}" if flags else text


def limits_picture(payload: dict[str, Any]) -> Picture | None:
    """Draw the pressures each rule allows, the window and the recommendation; None without limits."""
    limits = [rule for rule in payload.get("limits") or [] if isinstance(rule, dict)]
    if not limits:
        return None
    from matplotlib.figure import Figure

    from isotherm.figures_style import ACCENT, BAND_SHADED, INK, plain, style

    known = [
        end for rule in limits for pair in rule["intervals"] for end in pair if end is not None
    ]
    with style():
        figure = Figure(figsize=(PAPER[0], 1.0 + 0.3 * len(limits)))
        edge = 0.45 / (1.0 + 0.3 * len(limits))
        axes = figure.add_axes((0.36, edge, 0.61, 0.95 - edge))
        axes.set_xlim(min([0.0, *known]) - 1.0, max([1.0, *known]) + 1.0)
        low, high = axes.get_xlim()
        said, places = [], []
        for row, rule in enumerate(limits):
            for start, stop in rule["intervals"]:
                start, stop = (low if start is None else start, high if stop is None else stop)
                axes.plot(
                    [start, stop], [row, row], linewidth=7, solid_capstyle="butt",
                    color=ACCENT if rule["binding"] else INK,
                )  # fmt: skip
                places.append((0.5 * (start + stop), row))
                said.append(f"{rule['label']}: {start:.1f} to {stop:.1f} mN/m\n{rule['reason']}")
        window, best = payload.get("window"), payload.get("recommended")
        if window:
            ends = [
                low if window[0] is None else window[0],
                high if window[1] is None else window[1],
            ]
            axes.axvspan(*ends, facecolor=BAND_SHADED, zorder=0)
        if best:
            axes.axvline(best["value"], color=ACCENT, linewidth=1.2, linestyle=(0, (5, 2)))
        axes.set_ylim(len(limits) - 0.5, -0.5)
        axes.set_yticks(range(len(limits)), [plain(str(rule["label"])) for rule in limits])
        axes.set_xlabel("surface pressure Π (mN/m)")
        x, y = place(axes, *np.array(places, dtype=np.float64).reshape(-1, 2).T)
        return picture_of(
            figure,
            "Pressures each rule allows (those that bind in the second colour), the window all of them "
            "leave, and the recommended pressure (dashed).",
            series=[Series("", x, y, tuple(said))] if said else [],
            narrow=True,
        )


def evidence_picture(payload: dict[str, Any]) -> Picture | None:
    """Draw every kind of evidence against layers, with the line it should follow; None without any."""
    kinds = [kind for kind in payload.get("evidence") or [] if len(kind.get("points") or []) > 1]
    if not kinds:
        return None
    from matplotlib.figure import Figure

    from isotherm.figures_style import ACCENT, INK, SECOND, plain, style

    with style():
        figure = Figure(figsize=(PAPER[0], 2.3 * len(kinds)))
        panels = np.atleast_1d(figure.subplots(len(kinds), 1, squeeze=True))
        figure.subplots_adjust(0.17, 0.5 / (2.3 * len(kinds)), 0.97, 0.97, hspace=0.35)
        series = []
        for axes, kind in zip(panels, kinds, strict=True):
            points = [p for p in kind["points"] if None not in (p["layers"], p["value"])]
            x = np.array([float(p["layers"]) for p in points])
            y = np.array([float(p["value"]) for p in points])
            bars = np.array([2.0 * float(p["u"] or 0.0) for p in points])
            for slope, colour, dash in (
                (kind.get("increment_per_layer"), INK, "-"),
                (kind.get("expected_per_layer"), SECOND, (0, (5, 2))),
            ):
                foot = kind.get("intercept")
                if slope and foot and None not in (slope["value"], foot["value"]):
                    ends = np.array([0.0, float(x.max())])
                    line = foot["value"] + slope["value"] * ends
                    axes.plot(ends, line, color=colour, linestyle=dash, linewidth=1.1)
            axes.errorbar(
                x, y, yerr=bars, fmt="o", color=ACCENT, markersize=4.5, elinewidth=1.0,
                markerfacecolor="white",
            )  # fmt: skip
            unit = unit_text(points[0]["unit"]) if points else ""
            name = str(kind.get("label") or kind["kind"])
            axes.set_ylabel(plain(f"{name[:26]} ({unit})" if unit else name[:26]))
            said = tuple(
                f"{p['layers']:.4g} layers: {_text(float(p['value']), p['u'])} {unit}".strip()
                for p in points
            )
            series.append((name, axes, x, y, said))
        panels[-1].set_xlabel("layers by the transfer ratios")
        placed = [Series(n, *place(axes, x, y), said) for n, axes, x, y, said in series]
        return picture_of(
            figure,
            "What was measured against the layers that the ratios add up to; full line fitted, dashed line "
            "what the sheet lets one expect, bars U = 2u.",
            series=placed,
            narrow=True,
        )


def result_pictures(payload: dict[str, Any]) -> tuple[Picture, ...]:
    """Draw what a result's JSON form alone allows."""
    drawn = (
        strokes_picture(payload),
        limits_picture(payload) if "binding" in payload else None,
        evidence_picture(payload),
    )
    return tuple(picture for picture in drawn if picture is not None)
