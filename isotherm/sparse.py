"""Knees of a branch told by few points, as read off a figure: convex pieces first, meaning second.

With some tens of points a smooth rival of six parameters explains anything, so the evidence used for
dense runs has no power. Here the branch is cut into convex pieces (`sparse_pieces`), and only what the
slopes of these pieces say plainly becomes a knee: the flat start, a dip between two stiffer branches, a
large step up between two branches, a yield at the end. What each knee means is decided here too.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from isotherm.sparse_pieces import Figure, Part

__all__ = ["SparseKnee", "sparse_degrees", "sparse_knees"]

FloatArray = NDArray[np.float64]

FLAT: Final = 0.02  # share of the pressure axis; a start that rises by less is a baseline
FLAT_MODULUS: Final = 8.0  # mN/m; and it is softer than this
FOOT: Final = 0.15  # or than this share of what follows: the rounded foot of a sharp rise
SOFTER: Final = 0.7  # a plateau or a collapse has less than this share of the slope before it
STIFFER: Final = 1.5  # a kink between two branches
SHOULDER: Final = 0.4  # right shoulder of a dip against the left one, moduli
YIELD: Final = 0.4  # softer than this share of the stiffest, and staying so: collapsed
SIGMAS: Final = 2.0
SHORT: Final = 0.012  # share of the axes by which points must leave the extended branch, to be seen
SHORT_SIGMAS: Final = 4.0
LONE: Final = (
    8.0  # a lone point must leave it by so many times what the branch doubles back on itself
)
FALL: Final = 1.0  # mN/m by which a pressure must fall to tell a collapse by itself
REST: Final = (
    0.08  # share of the pressure axis; two points after a plateau rise by more, or are misread
)
EVIDENCE: Final = 10.0  # χ² by which two branches must beat one smooth curve
EXPANDED: Final = 50.0  # mN/m, top of liquid-expanded (customary ranges)
CONDENSED: Final = 80.0  # mN/m; what follows an expanded film above this, in one step, is condensed
ONE_STEP: Final = 3.5  # by this factor; an expanded film alone stiffens less between two points
GASEOUS: Final = 12.5  # mN/m
MOST_HIDING: Final = 30  # points of a piece in which a plateau may hide; more of them would show it


@dataclass(frozen=True)
class SparseKnee:
    """A knee: role is lift-off, onset, end, kink or collapse; x = -ln A; spread: of x, by the points."""

    role: str
    x: float
    spread: float


@dataclass(frozen=True)
class _Curve:
    """Pieces with the figure they lie in."""

    figure: Figure
    parts: list[Part]

    def area(self, u: float) -> float:
        """nm^2 at u."""
        return self.figure.start - u * self.figure.width

    def modulus(self, slope: float, u: float) -> float:
        """Compression modulus, mN/m, of a slope in the figure at u."""
        return slope * self.area(u) * self.figure.height / self.figure.width


def sparse_knees(figure: Figure, parts: list[Part]) -> list[SparseKnee]:
    """Knees of few points, in the order of compression."""
    curve = _Curve(figure, _absorbed(figure, parts))
    parts = curve.parts
    knees: list[SparseKnee] = []
    first = 0
    for k in range(len(parts) - 1):
        if _is_flat(curve, 0, k):
            first = k + 1
    if first:
        knees.append(_knee("lift-off", curve, first - 1, first))
    last = _last_rising(curve, first)
    j = first
    while j < last:
        end, here = _dip_end(curve, j, last), SOFTER * parts[j].end
        if end is not None:
            softest = max(range(j + 1, end), key=lambda k: parts[k].half * (parts[k].chord < here))
            knees.append(_knee("onset", curve, j, j + 1 if end - j == 2 else softest))
            knees.append(_knee("end", curve, softest, end))
            j = end
            continue
        role = _step_up(curve, j)
        if role == "kink":
            knees.append(_knee("kink", curve, j, j + 1))
        elif role == "transition":
            onset = _hidden_onset(curve, j)
            if onset is not None:
                knees.append(onset)
                knees.append(_knee("end", curve, j, j + 1))
            elif min(parts[j].count, parts[j + 1].count) >= 3:
                knees.append(_knee("kink", curve, j, j + 1))
        j += 1
    if last + 1 < len(parts):
        knee = _collapse(curve, last)
        if knee is not None:
            knees.append(knee)
    return knees


def sparse_degrees(knees: list[SparseKnee], x: FloatArray, y: FloatArray) -> tuple[int, ...]:
    """Highest polynomial degree of each stretch: none for a lone point, a line for few points.

    Baselines, plateaus and what follows a collapse at constant pressure are lines as well.
    """
    peak = int(np.argmax(y))
    falls = float(y[peak] - np.min(y[peak:])) > FALL
    edges = np.concatenate([[x[0] - 1.0], [k.x for k in knees], [x[-1] + 1.0]])
    counts = np.diff(np.searchsorted(x, edges))
    out = []
    for j, count in enumerate(counts):
        before = knees[j - 1].role if j else ""
        straight = (
            before == "onset"
            or (before == "collapse" and not falls)
            or (j == 0 and bool(knees) and knees[0].role == "lift-off")
        )
        share = 1 if before == "collapse" else 3  # a collapsing film falls ever less
        highest = 1 if straight else int(np.clip((count - 1) // share, 1, 4))
        lone = before == "collapse" and count < 2 and not falls
        out.append(0 if lone else highest)
    return tuple(out)


def _is_flat(curve: _Curve, first: int, last: int) -> bool:
    """Whether the pieces first to last lie flat, softer by far than the next."""
    a, b = curve.parts[first], curve.parts[last]
    f = curve.figure
    top = float(b.at(np.array(f.u[b.last - 1])))
    rise = top - float(a.at(np.array(f.u[a.first])))
    after = curve.parts[last + 1].chord
    soft = curve.modulus(b.end, f.u[b.last - 1]) < FLAT_MODULUS or b.chord < FOOT * after
    return abs(rise) < FLAT and soft and b.chord < 0.5 * after


def _absorbed(figure: Figure, parts: list[Part]) -> list[Part]:
    """The pieces without short ones that only round a knee or carry one misread point."""
    out = list(parts)
    changed = True
    while changed:
        changed = False
        for k in range(1, len(out) - 1):
            before, here, after = out[k - 1], out[k], out[k + 1]
            low, high = sorted((before.end, after.start))
            between = low <= here.chord <= high
            alike = low > 0 and high < 2.0 * low
            length = float(figure.u[here.last - 1] - figure.u[here.first])
            shelf = length > 0.04 and here.chord < 0.5 * low
            rise = length > 0.02 and length * here.chord > FLAT and here.chord > 2.0 * high
            if here.count <= 2 and (between or (alike and not shelf and not rise)):
                del out[k]
                changed = True
                break
    return out


def _last_rising(curve: _Curve, first: int) -> int:
    last, stiffest = first, 0.0
    for j in range(first, len(curve.parts)):
        part = curve.parts[j]
        stiff = curve.modulus(part.chord, part.centre)
        stiffest = max(stiffest, stiff)
        if stiff > 0 and stiff >= YIELD * stiffest:
            last = j
    return last


def _leaves(curve: _Curve, j: int, stop: int) -> NDArray[np.bool_]:
    """Points of pieces j + 1 to stop that fall short of piece j, extended, plainly; (n,)."""
    f, part = curve.figure, curve.parts[j]
    short, doubt = _shortfall(curve, j)
    inside = np.zeros(f.u.size, dtype=np.bool_)
    inside[part.last : curve.parts[stop].last] = True
    return inside & (short > SHORT) & (short > SHORT_SIGMAS * doubt)


def _shortfall(curve: _Curve, j: int) -> tuple[FloatArray, FloatArray]:
    """Perpendicular distance of every point below the end of piece j, extended straight, and its u."""
    f, part = curve.figure, curve.parts[j]
    end = float(f.u[part.last - 1])
    slope = min(part.end, 2.0 * max(part.chord, 1e-6))
    away = f.u - end
    line = float(part.at(np.array(end))) + slope * away
    size = np.sqrt(1.0 + slope**2)
    error = np.hypot(f.pressure_reading, slope * f.area_reading)
    doubt = np.hypot(error, part.u_slope * np.maximum(away, 0.0))
    return (line - f.v) / size, doubt / size


def _dip_end(curve: _Curve, j: int, last: int) -> int | None:
    """The piece that ends a dip begun after piece j: the first clearly stiffer than dip and shoulder."""
    parts = curve.parts
    here = parts[j]
    softest: Part | None = None
    for k in range(j + 1, last + 1):
        part = parts[k]
        soft = part.chord + SIGMAS * part.u_slope < SOFTER * here.end or part.chord < 0.5 * here.end
        if soft and part.chord < here.chord and part.start < SOFTER * here.end:
            if softest is None or part.chord < softest.chord:
                softest = part
            continue
        if softest is None:
            return None
        stiff = SOFTER * part.chord > softest.chord
        shoulder = curve.modulus(part.chord, part.centre) > SHOULDER * curve.modulus(
            here.chord, here.centre
        )
        tall = part.count > 2 or part.chord * 2.0 * part.half > REST
        if stiff and shoulder and tall and _leaves(curve, j, k - 1).any():
            # roundings have slopes between: the end is where the slope stops doubling
            while k < last and parts[k + 1].chord > 2.0 * parts[k].chord and parts[k].count < 4:
                k += 1
            return k
    return None


def _step_up(curve: _Curve, j: int) -> str:
    """'kink', 'transition' (expanded to condensed in one step) or ''."""
    f = curve.figure
    here, after = curve.parts[j], curve.parts[j + 1]
    at = float(f.u[here.last - 1])
    before, behind = curve.modulus(here.end, at), curve.modulus(after.start, at)
    if before < 0.4 * GASEOUS or f.height * float(f.v[here.last - 1]) < 1.5:
        return ""
    u = SIGMAS * np.hypot(here.u_slope, after.u_slope)
    if after.start < STIFFER * here.end or after.start - here.end < u:
        return ""
    if not _beats_smooth(f, here, after):
        return ""
    if before < EXPANDED and behind > max(CONDENSED, ONE_STEP * before):
        return "transition"
    if before < GASEOUS or min(here.count, after.count) < 3:
        return ""
    return "kink"


def _beats_smooth(figure: Figure, here: Part, after: Part) -> bool:
    """Whether two pieces describe their points better than one polynomial of as many parameters."""
    part = slice(here.first, after.last)
    u, v, s = figure.u[part], figure.v[part], figure.s[part]
    degree = min(here.degree + after.degree + 1, 5, u.size - 1)
    t = (u - u.mean()) / max(float(np.ptp(u)), 1e-12)
    powers = np.vander(t, degree + 1) / s[:, None]
    smooth = v / s - powers @ np.linalg.lstsq(powers, v / s, rcond=None)[0]
    first = np.arange(here.first, after.last) < here.last
    bent = (v - np.where(first, here.at(u), after.at(u))) / s
    return float(smooth @ smooth - bent @ bent) > EVIDENCE


def _hidden_onset(curve: _Curve, j: int) -> SparseKnee | None:
    """Where a coexistence may begin inside piece j: between its middle points, known no better."""
    f, part = curve.figure, curve.parts[j]
    low, high = float(f.u[part.first]), float(f.u[part.last - 1])
    if not 2 <= part.count <= MOST_HIDING or high - low < 0.03:
        return None
    return SparseKnee("onset", _x(curve, 0.5 * (low + high)), 0.5 * _length(curve, low, high))


def _collapse(curve: _Curve, last: int) -> SparseKnee | None:
    f, parts = curve.figure, curve.parts
    part = parts[last]
    beyond = _leaves(curve, last, len(parts) - 1)
    top = float(np.max(f.v[: part.last + 1]))
    fall = f.height * (top - float(np.min(f.v[part.last :])))
    if fall > max(FALL, 5.0 * f.height * f.pressure_reading):
        return _knee("collapse", curve, last, last + 1)
    count = int(beyond.sum())
    if count == 0:
        return None
    if count == 1:
        short, _ = _shortfall(curve, last)
        if float(short[beyond][0]) < LONE * _doubled_back(curve, last):
            return None
        if bool(beyond[-1]):
            return _lone_collapse(curve, last)
    return _knee("collapse", curve, last, last + 1)


def _lone_collapse(curve: _Curve, last: int) -> SparseKnee:
    """The collapse before a lone last point: where the rising piece, extended, reaches its pressure."""
    f, part = curve.figure, curve.parts[last]
    low, high = float(f.u[-2]), float(f.u[-1])
    at = float(f.u[part.last - 1])
    at += (float(f.v[-1]) - float(part.at(np.array(at)))) / max(part.end, 1e-6)
    at = min(max(at, low + 0.02 * (high - low)), low + 0.9 * (high - low))
    return SparseKnee("collapse", _x(curve, at), _length(curve, low, high))


def _doubled_back(curve: _Curve, last: int) -> float:
    """How far the points of the rising pieces up to `last` go back on themselves, share of the axes."""
    parts = curve.parts
    first = last
    steep = min(parts[last].chord, 1.0)
    while first and parts[first - 1].chord > YIELD * steep:
        first -= 1
    # what was absorbed lies between the pieces
    inside = slice(parts[first].first, parts[last + 1].first)
    u, v = curve.figure.u[inside], curve.figure.v[inside]
    fall = v[:, None] - v[None, :]
    later = u[None, :] - u[:, None]
    back = np.triu(np.minimum(fall, later), 1)
    return float(max(back.max(), 0.0))


def _knee(role: str, curve: _Curve, a: int, b: int) -> SparseKnee:
    """Where pieces a and b meet when extended straight, kept between the points that bound it."""
    f, left, right = curve.figure, curve.parts[a], curve.parts[b]
    low, high = float(f.u[left.last - 1]), float(f.u[right.first])
    p, q = float(left.at(np.array(low))), float(right.at(np.array(high)))
    step = left.end - right.start
    at = (q - p + left.end * low - right.start * high) / step if step else 0.5 * (low + high)
    before = float(f.u[max(left.last - 2, 0)])
    after = float(f.u[min(right.first + 1, f.u.size - 1)])
    if not low - 0.5 * (low - before) <= at <= high + 0.5 * (after - high):
        at = 0.5 * (low + high)
    spread = max(
        _length(curve, before, low), _length(curve, low, high), _length(curve, high, after)
    )
    return SparseKnee(role, _x(curve, at), max(spread, 1e-6))


def _x(curve: _Curve, u: float) -> float:
    return -float(np.log(max(curve.area(u), 1e-9)))


def _length(curve: _Curve, low: float, high: float) -> float:
    return abs(_x(curve, high) - _x(curve, low))
