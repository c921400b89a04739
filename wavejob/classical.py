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
PROBES = 2001  # points at which the landscape is looked at


@dataclass(frozen=True)
class Path:
    """One trajectory at given times, every field of shape (times,) but the last two.

    `action` is the integral of p dx, `lagrangian_action` that of L dt, both from the first time on with
    hbar = 1. `step` is the longest step that was taken; `error` the largest change of position when the steps
    were halved, about 15 times the error that is left.
    """

    times: Array
    x: Array
    p: Array
    action: Array
    lagrangian_action: Array
    step: float
    error: float


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
) -> Path:
    """The trajectory that starts at `times[0]` from `x0` inside [low, high] with momentum `p0`.

    The steps come from curvature and features of the landscape and are halved until positions change by less
    than 1e-8 of the length of the axis, or 25 000 steps are reached; `error` tells which. On a "periodic"
    axis positions stay inside [low, high], so they jump where the path wraps; on a "sine" axis the ends are
    walls.
    """
    times = np.asarray(times, dtype=float)
    motion = Motion(landscape, mass, low, high, ends)
    duration = float(times[-1] - times[0])
    if duration == 0:
        return _followed(motion, x0, p0, times, 1.0)
    step = max(_first_step(motion, x0, p0, times), 4 * duration / MOST_STEPS)
    coarse = _followed(motion, x0, p0, times, step)
    while True:
        step /= 2
        fine = _followed(motion, x0, p0, times, step)
        change = np.abs(fine.x - coarse.x)
        if ends == "periodic":
            change = np.minimum(change, high - low - change)
        error = float(change.max())
        if error < TOLERANCE * (high - low) or duration / step > MOST_STEPS / 2:
            return replace(fine, error=error)
        coarse = fine


def _first_step(motion: Motion, x0: float, p0: float, times: Array) -> float:
    """A step that follows the fastest oscillation the smooth terms allow and skips none of their features."""
    x = np.linspace(motion.low, motion.high, PROBES)
    smooth = Landscape(tuple(term for term in motion.landscape.terms if term.shape.breaks is None))
    moments = np.linspace(times[0], times[-1], 9 if motion.landscape.depends_on_time else 1)
    slopes = np.array([smooth.slope(x, float(t)) for t in moments])
    steepest = np.abs(slopes).max()
    stiffest = np.abs(np.diff(slopes, axis=1)).max() / (x[1] - x[0])
    lowest = min(float(motion.landscape.value(x, float(t)).min()) for t in moments)
    start = Trajectories.start(x0, p0)
    kinetic = float(motion.energy(start, float(times[0]))[0]) - lowest
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
        np.concatenate([getattr(row, name) for row in rows])
        for name in ("x", "p", "action", "lagrangian_action")
    )
    return Path(times, x, p, action, lagrangian_action, step, error=0.0)
