"""Second generator of dipping logs: a step-by-step machine, written apart from the first.

Differs on purpose: the state is the film's amount and a barrier that moves in whole quanta; pressure is
linear in surface density; the controller is a dead-band one that acts late on a sluggish probe; the waterline
lets go of film with a lag; the motor has a ramp; the operator works through a list of operations.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from transfer_builds import Build, decidable_type, draw_body, draw_build
from transfer_truth import Body, SimulatedLog, StrokeTruth, Truth, make_sheet

from isotherm.sheet import RunSheet

__all__ = ["simulate_events"]


@dataclass
class _Machine:
    """Trough, probe, dipper and what has been recorded. Areas cm^2, pressures mN/m, lengths mm, s."""

    body: Body
    target: float
    modulus: float
    step: float
    lag: float  # s, of the film leaving the waterline
    probe_lag: float  # s
    band: float  # mN/m, half width of the dead band
    delay: float  # s, between two looks of the controller
    quantum: float  # cm^2, one barrier step
    speed: float  # cm^2/s, of the barriers
    creep: float
    creep_decay: float
    depth: float
    area: float
    amount: float
    taking: float = 0.0
    ripple: float = 0.0
    clock: float = 0.0
    pending: float = 0.0
    probe: float = 0.0
    control: bool = True
    wanted: float = 0.0
    shift: float = 0.0
    born: float = 0.0
    next_look: float = 0.0
    creep_sum: float = 0.0
    rows: list[list[float]] = field(default_factory=list)
    taken_total: float = 0.0

    def pressure(self) -> float:
        """Pressure of the film spread on the present area."""
        return max(self.target + self.modulus * (self.amount / self.area - 1.0), 0.0)

    def tick(self, depth: float) -> None:
        """One step of the clock with the substrate moved to `depth`."""
        crossed = abs(self.body.below(depth) - self.body.below(self.depth))
        self.depth = depth
        take = self.taking * (1.0 + self.ripple * math.sin(depth / 3.0)) * crossed
        self.taken_total += take
        self.pending += take
        leaving = self.pending * (1.0 - math.exp(-self.step / self.lag))
        self.pending -= leaving
        age = self.clock - self.born
        rate = self.creep * (0.2 + 0.8 / (1.0 + age / self.creep_decay))
        self.creep_sum += rate * self.step
        self.amount = self.amount * (1.0 - rate * self.step) - leaving
        self.probe += (self.pressure() - self.probe) * min(self.step / self.probe_lag, 1.0)
        self.clock += self.step
        if self.control:
            self._look()
        gap = self.wanted - self.area
        most = self.speed * self.step
        self.area += math.copysign(min(abs(gap), most), gap)
        self.rows.append([self.clock, self.depth, self.area, self.probe])

    def _look(self) -> None:
        if self.clock < self.next_look:
            return
        self.next_look = self.clock + self.delay
        off = self.probe - self.target - self.shift
        if abs(off) > self.band:
            move = 0.6 * off * self.area / self.modulus
            self.wanted = self.area + round(move / self.quantum) * self.quantum

    def wait(self, seconds: float) -> None:
        """Stay."""
        for _ in range(max(round(seconds / self.step), 1)):
            self.tick(self.depth)

    def go(self, depth: float, speed: float) -> None:
        """Move with a ramp of half a second at either end."""
        v, ramp = 0.0, speed / 0.5
        while abs(depth - self.depth) > 1e-9:
            left = abs(depth - self.depth)
            v = min(v + ramp * self.step, speed, math.sqrt(2.0 * ramp * left) + 1e-3)
            self.tick(self.depth + math.copysign(min(v * self.step, left), depth - self.depth))

    def renew(self, amount: float, widest: float, rest: float) -> tuple[float, float]:
        """Open, clean, spread `amount`, compress to the set pressure; return the interval in s."""
        begin, usual = self.clock, self.speed
        self.control, self.wanted, self.speed = False, widest, 8.0
        while self.area < widest - 1e-6:
            self.tick(self.depth)
        self.amount = 0.0
        self.wait(rest)
        self.amount, self.born = amount, self.clock
        self.wait(rest)
        self.speed, self.wanted = usual * 0.6, 50.0
        while self.probe < self.target - 2.0 * self.band:
            self.tick(self.depth)
        self.wanted, self.control, self.speed = self.area, True, usual
        return begin, self.clock


@dataclass
class _Notes:
    """What the operator did, as truth."""

    strokes: list[StrokeTruth] = field(default_factory=list)
    renewals: list[tuple[float, float]] = field(default_factory=list)
    traits: set[str] = field(default_factory=set)


def _depths(rng: np.random.Generator, build: Build) -> tuple[list[float], bool]:
    low = float(rng.uniform(15.0, 50.0))
    crosses = bool(rng.random() < 0.85)
    high = -float(rng.uniform(0.8, 10.0)) if crosses else float(rng.uniform(1.5, 6.0))
    ends = (high, low) if build.first == "down" else (low, high)
    return [ends[i % 2] for i in range(len(build.ratios) + 1)], crosses


def _one_stroke(
    rng: np.random.Generator, m: _Machine, target: float, speed: float, paused: bool
) -> StrokeTruth:
    begin, here, taken = m.clock, m.depth, m.taken_total
    first_row = len(m.rows)
    if paused:
        m.go(here + (target - here) * float(rng.uniform(0.25, 0.8)), speed)
        m.wait(float(rng.uniform(5.0, 45.0)))
    m.go(target, speed)
    wet = [r[0] for r in m.rows[first_row:] if r[1] > 0.0]
    coated = abs(m.body.below(target) - m.body.below(here))
    ratio = (m.taken_total - taken) / coated
    direction = "down" if target > here else "up"
    return StrokeTruth(begin, m.clock, wet[0], wet[-1], direction, coated, ratio)


def _run(rng: np.random.Generator, m: _Machine, build: Build, depths: list[float]) -> _Notes:
    notes = _Notes()
    speed = float(np.exp(rng.uniform(np.log(4.0), np.log(40.0)))) / 60.0
    dwell = float(np.exp(rng.uniform(np.log(60.0), np.log(600.0))))
    pausing, roaming, shifting = rng.random(3) < (0.25, 0.15, 0.12)
    m.wait(max(dwell, 60.0))
    for index, target in enumerate(depths[1:]):
        need = abs(m.body.below(target) - m.body.below(m.depth))
        if m.amount - need < 140.0:
            fresh = float(rng.uniform(380.0, 800.0))
            notes.renewals.append(m.renew(fresh, fresh * 1.5 + 50.0, float(rng.uniform(60, 300))))
            notes.traits.add("renewal")
            m.wait(max(dwell, 100.0))
        m.taking = float(build.ratios[index])
        paused = bool(pausing and rng.random() < 0.5)
        notes.strokes.append(_one_stroke(rng, m, target, speed, paused))
        notes.traits |= {"pauses"} if paused else set()
        m.taking = 0.0
        m.wait(dwell * float(rng.uniform(0.8, 1.2)) + 4.0 * m.lag)
        if roaming and m.depth < -0.5 and rng.random() < 0.6:
            home = m.depth
            m.go(home - float(rng.uniform(2.0, 8.0)), speed)
            m.wait(20.0)
            m.go(home, speed)
            m.wait(max(dwell / 2.0, 40.0))
            notes.traits.add("out-of-water moves")
        if shifting and rng.random() < 0.3 and index < len(depths) - 2:
            m.shift = float(rng.choice([-2.0, -1.0, 1.0, 2.0]))
            m.wait(float(rng.uniform(60.0, 300.0)))
            m.shift = 0.0
            m.wait(dwell + 60.0)
            notes.traits.add("set-point")
    return notes


def simulate_events(seed: int) -> tuple[SimulatedLog, RunSheet, Truth]:
    """Simulate one dipping log of the family "events"; see `transfer_simulator.simulate`."""
    rng = np.random.default_rng([seed, 77])
    body, build = draw_body(rng), draw_build(rng)
    depths, crosses = _depths(rng, build)
    rate = float(np.round(np.exp(rng.uniform(np.log(0.5), np.log(5.0))), 1))
    step = 1.0 / rate / math.ceil(1.0 / rate / 0.4)
    modulus = float(np.exp(rng.uniform(np.log(70.0), np.log(500.0))))
    target = round(float(rng.uniform(15.0, 40.0)), 1)
    area = float(rng.uniform(350.0, 800.0))
    machine = _Machine(
        body, target, modulus, step,
        lag=float(rng.uniform(0.2, 2.0)), probe_lag=float(rng.uniform(0.3, 1.5)),
        band=float(rng.uniform(0.02, 0.1)), delay=float(rng.uniform(0.5, 3.0)),
        quantum=float(rng.choice([0.005, 0.01, 0.03])), speed=float(rng.uniform(0.5, 3.0)),
        creep=float(rng.uniform(0.0, 2e-5)), creep_decay=float(rng.uniform(600.0, 20000.0)),
        depth=depths[0], area=area, amount=area, probe=target, wanted=area,
        ripple=float(rng.choice([0.0, 0.0, 0.1])),
    )  # fmt: skip
    notes = _run(rng, machine, build, depths)
    fine = np.array(machine.rows)
    picked = fine[:: round(1.0 / rate / step)]
    n = picked.shape[0]
    time = picked[:, 0].copy()
    if rng.random() < 0.5:
        time = np.round(time + rng.uniform(0.0, 0.3 / rate, n), 2)
    contact = round(float(rng.uniform(0.0, 60.0)), 2)
    reads = "height" if rng.random() < 0.5 else "depth"
    where = contact + picked[:, 1] if reads == "depth" else contact - picked[:, 1]
    grid = float(rng.choice([0.002, 0.01, 0.02, 0.1]))
    area_grid = float(rng.choice([0.0, 0.01, 0.03]))
    seen_area = picked[:, 2] + 0.012 * rng.standard_normal(n)
    log = SimulatedLog(
        time,
        np.floor(where / grid) * grid + grid / 2.0 if grid else where,
        np.round(seen_area / area_grid) * area_grid if area_grid else seen_area,
        picked[:, 3] + float(rng.uniform(0.003, 0.02)) * rng.standard_normal(n),
    )
    findable = any(
        min(depths[i], depths[i + 1]) < -0.5 and s.ratio > 0.3 for i, s in enumerate(notes.strokes)
    )
    given = not crosses or not findable or rng.random() < 0.6
    exact = bool(rng.random() < 0.75)
    told = modulus * float(np.exp(0.03 * rng.standard_normal())) if rng.random() < 0.5 else None
    sheet = make_sheet(
        rng, body, pressure=target, modulus=told, modulus_u=None if told is None else 0.03 * told,
        reads=reads, contact=contact if given else None, exact=exact, wetting=None,
        smallest_area=100.0,
    )  # fmt: skip
    truth = Truth(
        seed, "events", tuple(notes.strokes),
        decidable_type(build, [True] * len(notes.strokes), [s.ratio for s in notes.strokes]),
        tuple(notes.renewals), contact,
        modulus, machine.creep_sum / machine.clock, build.drop_after, build.steady, exact, given,
        tuple(sorted(notes.traits | {build.kind})),
    )  # fmt: skip
    return log, sheet, truth
