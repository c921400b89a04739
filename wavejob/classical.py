"""The classical companion of a run: the path that F = m a gives the mean start of the packet."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from .grid import Transform
from .newton import Motion, Trajectories
from .shapes import Landscape

Array = np.ndarray

TOLERANCE = 1e-8  # of the length of the axis: change of the path when all steps are halved
LEAST_STEPS = 400  # so that a short pulse in time is not stepped over
MOST_STEPS = 25_000
RADIANS = 0.5  # of the fastest oscillation in one step; also the part of the sharpest feature passed in one
EDGES_A_STEP = 200  # met in one step at the most where no force asks for shorter ones
PROBES = 2001  # points at which the landscape is looked at


@dataclass(frozen=True)
class Path:
    """One trajectory at given times, every field of shape (times,) but the last two.

    `action` is the integral of p dx, `lagrangian_action` that of L dt, both from the first time on with
    hbar = 1. `step` is the longest step that was taken; `error` the largest change of position when the steps
    were halved, about 15 times the error that is left, and `action_error` that of the two actions.
    """

    times: Array
    x: Array
    p: Array
    action: Array
    lagrangian_action: Array
    step: float
    error: float
    action_error: float


@dataclass(frozen=True)
class Answer:
    """What F = m a says about a run, beside its figures. Names are those of results without the prefix."""

    sentence: str
    path: Path | None  # from the mean start, at the times of the frames and the last recorded one
    trajectories: int
    largest_gap: float | None  # of the mean places, in quantum widths
    gap_time: float | None
    opens: float | None  # when the gap can first be seen
    enough: tuple[str, ...] = ()
    not_enough: tuple[str, ...] = ()
    undecided: tuple[str, ...] = ()


def path(
    landscape: Landscape,
    mass: float,
    x0: float,
    p0: float,
    times: Array,
    *,
    low: float,
    high: float,
    ends: Transform = "periodic",
    tolerance: float = TOLERANCE,
) -> Path:
    """The trajectory that starts at `times[0]` from `x0` inside [low, high] with momentum `p0`.

    The steps come from curvature and features of the landscape and are halved until positions change by less
    than `tolerance` of the length of the axis, or 25 000 steps are reached; `error` tells which. On a
    "periodic" axis positions stay inside [low, high], so they jump where the path wraps; on a "sine" axis the
    ends are walls.
    """
    times = np.asarray(times, dtype=float)
    motion = Motion(landscape, mass, low, high, ends)
    duration = float(times[-1] - times[0])
    step = first_step(motion, Trajectories.start(x0, p0), times)
    if duration == 0 or motion.exact:
        return _followed(motion, x0, p0, times, step)
    step = max(step, 4 * duration / MOST_STEPS)
    coarse = _followed(motion, x0, p0, times, step)
    while True:
        step /= 2
        fine = _followed(motion, x0, p0, times, step)
        change = np.abs(fine.x - coarse.x)
        if ends == "periodic":
            change = np.minimum(change, high - low - change)
        error = float(change.max())
        if error < tolerance * (high - low) or duration / step > MOST_STEPS / 2:
            actions = (
                np.abs(fine.action - coarse.action),
                np.abs(fine.lagrangian_action - coarse.lagrangian_action),
            )
            return replace(fine, error=error, action_error=float(np.max(actions)))
        coarse = fine


def first_step(motion: Motion, start: Trajectories, times: Array) -> float:
    """A step that follows the fastest oscillation the smooth terms allow and skips none of their features.

    Where the landscape does not change, only what the energy of the fastest of `start` lets it reach counts.
    """
    x = np.linspace(motion.low, motion.high, PROBES)
    changes = motion.landscape.depends_on_time
    smooth = Landscape(tuple(term for term in motion.landscape.terms if term.shape.breaks is None))
    moments = np.linspace(times[0], times[-1], 9 if changes else 1)
    values = np.array([motion.landscape.value(x, float(t)) for t in moments])
    slopes = np.array([smooth.slope(x, float(t)) for t in moments])
    energy = float(motion.energy(start, float(times[0])).max())
    if not changes:
        reached = np.convolve(values[0] <= energy, np.ones(5), "same") > 0
        slopes = slopes[:, reached] if np.count_nonzero(reached) > 2 else slopes
    steepest = np.abs(slopes).max()
    stiffest = np.abs(np.diff(slopes, axis=1)).max() / (x[1] - x[0])
    kinetic = energy - float(values.min())
    if motion.exact:
        edges = np.unique(np.concatenate([motion.landscape.edges(0.0)[0], [motion.low, motion.high]]))
        return EDGES_A_STEP * float(np.diff(edges).min()) / math.sqrt(2 * max(kinetic, 1e-300) / motion.mass)
    step = float(times[-1] - times[0]) / LEAST_STEPS
    if stiffest > 0:
        step = min(step, RADIANS * math.sqrt(motion.mass / stiffest))
    if stiffest > 0 and kinetic > 0:
        step = min(step, RADIANS * steepest / stiffest * math.sqrt(motion.mass / (2 * kinetic)))
    return step


def _followed(motion: Motion, x0: float, p0: float, times: Array, step: float) -> Path:
    rows = [Trajectories.start(x0, p0)]
    for t, until in pairwise(times.tolist()):
        steps = max(1, math.ceil((until - t) / step - 1e-9))
        rows.append(motion.advance(rows[-1], t, until - t, steps))
    x, p, action, lagrangian_action = (
        np.concatenate([getattr(row, name) for row in rows]) for name in ("x", "p", "action", "lagrangian_action")
    )
    return Path(times, x, p, action, lagrangian_action, step, error=0.0, action_error=0.0)
