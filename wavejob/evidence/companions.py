"""Companion runs: the same job on a coarser or finer grid with a longer or shorter step."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from ..endings import layers, retuned
from ..grid import fast_size, fast_size_below
from ..on_grid import on_grid
from ..plan import Plan
from ..points import initial_state, wave_numbers

COARSER_STEP = 2.0
COARSER_POINTS = 2**-0.5  # with twice the step the largest kinetic phase a step stays what it was
EXTENSION = 0.15  # of the grid, by which it is longer at each end
HOLDS = 0.9  # of the largest wave number of a grid: a packet that reaches beyond needs a finer companion


@dataclass(frozen=True)
class Companion:
    """A plan to compare a run with. `step` and `points` are its ratios to those of the run."""

    plan: Plan
    step: float
    points: float
    reason: str

    @property
    def coarser(self) -> bool:
        return self.step * self.points**-1 > 1


def coarser(plan: Plan, *, step: bool = True, points: bool = True, until: int | None = None) -> Companion:
    """Twice the step and 0.7 of the points, or a finer run where the packet or the rows allow nothing coarser.

    `until` is the number of steps that the run has made: the companion ends at the same time.
    """
    rows = plan.record // 2 if step and plan.record > 1 else plan.record
    whole = plan.steps if until is None else until
    fits = whole * rows % plan.record == 0  # else no step makes both the rows and the end whole
    grid = fast_size_below(int(plan.axis.points * COARSER_POINTS)) if points else plan.axis.points
    reach = float(np.max(np.abs(wave_numbers(plan.axis, plan.psi)[0])))
    if (step and (plan.record == 1 or not fits)) or (points and reach > HOLDS * math.pi * grid / plan.axis.length):
        return finer(plan, step=2.0 if step else 1.0, points=2**0.5 if points else 1.0, until=until)
    return _changed(plan, rows, grid, until, "coarser")


def finer(plan: Plan, *, step: float = 2.0, points: float = 2**0.5, until: int | None = None) -> Companion:
    """A step shorter by `step` and points more by `points`, within bounds; 1.0 leaves one of them as it is.

    More points shorten the step too where the kinetic phase a step would exceed pi.
    """
    grid, record = plan.axis.points, plan.record
    if points > 1:
        grid = fast_size(math.ceil(plan.axis.points * min(max(points, 2**0.5), 3.0)))
    if step > 1:
        record = math.ceil(plan.record * min(max(step, 2.0), 8.0))
    phase = plan.kinetic_phase * (grid / plan.axis.points) ** 2
    record = max(record, math.ceil(plan.record * phase / math.pi - 1e-9))
    return _changed(plan, record, grid, until, "finer")


def larger(plan: Plan, until: int | None = None) -> Companion | None:
    """The same spacing and step on a grid longer by 0.15 at every end that is no wall, the layers deeper by as much.

    None where all ends are walls or meant to wrap, or where a term is not known that far out.
    """
    axis, ends = plan.axis, plan.job.keys.edges.x
    meant = "edges" in plan.job.keys.model_fields_set
    sides = [s for s in ("low", "high") if getattr(ends, s) != "wall" and not (meant and getattr(ends, s) == "wrap")]
    if not sides:
        return None
    points = fast_size(math.ceil(axis.points * (1 + EXTENSION * len(sides))))
    more = {"low": 0, "high": 0}
    for index, side in enumerate(sides):
        more[side] = (points - axis.points + index) // len(sides)
    wide = replace(
        axis,
        low=axis.low - more["low"] * axis.spacing,
        high=axis.high + more["high"] * axis.spacing,
        points=points,
    )
    if any(item.body.misfit(plan.job.setting, wide.low, wide.high) for item in plan.job.keys.potential):
        return None
    endings = tuple(e.deeper(more[e.side] * axis.spacing) for e in plan.endings)
    changed = replace(
        plan,
        axis=wide,
        psi=initial_state(plan.job, wide),
        hamiltonian=on_grid(plan.job, wide, layers(wide, endings)),
        endings=endings,
        steps=plan.steps if until is None else until,
    )
    return Companion(changed, 1.0, 1.0, "a larger grid with deeper layers")


def _changed(plan: Plan, record: int, points: int, until: int | None, reason: str) -> Companion:
    """The plan with at least `record` steps between the same recorded times, on `points` points."""
    whole = plan.steps if until is None else until
    if whole * record % plan.record:  # the last row does not stand at a whole number of rows
        record = plan.record * math.ceil(record / plan.record)
    ratio = plan.record / record
    steps = round(whole / ratio)
    axis = replace(plan.axis, points=points)
    endings = plan.endings if points == plan.axis.points else retuned(plan.job, axis, plan.endings)
    changed = replace(
        plan,
        axis=axis,
        psi=initial_state(plan.job, axis),
        hamiltonian=on_grid(plan.job, axis, layers(axis, endings)),
        endings=endings,
        step=plan.step * whole / steps,
        steps=steps,
        record=record,
        sample=_sample(plan, record, steps, ratio),
    )
    return Companion(changed, changed.step / plan.step, points / plan.axis.points, reason)


def _sample(plan: Plan, record: int, steps: int, ratio: float) -> int:
    """The largest divisor of rows and run that samples at least as often as the run does."""
    common = math.gcd(record, steps)
    return max(d for d in range(1, common + 1) if common % d == 0 and d <= max(plan.sample / ratio, 1))
