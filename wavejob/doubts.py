"""What is doubtful about a job before it runs. None of it stops a run; `checks.py` judges afterwards."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from .checks import REFLECTION_LIMIT
from .endings import Ending
from .misfits import HEAD_ROOM
from .observables.places import Crossing, Inside
from .plan import Plan
from .points import highest_wavenumber
from .problems import Problem
from .reading.merging import Key

OVERLAP = 1e-6  # probability of the initial state inside a layer that is worth a word


def doubts(plan: Plan) -> list[Problem]:
    """Everything doubtful about a planned job, as warnings at the keys to change."""
    return [*_layers(plan), *_detectors(plan), *_in_part(plan), *_phase(plan), *_head_room(plan)]


def _layers(plan: Plan) -> Iterator[Problem]:
    job = plan.job
    shallow = [ending for ending in plan.endings if ending.shape.reflected > REFLECTION_LIMIT]
    for key in dict.fromkeys(_edge_key(plan, ending) for ending in shallow):
        worst = max((e for e in shallow if _edge_key(plan, e) == key), key=lambda e: e.shape.reflected)
        yield job.problem(key, *_shallow(plan, worst), severity="warning")
    density = np.abs(plan.psi) ** 2 * plan.axis.spacing
    for ending in plan.endings:
        low, high = _span(plan, ending)
        inside = float(density[(plan.axis.x > low) & (plan.axis.x < high)].sum())
        if inside > OVERLAP:
            yield job.problem(
                ("packet",),
                f"{inside:.1e} of the packet starts inside the absorbing layer at x.{ending.side}",
                f"start it farther from {_from_to(plan, low, high)}, or extend the grid",
                severity="warning",
            )


def _shallow(plan: Plan, ending: Ending) -> tuple[str, str]:
    depth, reflected = plan.job.write(ending.shape.depth, "length"), ending.shape.reflected
    said = f"a layer of {depth} is predicted to send back {reflected:.1e} of what comes to x.{ending.side}"
    if math.isinf(ending.recommended):
        return said, "no depth absorbs waves this slow: end the run before they arrive, or extend the grid"
    deeper = plan.job.write(ending.recommended, "length")
    return said, f"{deeper} would send back less than {REFLECTION_LIMIT:.0e}"


def _detectors(plan: Plan) -> Iterator[Problem]:
    job = plan.job
    items = job.keys.observables or []
    for index, observable in enumerate(job.observables):
        for ending in plan.endings:
            low, high = _span(plan, ending)
            key: Key = ("observables", index, items[index].kind)
            if isinstance(observable, Crossing) and low < observable.x < high:
                yield job.problem(
                    (*key, "x"),
                    f"the detector stands inside the absorbing layer at x.{ending.side}",
                    f"move it out of {_from_to(plan, low, high)}",
                    severity="warning",
                )
            if isinstance(observable, Inside) and low < observable.stop and observable.start < high:
                yield job.problem(
                    key,
                    f"the region reaches into the absorbing layer at x.{ending.side}",
                    f"keep it out of {_from_to(plan, low, high)}, or read it as what is not yet absorbed",
                    severity="warning",
                )


def _in_part(plan: Plan) -> Iterator[Problem]:
    """What an observable can only say in part."""
    items = plan.job.keys.observables or []
    for index, observable in enumerate(plan.job.observables):
        doubt = observable.doubtful(plan.bench, plan.psi)
        if doubt:
            key: Key = ("observables", index, items[index].kind, doubt[0])
            yield plan.job.problem(key, doubt[1], doubt[2], severity="warning")


def _phase(plan: Plan) -> Iterator[Problem]:
    phase = plan.kinetic_phase
    if phase > math.pi * (1 + 1e-9):
        step = plan.job.write(plan.step * math.pi / phase, "time")
        yield plan.job.problem(
            ("evolve", "step"),
            f"the fastest wave of the grid turns by {phase:.3g} rad a step; beyond pi, errors do not shrink evenly",
            f"write at most {step}, or leave `step` out",
            severity="warning",
        )


def _head_room(plan: Plan) -> Iterator[Problem]:
    """Waves that the potential makes faster than the points can hold."""
    highest = highest_wavenumber(plan.job, plan.axis)
    if highest * HEAD_ROOM > plan.axis.k_max:
        keys = plan.job.keys.grid.x
        points = math.ceil(highest * HEAD_ROOM * plan.axis.length / math.pi)
        yield plan.job.problem(
            ("grid", "x", "points") if keys.points else ("grid", "x", "spacing") if keys.spacing else ("grid", "x"),
            f"where the potential is lowest the packet may reach {plan.job.write(highest, 'wavenumber')}, "
            f"the grid holds {plan.job.write(plan.axis.k_max, 'wavenumber')}",
            f"give at least {points} points, or leave `points` out",
            severity="warning",
        )


def _span(plan: Plan, ending: Ending) -> tuple[float, float]:
    """Between which places a layer absorbs."""
    axis, depth = plan.axis, ending.shape.depth
    return (axis.low, axis.low + depth) if ending.side == "low" else (axis.high - depth, axis.high)


def _from_to(plan: Plan, low: float, high: float) -> str:
    return f"{plan.job.write(low, 'length')} to {plan.job.write(high, 'length')}"


def _edge_key(plan: Plan, ending: Ending) -> Key:
    """The key of the layer's depth: per end, or for both ends at once."""
    places = plan.job.document.places
    each: Key = ("edges", "x", ending.side, "absorb")
    return each if each in places else ("edges", "x", "absorb")
