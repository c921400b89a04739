"""F = m a: trajectories in the exact landscape, hbar = 1.

Between sharp edges the force is smooth and the motion is integrated by the symplectic splitting of order 4
with six stages of Blanes and Moan, J. Comput. Appl. Math. 142, 313 (2002); drifts come first, so no force
is taken at either end of a step. A step that would cross an edge is shortened to end on it, and there the
trajectory crosses or reflects by energy conservation in the frame of the edge: m w^2 / 2 changes by the
height of the jump, or w changes sign (mechanics textbook). The force of an edge is never sampled.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields, replace
from functools import cached_property

import numpy as np

from .grid import Transform
from .problems import RunError
from .shapes import Landscape

Array = np.ndarray

_A = (0.0792036964311957, 0.353172906049774, -0.0420650803577195)
_B = (0.209515106613362, -0.143851773179818)
DRIFTS = (*_A, 1 - 2 * sum(_A), *_A[::-1])
KICKS = (*_B, 0.5 - sum(_B), 0.5 - sum(_B), *_B[::-1], 0.0)

NUDGE = 1e-12  # of the length of the axis: how far beside an edge a trajectory stands after meeting it
MOST_EVENTS = 1000  # edges met in one step
MOST_BISECTIONS = 80
STRAIGHT = (1.0,), (0.0,)  # drifts and kicks where there is no force between edges
HALVES = (0.5, 0.5), (1.0, 0.0)  # the same, with a look at the potential half-way for the actions
VELOCITY_STEP = 1e-4  # of a step: difference that gives the velocity of a moving edge


@dataclass(frozen=True)
class Trajectories:
    """Positions, momenta and weights of n trajectories, each shape (n,), and the actions gathered so far.

    `action` is the integral of p dx, `lagrangian_action` that of (p^2 / 2 mass - V) dt.
    """

    x: Array
    p: Array
    weight: Array
    action: Array
    lagrangian_action: Array

    @classmethod
    def start(cls, x: Array | float, p: Array | float, weight: Array | float = 1.0) -> Trajectories:
        columns = np.broadcast_arrays(np.atleast_1d(x), p, weight)
        x, p, weight = (np.array(column, dtype=float) for column in columns)
        return cls(x, p, weight, np.zeros(x.shape), np.zeros(x.shape))

    def copy(self) -> Trajectories:
        return Trajectories(*(getattr(self, f.name).copy() for f in fields(self)))

    def at(self, chosen: Array) -> Trajectories:
        """Those of an index or a mask."""
        return Trajectories(*(getattr(self, f.name)[chosen] for f in fields(self)))

    def put(self, chosen: Array, others: Trajectories) -> None:
        """Write `others` to the places `chosen`."""
        for f in fields(self):
            getattr(self, f.name)[chosen] = getattr(others, f.name)


@dataclass(frozen=True)
class Passages:
    """Edges that trajectories crossed, every field of shape (passages,).

    `who` counts trajectories, `toward` is 1 for a passage towards larger x and -1 for the other, `weight` is
    that of the trajectory at the time `t`.
    """

    who: Array
    t: Array
    place: Array
    toward: Array
    weight: Array

    def at(self, chosen: Array) -> Passages:
        """Those of an index or a mask."""
        return Passages(*(getattr(self, f.name)[chosen] for f in fields(self)))


@dataclass(frozen=True)
class Motion:
    """Newton's equation on one axis from `low` to `high`.

    On a "periodic" axis what leaves at one end enters at the other, where a difference in potential counts
    as an edge; on a "sine" axis both ends are walls. `absorption` is the mean of W >= 0 of absorbing layers
    between two places and lowers the weight by exp(-2 W dt). `passed` is told of every edge crossed, those of
    height 0 included. Without `actions` these stay 0, which saves time.
    """

    landscape: Landscape
    mass: float
    low: float
    high: float
    ends: Transform = "periodic"
    absorption: Callable[[Array, Array], Array] | None = None
    passed: Callable[[Passages], None] | None = None
    actions: bool = True

    def advance(self, now: Trajectories, t: float, duration: float, steps: int = 1) -> Trajectories:
        """The trajectories, all inside [low, high] at `t`, `duration` later.

        RunError where one of them meets more than 1000 edges in a step.
        """
        step = duration / steps
        for number in range(steps):
            now = self._step(now, t + number * step, step)
        return now

    def energy(self, now: Trajectories, t: float) -> Array:
        """p^2 / 2 mass + V, shape (n,)."""
        return np.asarray(now.p**2 / (2 * self.mass) + self.landscape.value(now.x, t))

    @property
    def nudge(self) -> float:
        return NUDGE * (self.high - self.low)

    @cached_property
    def straight(self) -> bool:
        """Whether there is no force between edges."""
        edges = [term.shape.breaks for term in self.landscape.terms]
        return all(breaks is not None and not np.any(breaks.kinks) for breaks in edges)

    @property
    def exact(self) -> bool:
        """Whether steps of any length are exact: no force between edges, and edges that stay."""
        return self.straight and not self.landscape.depends_on_time

    @cached_property
    def _scheme(self) -> tuple[tuple[float, ...], tuple[float, ...]]:
        if self.straight:
            return HALVES if self.actions else STRAIGHT
        return DRIFTS, KICKS

    def _step(self, now: Trajectories, t: float, step: float) -> Trajectories:
        """One step; those that meet an edge go on from there with the time they have left."""
        result, end_time = now.copy(), t + step
        moving, times = np.arange(len(now.x)), np.full(len(now.x), t)
        for _ in range(MOST_EVENTS):
            start = result.at(moving)
            left = end_time - times
            end, trail = self._glide(start, times, left)
            result.put(moving, end)
            edge, latest = self._first_passed(start.x, trail, times, left)
            hit = edge >= 0
            if not hit.any():
                return result
            start, times, moving, edge = start.at(hit), times[hit], moving[hit], edge[hit]
            toward = np.where(start.x > self._places(times, edge), -1.0, 1.0)
            taken, end, reached = self._reach(start, times, edge, toward, latest[hit])
            times = times + taken
            if reached.any():
                t_met, edge, toward = times[reached], edge[reached], toward[reached]
                met, held, crosses = self._meet(end.at(reached), t_met, edge, toward, end_time, step)
                if self.passed is not None and crosses.any():
                    place, who = self._places(t_met, edge), moving[reached]
                    self.passed(Passages(who, t_met, place, toward, met.weight).at(crosses))
                end.put(reached, met)
                times[reached] = np.where(held, end_time, t_met)
            result.put(moving, end)
            going = times < end_time
            if not going.any():
                return result
            moving, times = moving[going], times[going]
        raise RunError(f"a classical trajectory met {MOST_EVENTS} edges in one step", "write `classical: none`")

    def _glide(self, now: Trajectories, t: Array, tau: Array) -> tuple[Trajectories, list[Array]]:
        """Motion under the smooth force from `t` for the times `tau`, and the positions after each drift."""
        x, p, action, lagrangian = now.x, now.p, now.action, now.lagrangian_action
        moment, trail = 0.0, []
        for drift, kick in zip(*self._scheme, strict=True):
            span, moment = drift * tau, moment + drift
            x = x + span * p / self.mass
            trail.append(x)
            if self.actions:
                action = action + span * p**2 / self.mass
                lagrangian = lagrangian + span * p**2 / (2 * self.mass)
            if kick:
                at = t + moment * tau
                p = p - kick * tau * self._field(self.landscape.slope, x, at)
                if self.actions:
                    lagrangian = lagrangian - kick * tau * self._field(self.landscape.value, x, at)
        weight = now.weight
        if self.absorption is not None:
            weight = weight * np.exp(-2 * tau * self.absorption(now.x, x))
        return Trajectories(x, p, weight, action, lagrangian), trail

    def _first_passed(self, x: Array, trail: list[Array], t: Array, tau: Array) -> tuple[Array, Array]:
        """Number of the first edge passed on the way (-1 for none) and a time from `t` by which it was."""
        edge, latest = np.full(len(x), -1), np.zeros(len(x))
        before = x[:, None] - self._all_places(t)
        for moment, place in zip(np.cumsum(self._scheme[0]), trail, strict=True):
            after = place[:, None] - self._all_places(t + moment * tau)
            passed = ((before > 0) != (after > 0)) & (edge < 0)[:, None]
            if passed.any():
                share = np.where(passed, np.abs(before) / (np.abs(before) + np.abs(after)), np.inf)
                edge = np.where(passed.any(1), share.argmin(1), edge)
                latest = np.where(passed.any(1), moment * tau, latest)
        return edge, latest

    def _reach(
        self, start: Trajectories, t: Array, edge: Array, toward: Array, latest: Array
    ) -> tuple[Array, Trajectories, Array]:
        """Times counted from `t` at which the edges are reached, the state there, and whether they are.

        Newton's rule on the length of the step, kept inside a bracket. Where a step of `latest` does not
        reach the edge after all (its stages did), that step stands.
        """
        early, late, tau = np.zeros(len(t)), latest, latest
        velocity = (self._places(t + latest, edge) - self._places(t, edge)) / latest
        reached = np.ones(len(t), bool)
        for number in range(MOST_BISECTIONS):
            end, _ = self._glide(start, t, tau)
            beyond = toward * (end.x - self._places(t + tau, edge))
            if number == 0:
                reached = beyond >= 0
            done = (np.abs(beyond) < 0.1 * self.nudge) | ~reached
            if done.all():
                break
            early, late = np.where(beyond < 0, tau, early), np.where(beyond < 0, late, tau)
            speed = toward * (end.p / self.mass - velocity)
            newton = tau - beyond / np.where(speed == 0, 1.0, speed)
            inside = (newton > early) & (newton < late) & (speed != 0)
            tau = np.where(done, tau, np.where(inside, newton, (early + late) / 2))
        return tau, end, reached

    def _meet(
        self, now: Trajectories, t: Array, edge: Array, toward: Array, end_time: float, step: float
    ) -> tuple[Trajectories, Array, Array]:
        """Cross the edge or turn back; also which trajectories are pressed against it, and which cross.

        One that would bounce lower than the nudge, and so without end, is held there until `end_time`.
        """
        places, heights = self._edges(t)
        delta = VELOCITY_STEP * step
        place, velocity = self._places(t, edge), self._velocities(t, edge, delta)
        together = np.abs(places - place[:, None]) <= 2 * self.nudge
        climb = toward * np.where(together, heights, 0.0).sum(1)
        speed = np.abs(now.p / self.mass - velocity)
        left_over = speed**2 - 2 * climb / self.mass
        crosses = left_over > 0
        side = np.where(crosses, toward, -toward)
        x = place + side * self.nudge
        if self.ends == "periodic":
            seam = edge >= places.shape[1] - 2
            x = np.where(crosses & seam, x - toward * (self.high - self.low), x)
        pull = -toward * self._field(self.landscape.slope, x, t) / self.mass
        held = ~crosses & (speed**2 < 20 * pull * self.nudge)
        relative = side * np.where(crosses, np.sqrt(np.maximum(left_over, 0)), speed)
        if held.any():
            until = np.full(len(t), end_time)
            x = np.where(held, self._places(until, edge) + side * self.nudge, x)
            velocity = np.where(held, self._velocities(until, edge, delta), velocity)
            relative = np.where(held, 0.0, relative)
        return replace(now, x=x, p=self.mass * (velocity + relative)), held, crosses

    def _field(self, field: Callable[[Array, float], Array], x: Array, t: Array) -> Array:
        """Value or slope at every x at its own time."""
        if not self.landscape.depends_on_time:
            return field(x, 0.0)
        if (t == t[0]).all():
            return field(x, float(t[0]))
        result = np.empty(len(x))
        for moment in np.unique(t):
            result[t == moment] = field(x[t == moment], float(moment))
        return result

    def _edges(self, t: Array) -> tuple[Array, Array]:
        """Places and heights of all edges at the times `t`, shape (n or 1, edges); the two ends come last."""
        if not self.landscape.depends_on_time:
            return self._still
        if (t == t[0]).all():
            places, heights = self._edges_at(float(t[0]))
            return places[None], heights[None]
        moments, which = np.unique(t, return_inverse=True)
        places, heights = zip(*(self._edges_at(float(moment)) for moment in moments), strict=True)
        return np.stack(places)[which], np.stack(heights)[which]

    @cached_property
    def _still(self) -> tuple[Array, Array]:
        places, heights = self._edges_at(0.0)
        return places[None], heights[None]

    def _all_places(self, t: Array) -> Array:
        """Places of all edges at the times `t`, shape (n or 1, edges)."""
        return self._edges(t)[0] if self._resting is None else self._resting

    @cached_property
    def _resting(self) -> Array | None:
        """Places of all edges, shape (1, edges), where none of them moves."""
        moving = any(term.path is not None for term in self.landscape.terms if term.shape.breaks is not None)
        return None if moving else self._edges_at(0.0)[0][None]

    def _edges_at(self, t: float) -> tuple[Array, Array]:
        """In an order that does not depend on t, corners of height 0 among them: steps end there as well."""
        sharp = [(term, term.shape.breaks) for term in self.landscape.terms if term.shape.breaks is not None]
        places = [breaks.positions + term.shift(t) for term, breaks in sharp]
        heights = [breaks.jumps * term.strength(t) for term, breaks in sharp]
        if self.ends == "periodic":
            beside = np.array([self.low + self.nudge, self.high - self.nudge])
            after, before = self.landscape.value(beside, t)
            ends = np.full(2, after - before)
        else:
            ends = np.array([-np.inf, np.inf])
        place = np.concatenate([*places, [self.low, self.high]])
        height = np.concatenate([*heights, ends])
        outside = (place <= self.low) | (place >= self.high)
        outside[-2:] = False
        return place, np.where(outside, 0.0, height)

    def _places(self, t: Array, edge: Array) -> Array:
        places = self._all_places(t)
        rows = np.arange(len(t)) if len(places) > 1 else np.zeros(len(t), int)
        return np.asarray(places[rows, edge])

    def _velocities(self, t: Array, edge: Array, delta: float) -> Array:
        """Of the edges, from their paths by a central difference over 2 `delta`."""
        return np.asarray((self._places(t + delta, edge) - self._places(t - delta, edge)) / (2 * delta))
