"""Many trajectories of one job, drawn from its packet and followed by F = m a at its recorded times."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields
from itertools import pairwise

import numpy as np

from .classical import first_step
from .endings import Ending
from .newton import Motion, Passages, Trajectories
from .observables.swarm import ClassicalMeter, History, Swarm
from .packets.gaussian import GaussianPacket
from .plan import Plan
from .points import wave_numbers
from .shapes import Breaks, Landscape, Shape, Term
from .timetable import fastest
from .wigner import GROUPS, Start, gaussian, sampled

Array = np.ndarray

SHARE = 0.25  # of the time of the run that trajectories may take, where their number is left out
FEWEST, MOST = 64 * GROUPS, 512 * GROUPS  # where their number is left out; fewer would hardly be quicker
LONGER = 2.0  # steps over those that follow a path to all digits: far more digits than a mean has
NOTHING = 1e-9  # of a weight: what is left in a layer is then absorbed as well
PER_CHANGE = 16  # steps in the shortest time over which a term changes
# Seconds of one step, measured on one core of 2020: only their ratio matters.
POINT, PAIR = 9e-9, 4e-6  # of the wave function: for each point and stage, and beside
STRAIGHT, CURVED, STRIDE = (
    1.4e-7,
    2.5e-7,
    3e-4,
)  # of trajectories: for each without and with force, and beside


@dataclass(frozen=True)
class Followed:
    """What all trajectories did, and what each group of them did; weights of each add up to 1."""

    number: int
    pooled: History
    groups: tuple[History, ...]


def trajectories(plan: Plan) -> int:
    """Their number: as written, else what costs at most a quarter of the run, in whole mirrored groups."""
    keys = plan.job.keys.classical
    if isinstance(keys, str):
        return 0
    wanted = keys.trajectories
    if wanted is None:
        run = plan.steps * plan.splitting.stages * (POINT * plan.axis.points + PAIR)
        motion = _motion(plan, (), None)
        times = np.array([plan.job.evolve.start, plan.job.evolve.until])
        a_row = max(1.0, plan.record * plan.step / _longest(plan, motion, _extremes(plan), times))
        strides = a_row * plan.steps / plan.record
        each = STRAIGHT if motion.straight else CURVED * max(len(plan.job.landscape.terms), 1)
        wanted = round((SHARE * run / strides - STRIDE) / each)
        wanted = min(max(wanted, FEWEST), MOST)
    return math.ceil(wanted / (2 * GROUPS)) * 2 * GROUPS


def drawn(plan: Plan, number: int) -> Start:
    """Where they start. Raises WignerError where the packet cannot be drawn from."""
    keys, packet = plan.job.keys.classical, plan.job.packet
    seed = 1 if isinstance(keys, str) else keys.seed
    if isinstance(packet, GaussianPacket):
        k = packet.mean_wavenumber(plan.job.particle.mass)
        return gaussian(packet.at, packet.sigma, k, number, seed)
    return sampled(plan.axis.x, plan.psi, number, seed)


def follow(plan: Plan, start: Start, meters: Sequence[ClassicalMeter], times: Array) -> Followed:
    """Trajectories from `start`, seen by the meters at `times`. RunError where one meets too many edges."""
    size = start.x.shape[1]
    watch = Watch(tuple({meter.place for meter in meters if meter.place is not None}), plan.axis.length)
    motion = _motion(plan, watch.places, watch.see)
    now = Trajectories.start(start.x.ravel(), start.p.ravel(), start.weight.ravel())
    step = _longest(plan, motion, now, times)
    absorbed = {layer.name: np.zeros(now.x.size) for layer in plan.hamiltonian.layers}
    rows = [_row(plan, meters, now, absorbed, size, float(times[0]))]
    for t, until in pairwise(times.tolist()):
        watch.alive = np.flatnonzero(now.weight)
        after = now.copy()
        steps = max(1, math.ceil((until - t) / step - 1e-9))
        after.put(watch.alive, motion.advance(now.at(watch.alive), t, until - t, steps))
        _take(plan, absorbed, now, after)
        now = after
        rows.append(_row(plan, meters, now, absorbed, size, until))
    table = {name: np.array([row[name] for row in rows]) for name in rows[0]}
    passages = watch.all()
    whole = Passages(passages.who, passages.t, passages.place, passages.toward, passages.weight / GROUPS)
    histories = [
        History(times, {name: values[:, 1 + group] for name, values in table.items()}, of_group)
        for group, of_group in enumerate(passages.at(passages.who // size == g) for g in range(GROUPS))
    ]
    pooled = History(times, {name: values[:, 0] for name, values in table.items()}, whole)
    return Followed(now.x.size, pooled, tuple(histories))


def _longest(plan: Plan, motion: Motion, now: Trajectories, times: Array) -> float:
    """The longest step that trajectories with the energies of `now` allow."""
    step = first_step(motion, now, times) * (1.0 if motion.exact else LONGER)
    return min(step, fastest(plan.job) / PER_CHANGE)


def _extremes(plan: Plan) -> Trajectories:
    """The slowest and the fastest that may be drawn, at the mean place."""
    density = np.abs(plan.psi) ** 2 * plan.axis.spacing
    k, weight = wave_numbers(plan.axis, plan.psi)
    mean = float(weight @ k)
    spread = math.sqrt(max(float(weight @ (k - mean) ** 2), 0.0))
    return Trajectories.start(float(density @ plan.axis.x), mean + 3 * spread * np.array([-1.0, 1.0]))


class Watch:
    """Gathers the passages of some places by the trajectories that are `alive`."""

    def __init__(self, places: tuple[float, ...], length: float) -> None:
        self.places = places
        self.near = 1e-11 * length  # an edge may stand at the same place, and is then met first
        self.alive = np.empty(0, int)
        self.seen = [Passages(*(np.empty(0) for _ in fields(Passages)))]

    def see(self, passages: Passages) -> None:
        for place in self.places:
            here = np.abs(passages.place - place) < self.near
            if here.any():
                found = passages.at(here)
                exact = np.full(found.t.shape, place)
                self.seen.append(Passages(self.alive[found.who], found.t, exact, found.toward, found.weight))

    def all(self) -> Passages:
        return Passages(*(np.concatenate([getattr(s, f.name) for s in self.seen]) for f in fields(Passages)))


def _motion(plan: Plan, places: tuple[float, ...], passed: Callable[[Passages], None] | None) -> Motion:
    """Watched places are edges of height 0."""
    axis = plan.axis
    terms = plan.job.landscape.terms
    if places:
        terms = (*terms, Term(Shape.sharp(Breaks.of(*((place, 0.0, 0.0) for place in places)))))
    absorption = _mean_rate(plan.endings, axis.low, axis.high) if plan.endings else None
    return Motion(
        Landscape(terms),
        plan.job.particle.mass,
        axis.low,
        axis.high,
        axis.transform,
        absorption,
        passed,
        actions=False,
    )


def _mean_rate(endings: tuple[Ending, ...], low: float, high: float) -> Callable[[Array, Array], Array]:
    """Mean of W over the straight way between two places: a step may be longer than W takes to grow."""

    def mean(start: Array, stop: Array) -> Array:
        total = np.zeros(start.shape)
        for ending in endings:
            depth = ending.shape.depth
            first, last = (low + depth - x if ending.side == "low" else x - (high - depth) for x in (start, stop))
            moved = np.abs(last - first) > 1e-6 * depth
            way = np.where(moved, last - first, 1.0)
            along = (ending.shape.integral(last) - ending.shape.integral(first)) / way
            total += np.where(moved, along, ending.shape.rate((first + last) / 2))
        return total

    return mean


def _take(plan: Plan, absorbed: dict[str, Array], before: Trajectories, after: Trajectories) -> None:
    """Adds the weight lost to the layer that is nearer; what has come through a layer is lost as a whole."""
    if not absorbed:
        return
    axis = plan.axis
    through = np.abs(after.x - before.x) > axis.length / 2
    after.weight[through | (np.abs(after.weight) < NOTHING * np.abs(before.weight).max())] = 0.0
    low = np.where(through, before.x, after.x) < (axis.low + axis.high) / 2
    for name, taken in absorbed.items():
        here = low == name.endswith(".low") if len(absorbed) > 1 else np.ones(low.shape, bool)
        taken += np.where(here, before.weight - after.weight, 0.0)


def _row(
    plan: Plan,
    meters: Sequence[ClassicalMeter],
    now: Trajectories,
    absorbed: dict[str, Array],
    size: int,
    t: float,
) -> dict[str, Array]:
    """What the meters say of all trajectories together, first, and of each group; (1 + GROUPS,) by name."""
    x, p, weight = (values.reshape(-1, size) for values in (now.x, now.p, now.weight))
    by_group = {name: taken.reshape(-1, size).sum(axis=1) for name, taken in absorbed.items()}
    swarm = Swarm(t, x, p, weight, by_group, plan.job.landscape, plan.job.particle.mass)
    values: dict[str, Array] = {}
    for meter in meters:
        pooled, groups = meter.row(swarm.pooled), meter.row(swarm)
        values |= {name: np.concatenate([pooled[name], groups[name]]) for name in groups}
    return values
