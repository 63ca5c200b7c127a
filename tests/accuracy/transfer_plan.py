"""Plan one dipping run for the first generator: when the dipper moves, when something else happens."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from transfer_builds import Build
from transfer_truth import Body

__all__ = ["Film", "Move", "Plan", "Window", "make_plan"]

SHORTEST = 6.0  # mm of wet travel, of a partial stroke


@dataclass
class Move:
    """A stroke: times in s, immersion depths in mm, position in the build (from 0).

    decoy: passes through the film while its set point is changed, so it takes film and is no stroke.
    """

    start: float
    end: float
    begin_depth: float
    end_depth: float
    index: int
    decoy: bool = False


@dataclass
class Window:
    """Pressure is not at its set point: kind "set-point" (by `shift` mN/m) or "lost" (barriers stop)."""

    kind: str
    start: float
    end: float
    shift: float = 0.0


@dataclass
class Film:
    """One spread film. Barriers open at `opened` (None: film there when the log starts), it is ready at
    `ready` with `area` cm^2; scripted in between: open until `open_end`, compress from `compress`."""

    ready: float
    area: float
    opened: float | None = None
    open_end: float = 0.0
    compress: float = 0.0


@dataclass
class Plan:
    """Knots of immersion depth against time (s, mm), strokes, windows, films, what makes the log special."""

    times: list[float] = field(default_factory=list)
    depths: list[float] = field(default_factory=list)
    moves: list[Move] = field(default_factory=list)
    windows: list[Window] = field(default_factory=list)
    films: list[Film] = field(default_factory=list)
    traits: set[str] = field(default_factory=set)
    crosses: bool = True
    end: float = 0.0

    def go(self, seconds: float, depth: float) -> None:
        """Move to `depth` in `seconds`."""
        self.times.append(self.times[-1] + seconds)
        self.depths.append(depth)

    def wait(self, seconds: float) -> None:
        """Stay."""
        self.go(seconds, self.depths[-1])

    @property
    def now(self) -> float:
        """Time reached, s."""
        return self.times[-1]


def _dwell(rng: np.random.Generator, plan: Plan, base: float, scarce: bool) -> None:
    seconds = base * float(rng.uniform(0.85, 1.15))
    if scarce and rng.random() < 0.25:
        seconds = float(rng.uniform(4.0, 25.0))
    outside = plan.depths[-1] < -2.0
    if "out-of-water moves" in plan.traits and outside and rng.random() < 0.5 and plan.moves:
        away = plan.depths[-1] - float(rng.uniform(2.0, 8.0))
        here = plan.depths[-1]
        plan.wait(seconds / 2)
        plan.go(abs(away - here) / float(rng.uniform(0.1, 0.6)), away)
        plan.wait(float(rng.uniform(5.0, 60.0)))
        plan.go(abs(away - here) / float(rng.uniform(0.1, 0.6)), here)
        plan.wait(max(seconds / 2, 30.0))
    else:
        plan.wait(seconds)


def _pass_meanwhile(rng: np.random.Generator, plan: Plan) -> None:
    """Change the set point, go to the other end of the stroke and back, change it back, settle."""
    begun, last = plan.now, plan.moves[-1]
    for target in (last.begin_depth, last.end_depth):
        plan.wait(40.0)
        start, here = plan.now, plan.depths[-1]
        plan.go(abs(target - here) / 0.4, target)
        plan.moves.append(Move(start, plan.now, here, target, last.index, decoy=True))
    plan.wait(40.0)
    shift = float(rng.choice([-1.0, 1.0]) * rng.uniform(1.5, 4.0))
    plan.windows.append(Window("set-point", begun, plan.now, shift))
    plan.wait(float(rng.uniform(150.0, 300.0)))
    plan.traits.add("pass while set-point changed")


def _disturb(rng: np.random.Generator, plan: Plan) -> None:
    """Lengthen the dwell by a window in which pressure is not held."""
    kinds = [k for k in ("set-point", "lost") if k in plan.traits]
    if not kinds or rng.random() > 0.35:
        return
    kind = str(rng.choice(kinds))
    plan.wait(60.0)
    if kind == "set-point" and rng.random() < 0.3:
        _pass_meanwhile(rng, plan)
        return
    length = float(rng.uniform(60.0, 400.0))
    shift = float(rng.choice([-1.0, 1.0]) * rng.uniform(0.8, 4.0)) if kind == "set-point" else 0.0
    plan.windows.append(Window(kind, plan.now, plan.now + length, shift))
    plan.wait(length + float(rng.uniform(100.0, 240.0)))


def _renew(rng: np.random.Generator, plan: Plan, area: float, base: float) -> None:
    plan.wait(40.0)  # nobody opens the barriers before the stroke has settled
    opened = plan.now
    opening = float(rng.uniform(20.0, 90.0))
    plan.wait(opening)
    if rng.random() < 0.3:
        plan.traits.add("moved in renewal")
        here, away = plan.depths[-1], plan.depths[-1] - float(rng.uniform(4.0, 15.0))
        plan.go(abs(away - here) / 0.5, away)
        plan.wait(float(rng.uniform(100.0, 500.0)))
        plan.go(abs(away - here) / 0.5, here)
    plan.wait(float(rng.uniform(120.0, 600.0)))
    compress = plan.now
    plan.wait(float(rng.uniform(240.0, 900.0)))
    plan.films.append(Film(plan.now, area, opened, opened + opening, compress))
    plan.wait(max(base, 90.0))
    plan.traits.add("renewal")


def _turns(rng: np.random.Generator, build: Build, plan: Plan) -> list[float]:
    """Immersion depths (mm) between which the strokes go, start first."""
    bottom = float(rng.uniform(18.0, 55.0))
    if rng.random() < 0.2:
        plan.crosses = False
        top = float(rng.uniform(2.0, 8.0))
    else:
        top = -float(rng.uniform(1.0, 15.0))
    turns = []
    for i in range(len(build.ratios) + 1):
        at_top = (i % 2 == 0) == (build.first == "down")
        turns.append(top if at_top else bottom)
        if 0 < i < len(build.ratios) and "partial" in plan.traits and rng.random() < 0.3:
            inner = max(top, 0.0)
            turn = inner + (bottom - inner) * float(rng.uniform(0.35, 0.8))
            travel = turns[-2] - turn if at_top else turn - turns[-2]
            if travel > SHORTEST:  # strokes alternate: a stop on the way is a pause, not a turn
                turns[-1] = turn
    if not plan.crosses and build.first == "down" and rng.random() < 0.7:
        turns[0] = -float(rng.uniform(1.0, 10.0))
    return turns


def _stroke(rng: np.random.Generator, plan: Plan, target: float, speed: float, index: int) -> None:
    start, here = plan.now, plan.depths[-1]
    stops = 0
    if "pauses" in plan.traits and rng.random() < 0.5:
        stops = int(rng.integers(1, 3))
    for at in sorted(rng.uniform(0.2, 0.85, stops)):
        depth = here + (target - here) * float(at)
        plan.go(abs(depth - plan.depths[-1]) / speed, depth)
        plan.wait(float(rng.uniform(4.0, 40.0)))
    plan.go(abs(target - plan.depths[-1]) / speed, target)
    plan.moves.append(Move(start, plan.now, here, target, index))


def make_plan(rng: np.random.Generator, build: Build, body: Body, rate: float) -> Plan:
    """Draw one run of the build with the body in a trough of 60–120 cm^2 least area, sampled at `rate` Hz."""
    plan = Plan()
    shares = {
        "pauses": 0.2,
        "partial": 0.15,
        "out-of-water moves": 0.15,
        "set-point": 0.1,
        "lost": 0.08,
        "lost in stroke": 0.05,
        "scarce dwells": 0.2,
        "first compression": 0.3,
        "log ends in stroke": 0.1,
    }
    plan.traits = {name for name, share in shares.items() if rng.random() < share}
    slowest = 1.0 if rng.random() < 0.12 else 5.0
    speed = float(np.exp(rng.uniform(np.log(slowest), np.log(40.0)))) / 60.0
    base = float(np.exp(rng.uniform(np.log(60.0), np.log(900.0))))
    if rate < 0.4:  # a user who logs every ten seconds dips and waits accordingly
        speed, base = min(speed, 8.0 / 60.0), max(base, 150.0)
        plan.traits -= {"scarce dwells", "pauses"}
    turns = _turns(rng, build, plan)
    if rng.random() < 0.85:  # who dips slowly usually also waits longer
        base = max(base, 0.25 * (max(turns) - min(turns)) / speed)
    area = float(rng.uniform(350.0, 800.0))
    plan.times, plan.depths = [0.0], [turns[0]]
    if "first compression" in plan.traits:
        plan.wait(float(rng.uniform(30.0, 200.0)))
        compress = plan.now
        plan.wait(float(rng.uniform(240.0, 900.0)))
        plan.films.append(Film(plan.now, area, 0.0, 0.0, compress))
    else:
        plan.films.append(Film(0.0, area))
    plan.wait(max(base, 60.0))
    left = area
    for index, target in enumerate(turns[1:]):
        need = abs(body.below(target) - body.below(plan.depths[-1]))
        if left - need * max(build.ratios[index], 0.0) < 150.0:
            left = float(rng.uniform(400.0, 800.0))
            _renew(rng, plan, left, base)
        if index:
            before = len(plan.moves)
            _disturb(rng, plan)
            left -= need * (len(plan.moves) - before)
        begun = plan.now
        _stroke(rng, plan, target, speed * float(rng.uniform(0.97, 1.03)), index)
        if "lost in stroke" in plan.traits and index == len(turns) // 2 and index:
            plan.windows.append(Window("lost", begun + 0.3 * (plan.now - begun), plan.now + 30.0))
            plan.wait(150.0)
        left -= need * max(float(build.ratios[index]), 0.0) + 1e-5 * left * (
            plan.now - begun + base
        )
        last = index == len(turns) - 2
        _dwell(rng, plan, base, "scarce dwells" in plan.traits and not last)
    plan.wait(30.0)
    plan.end = plan.now
    if "log ends in stroke" in plan.traits and len(build.ratios) > 1:
        last_move = plan.moves[-1]
        plan.end = last_move.start + (last_move.end - last_move.start) * float(
            rng.uniform(0.2, 0.8)
        )
    else:
        plan.traits.discard("log ends in stroke")
    return plan
