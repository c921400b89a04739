"""What terms of the potential can only be wrong about on a grid and during a run."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from .grid import Axis
from .job import Job
from .problems import Problem
from .reading.merging import Key
from .settings import MAX_POINTS
from .shapes import Term
from .time_shapes import TimeShape

LARGEST = 1e60  # of a potential or a function of time: its square and its products are numbers still
PLACES, TIMES, INSTANTS = 2001, 2001, 41  # looked at: along x, along t, and along t for all x at once


def term_misfits(job: Job, axis: Axis) -> Iterator[Problem]:
    """What does not fit about the terms of the potential on `axis`, during the run."""
    names: set[str] = set()
    for index, item in enumerate(job.keys.potential):
        if item.name in names:
            said = f"another term is called `{item.name}`"
            yield job.problem(("potential", index, "name"), said, "choose another name, or leave it out")
        names |= {item.name} if item.name else set()
        where: Key = ("potential", index, item.kind)
        wrong = item.body.misfit(job.setting, axis.low, axis.high)
        shapes: list[tuple[Key, TimeShape | None]] = [
            (("potential", index, "in_time"), item.in_time.body if item.in_time else None),
            (("potential", index, "path", "x"), item.path.x.body if item.path else None),
        ]
        of_time = [problem for key, shape in shapes if shape for problem in _in_time(job, key, shape)]
        yield from of_time
        if wrong:
            yield job.problem(where, *wrong)
        elif not of_time:
            yield from _term(job, where, item.term(job.setting), axis)


def too_fine(job: Job, axis: Axis) -> Iterator[Problem]:
    """Details of the potential that the points of `axis` cannot show."""
    for index, item in enumerate(job.keys.potential):
        detail = item.body.detail()
        if detail is None or detail[1] >= axis.spacing:
            continue
        points = math.ceil(axis.length / detail[1])
        said = f"this is finer than the grid, whose points are {job.write(axis.spacing, 'length')} apart"
        fix = f"give at least {points} points, or a wider one" if points <= MAX_POINTS else "give a wider one"
        yield job.problem(("potential", index, item.kind, detail[0]), said, fix)


def _in_time(job: Job, key: Key, shape: TimeShape) -> Iterator[Problem]:
    """What is wrong with a function of time during the run."""
    start, stop = job.evolve.start, job.evolve.until
    low, high = shape.span(job.units)
    if low > start or high < stop:
        yield job.problem(
            key,
            f"the table covers {job.write(low, 'time')} to {job.write(high, 'time')}, less than the run",
            "extend the table or shorten the run",
        )
        return
    value = shape.function(job.units, "number" if key[-1] == "in_time" else "length")
    for t in np.linspace(start, stop, TIMES):
        with np.errstate(all="ignore"):
            amount = value(float(t))
        if not abs(amount) < LARGEST:
            said = f"the function of time {_size(amount)} at t = {job.write(float(t), 'time')}"
            yield job.problem(key, said, "keep it finite over the whole run")
            return


def _term(job: Job, key: Key, term: Term, axis: Axis) -> Iterator[Problem]:
    """What is wrong with a term of the potential on the grid, during the run."""
    breaks = term.shape.breaks
    if breaks is not None and term.path is None:
        if np.all(breaks.positions >= axis.high) or np.all(breaks.positions <= axis.low):
            yield job.problem(key, "all its edges lie outside the grid", f"keep it within {span(job, axis)}")
        return
    x = np.linspace(axis.low, axis.high, PLACES)
    for t in np.linspace(job.evolve.start, job.evolve.until, INSTANTS) if term.moves else [job.evolve.start]:
        for what, field in (
            ("the potential", term.shape.value),
            ("the slope of the potential", term.shape.slope),
        ):
            with np.errstate(all="ignore"):
                values = np.broadcast_to(field(x[1:-1] - term.shift(t), t), PLACES - 2)
            bad = np.flatnonzero(~(np.abs(values) < LARGEST))
            if bad.size:
                at = f"x = {job.write(float(x[bad[0] + 1]), 'length')}"
                when = f", t = {job.write(float(t), 'time')}" if term.moves else ""
                said = f"{what} {_size(float(values[bad[0]]))} at {at}{when}"
                yield job.problem(key, said, "keep it finite over the whole grid")
                return


def _size(value: float) -> str:
    return f"is as large as {value:.1e}" if math.isfinite(value) else "is not finite"


def span(job: Job, axis: Axis) -> str:
    """From where to where the grid reaches, in words."""
    return f"{job.write(axis.low, 'length')} to {job.write(axis.high, 'length')}"
