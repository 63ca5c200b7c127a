"""First generator of dipping logs: vectorised physics of a film under a pressure controller.

Film left on the trough is an area at the set pressure, A_eq; it falls by transfer (TR times what crosses the
surface) and by creep. Pressure follows from the film's modulus M: pressure = set + M ln(A_eq / A). The
barriers either hold the pressure up to a slow wander (family "tracking") or are moved by a
proportional-integral controller (family "controller", a linear second-order loop). The families "events"
come from the second generator, which shares no physics with this one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import uniform_filter1d
from scipy.signal import lfilter, lfilter_zi
from transfer_builds import decidable_type, draw_body, draw_build
from transfer_plan import Move, Plan, make_plan
from transfer_truth import (
    Body,
    SimulatedLog,
    StrokeTruth,
    Truth,
    make_sheet,
)

from isotherm.sheet import RunSheet

__all__ = ["FAMILIES", "simulate"]

FloatArray = NDArray[np.float64]
FAMILIES = ("tracking", "controller", "events")
AREA_NOISE = 0.012  # cm^2, standard deviation of one reading of the trough area
FINE_STEP = 0.5  # s, longest step of the physics
MOST_ROWS = 80_000  # rows of a log; a longer run is sampled more slowly


@dataclass(frozen=True)
class _Film:
    """State on the fine grid: log of A_eq, true ratio of each stroke, creep rate 1/s."""

    log_area: FloatArray
    ratios: dict[int, float]
    rate: FloatArray


def _rate_of_logging(rng: np.random.Generator) -> float:
    share = rng.random()
    if share < 0.08:
        return 0.1
    if share < 0.16:
        return float(rng.choice([10.0, 20.0]))
    return float(np.round(np.exp(rng.uniform(np.log(0.5), np.log(5.0))), 2))


def _taken(
    rng: np.random.Generator,
    t: FloatArray,
    depth: FloatArray,
    plan: Plan,
    body: Body,
    ratios: FloatArray,
    uneven: bool,
) -> tuple[FloatArray, dict[int, float]]:
    """Film taken per fine step (cm^2 at the set pressure), and the true TR of each stroke."""
    covered = body.perimeter / 100.0 * np.clip(depth, 0.0, None)
    covered += body.face * np.clip(depth / 0.05, 0.0, 1.0)
    crossed = np.abs(np.diff(covered, prepend=covered[0]))
    taken = np.zeros_like(t)
    true: dict[int, float] = {}
    kind = str(rng.choice(["ramp", "late"])) if uneven else "even"
    for move in plan.moves:
        span = slice(*np.searchsorted(t, [move.start - 2.0, move.end + 2.0]))
        weight = np.ones(span.stop - span.start)
        if kind == "ramp":
            weight = 1.0 + 0.2 * (depth[span] - depth[span].mean()) / 20.0
        elif kind == "late":  # nothing is taken in the first few millimetres of travel
            weight = (np.abs(depth[span] - max(move.begin_depth, 0.0)) > 2.5).astype(float)
        taken[span] = (0.9 if move.decoy else ratios[move.index]) * weight * crossed[span]
        total = crossed[span].sum()
        if move.decoy:
            continue
        true[move.index] = float(taken[span].sum() / total) if total > 0 else 0.0
    return taken, true


def _film(
    rng: np.random.Generator, t: FloatArray, plan: Plan, taken: FloatArray, true: dict[int, float]
) -> _Film:
    rate = np.zeros_like(t)
    level = float(rng.uniform(0.0, 2e-5)) if rng.random() > 0.1 else 0.0
    decay = float(rng.uniform(1200.0, 10000.0)) if rng.random() < 0.35 else np.inf
    log_area = np.zeros_like(t)
    starts = [0.0] + [f.compress for f in plan.films if f.opened is not None and f.opened > 0.0]
    films = plan.films if plan.films[0].ready == 0.0 or len(plan.films) == len(starts) else []
    bounds = [int(np.searchsorted(t, s)) for s in starts] + [t.size]
    for film, lo, hi in zip(films, bounds[:-1], bounds[1:], strict=True):
        own = t[lo:hi]
        rate[lo:hi] = level * (0.3 + 0.7 * np.exp(-np.clip(own - film.ready, 0.0, None) / decay))
        lost = np.cumsum(rate[lo:hi] * np.gradient(own)) if hi - lo > 1 else np.zeros(hi - lo)
        lost -= lost[np.searchsorted(own, min(film.ready, own[-1]))]
        gone = np.cumsum(taken[lo:hi] * np.exp(lost))
        log_area[lo:hi] = np.log(np.maximum(film.area - gone, 20.0)) - lost
    return _Film(log_area, true, rate)


def _wander(rng: np.random.Generator, n: int, step: float, sd: float, memory: float) -> FloatArray:
    keep = np.exp(-step / memory)
    kicks = sd * np.sqrt(1.0 - keep**2) * rng.standard_normal(n)
    out: FloatArray = lfilter([1.0], [1.0, -keep], kicks, zi=[keep * sd * rng.standard_normal()])[0]
    return out


def _loop(rng: np.random.Generator, wanted: FloatArray, step: float) -> FloatArray:
    """Answer of a proportional-integral pressure loop: second order with a zero (bilinear transform)."""
    omega = 1.0 / float(rng.uniform(2.0, 12.0))
    damping = float(rng.uniform(0.6, 1.2))
    k = 2.0 / step
    a = np.array(
        [
            k * k + 2 * damping * omega * k + omega**2,
            2 * omega**2 - 2 * k * k,
            k * k - 2 * damping * omega * k + omega**2,
        ]
    )
    b = np.array(
        [2 * damping * omega * k + omega**2, 2 * omega**2, -2 * damping * omega * k + omega**2]
    )
    b, a = b / a[0], a / a[0]
    out: FloatArray = lfilter(b, a, wanted, zi=lfilter_zi(b, a) * wanted[0])[0]
    return out


def _barriers(
    rng: np.random.Generator, t: FloatArray, plan: Plan, film: _Film, modulus: float, family: str
) -> FloatArray:
    """Log of the trough area on the fine grid, controller, windows and renewals included."""
    step = float(t[1] - t[0])
    sd = float(rng.uniform(0.02, 0.1)) if family == "tracking" else float(rng.uniform(0.0, 0.03))
    shift = _wander(rng, t.size, step, sd, float(rng.uniform(20.0, 300.0)))
    for window in plan.windows:
        if window.kind == "set-point":
            ramp = [window.start, window.start + 20.0, window.end, window.end + 20.0]
            shift += np.interp(t, ramp, [0.0, window.shift, window.shift, 0.0])
    wanted = film.log_area - shift / modulus
    log_area = wanted.copy()
    largest = np.log(max(f.area for f in plan.films) * float(rng.uniform(1.25, 1.7)))
    starts = [int(np.searchsorted(t, f.ready)) for f in plan.films]
    for film_plan, lo, hi in zip(plan.films, starts, [*starts[1:], t.size], strict=True):
        if family == "controller" and hi - lo > 1:
            log_area[lo:hi] = _loop(rng, wanted[lo:hi], step)
        late = film_plan.ready + float(rng.uniform(3.0, 20.0))
        offset = float(rng.uniform(-0.3, 0.3)) / modulus if film_plan.opened is not None else 0.0
        log_area[lo:hi] += offset * np.exp(-(t[lo:hi] - film_plan.ready) / (late - film_plan.ready))
    for window in plan.windows:
        if window.kind == "lost":
            lo, hi = np.searchsorted(t, [window.start, window.end])
            log_area[lo:hi] = log_area[lo]
            after = slice(hi, int(np.searchsorted(t, window.end + 100.0)))
            gap = log_area[lo] - log_area[min(hi, t.size - 1)]
            log_area[after] += gap * np.exp(
                -(t[after] - window.end) / float(rng.uniform(5.0, 12.0))
            )
    for film_plan in plan.films:
        if film_plan.opened is None:
            continue
        lo, hi = np.searchsorted(t, [film_plan.opened, film_plan.ready])
        hi = min(int(hi), t.size - 1)
        knots = [film_plan.opened, film_plan.open_end, film_plan.compress, film_plan.ready]
        first = np.exp(largest if film_plan.opened == 0.0 else log_area[lo])
        heights = [first, np.exp(largest), np.exp(largest), np.exp(log_area[hi])]
        log_area[lo:hi] = np.log(np.interp(t[lo:hi], knots, heights))
    return log_area


def _pressure(
    t: FloatArray, plan: Plan, film: _Film, log_area: FloatArray, modulus: float, target: float
) -> FloatArray:
    """True pressure: linear in ln A near the set point, vanishing smoothly when the film is expanded."""
    linear = target + modulus * (film.log_area - log_area)
    out: FloatArray = np.logaddexp(0.0, linear)
    for film_plan in plan.films:
        if film_plan.opened is not None:
            clean = (t >= film_plan.open_end) & (t < film_plan.compress)
            out[clean] = 0.0
    return out


def _sampled(
    rng: np.random.Generator, t: FloatArray, columns: list[FloatArray], rate: float, end: float
) -> list[FloatArray]:
    rows = np.arange(0.0, end, 1.0 / rate)
    if rng.random() < 0.3:
        rows = rows + rng.uniform(0.0, 0.2 / rate, rows.size)
    rows = np.round(rows, 3)
    return [rows, *(np.interp(rows, t, c) for c in columns)]


def _steps(values: FloatArray, step: float) -> FloatArray:
    return np.round(values / step) * step if step else values


def _strokes(
    t: FloatArray, depth: FloatArray, plan: Plan, body: Body, true: dict[int, float], end: float,
    off: FloatArray,
) -> tuple[StrokeTruth, ...]:  # fmt: skip
    """Truth of each stroke begun; `off` is the true pressure less its set value (n,), mN/m."""
    out = []
    for move in plan.moves:
        if move.start >= end or move.decoy:
            continue
        judgeable = move.end <= end and not any(
            w.kind == "lost" and w.start < move.end and w.end > move.start for w in plan.windows
        )
        span = slice(*np.searchsorted(t, [move.start, move.end + 1e-9], side="left"))
        wet = t[span][depth[span] > 0.0]
        coated = abs(body.below(move.end_depth) - body.below(move.begin_depth))
        direction = "down" if move.end_depth > move.begin_depth else "up"
        out.append(
            StrokeTruth(
                move.start,
                min(move.end, end),
                float(wet[0]),
                min(float(wet[-1]), end),
                direction,
                coated,
                true[move.index],
                judgeable,
                not judgeable and (move.end > end or float(np.abs(off[span]).max()) > 1.0),
            )
        )
    return tuple(out)


def _contact_findable(moves: list[Move], ratios: FloatArray) -> bool:
    return any(
        not m.decoy and min(m.begin_depth, m.end_depth) < -0.5 and ratios[m.index] > 0.3
        for m in moves
    )


def simulate(seed: int, family: str) -> tuple[SimulatedLog, RunSheet, Truth]:
    """Simulate one dipping log.

    Parameters
    ----------
    seed : int
    family : str
        One of FAMILIES.

    Returns
    -------
    tuple of SimulatedLog, RunSheet, Truth
        What the instrument recorded, what the user wrote, what happened.
    """
    if family == "events":
        from transfer_simulator_events import simulate_events

        return simulate_events(seed)
    rng = np.random.default_rng([seed, FAMILIES.index(family)])
    body, build, rate = draw_body(rng), draw_build(rng), _rate_of_logging(rng)
    plan = make_plan(rng, build, body, rate)
    rate = min(rate, MOST_ROWS / plan.end)
    step = (1.0 / rate) / int(np.ceil(1.0 / rate / FINE_STEP))
    t = np.arange(0.0, max(plan.end, plan.now) + step, step)
    depth = np.interp(t, plan.times, plan.depths)
    depth = uniform_filter1d(depth, max(int(rng.uniform(0.3, 1.5) / step), 1), mode="nearest")
    uneven = rng.random() < 0.12
    taken, true = _taken(rng, t, depth, plan, body, build.ratios, uneven)
    film = _film(rng, t, plan, taken, true)
    modulus = float(np.exp(rng.uniform(np.log(90.0), np.log(600.0))))
    if rng.random() < 0.12:
        modulus /= 2.0
    target = round(float(rng.uniform(15.0, 40.0)), 1)
    log_area = _barriers(rng, t, plan, film, modulus, family)
    pressure = _pressure(t, plan, film, log_area, modulus, target)
    contact = round(float(rng.uniform(-5.0, 40.0)), 2)
    reads = "depth" if rng.random() < 0.6 else "height"
    columns = [depth, np.exp(log_area), pressure]
    rows, depth_read, area, pressure_read = _sampled(rng, t, columns, rate, plan.end)
    position = contact + depth_read if reads == "depth" else contact - depth_read
    position += float(rng.choice([0.0, 0.005, 0.02])) * rng.standard_normal(rows.size)
    area = area + AREA_NOISE * rng.standard_normal(rows.size)
    pressure_read += float(rng.uniform(0.003, 0.02)) * rng.standard_normal(rows.size)
    strokes = _strokes(t, depth, plan, body, true, plan.end, pressure - target)
    own_contact = uneven or not plan.crosses or rng.random() < 0.65
    contact_given = own_contact or not _contact_findable(
        [m for m in plan.moves if m.start < plan.end], build.ratios
    )
    exact = rng.random() < 0.75
    told = float(np.exp(0.03 * rng.standard_normal())) * modulus if rng.random() < 0.5 else None
    wetting = True if build.kind == "wetting" and rng.random() < 0.5 else None
    sheet = make_sheet(
        rng,
        body,
        pressure=target,
        modulus=told,
        modulus_u=None if told is None else 0.03 * told,
        reads=reads,
        contact=contact if contact_given else None,
        exact=exact,
        wetting=wetting,
        smallest_area=100.0,
    )
    log = SimulatedLog(
        rows,
        _steps(position, float(rng.choice([0.0, 0.001, 0.01, 0.05]))),
        _steps(area, float(rng.choice([0.0, 0.01, 0.02, 0.05]))),
        _steps(pressure_read, float(rng.choice([0.0, 0.01, 0.01]))),
    )
    traits = {build.kind, *plan.traits} | ({"uneven"} if uneven else set())
    ready = plan.films[0].ready
    renewals = tuple((f.opened, f.ready) for f in plan.films if f.opened and f.opened < plan.end)
    usable = [s.judgeable for s in strokes]
    seen = t < plan.end
    truth = Truth(
        seed,
        family,
        strokes,
        decidable_type(build, usable, [s.ratio for s in strokes]),
        renewals,
        contact,
        modulus,
        float(film.rate[seen].mean()),
        build.drop_after,
        build.steady,
        exact,
        contact_given,
        tuple(sorted(traits)),
        ready,
    )
    return log, sheet, truth
