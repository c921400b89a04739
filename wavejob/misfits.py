"""What a job file can only be wrong about as a whole: things that do not fit each other."""

from __future__ import annotations

import math
from collections.abc import Iterator

from .grid import Axis
from .job import Job
from .packets.file import FilePacket
from .problems import Problem, nearest
from .reading.merging import Key
from .reading.quantities import QuantityError
from .results import Column
from .settings import Absorb
from .time_shapes import TimeShape

HEAD_ROOM = 1.25  # largest wave number of the grid over the largest of the packet, at the least


def misfits(job: Job) -> list[Problem]:
    """Everything in a job that does not fit together."""
    return [
        *_names(job),
        *_potential(job),
        *_edges(job),
        *_packet(job),
        *_observables(job),
        *_evolution(job),
        *_expectations(job),
    ]


def axis_as_written(job: Job) -> Axis:
    """The x axis, with 8 points where their number is still to be chosen."""
    keys, ends = job.keys.grid.x, job.keys.edges.x
    points = keys.points or (math.ceil((keys.stop - keys.start) / keys.spacing) if keys.spacing else 8)
    transform = "sine" if "wall" in (ends.low, ends.high) else "periodic"
    return Axis("x", keys.start, keys.stop, points, "sine" if transform == "sine" else "periodic")


def _names(job: Job) -> Iterator[Problem]:
    """Columns, results and files must not share a name."""
    taken: set[str] = set()
    for index, observable in enumerate(job.observables):
        made = (*observable.figures(job.outline), *observable.columns(job.outline))
        names = {column.name for column in made} | {getattr(observable, "name", "")} - {""}
        if names & taken:
            yield job.problem(
                ("observables", index),
                f"another observable already yields `{min(names & taken)}`",
                "give it another `name:`, or drop one of the two",
            )
        taken |= names


def _potential(job: Job) -> Iterator[Problem]:
    axis = axis_as_written(job)
    start, stop = job.evolve.start, job.evolve.until
    for index, item in enumerate(job.keys.potential):
        wrong = item.body.misfit(job.setting, axis.low, axis.high)
        if wrong:
            yield job.problem(("potential", index, item.kind), *wrong)
        shapes: list[tuple[Key, TimeShape | None]] = [
            (("in_time",), item.in_time.body if item.in_time else None),
            (("path", "x"), item.path.x.body if item.path else None),
        ]
        for key, shape in shapes:
            if shape is None:
                continue
            low, high = shape.span(job.units)
            if low > start or high < stop:
                yield job.problem(
                    ("potential", index, *key),
                    f"the table covers {job.write(low, 'time')} to {job.write(high, 'time')}, less than the run",
                    "extend the table or shorten the run",
                )


def _edges(job: Job) -> Iterator[Problem]:
    axis, ends = axis_as_written(job), job.keys.edges.x
    depths = [end.absorb if isinstance(end, Absorb) else 0.0 for end in (ends.low, ends.high)]
    if sum(depths) > 0.8 * axis.length:
        yield job.problem(("edges", "x"), "the absorbing layers fill the grid", "make them thinner or the grid longer")


def _packet(job: Job) -> Iterator[Problem]:
    axis, packet, kind = axis_as_written(job), job.packet, job.keys.packet.kind
    where = ("packet", kind)
    extent = packet.extent()
    if isinstance(packet, FilePacket):
        places = packet.places(job.units)
        if places[0] < axis.low - axis.spacing or places[-1] > axis.high + axis.spacing:
            yield job.problem(where, "the stored field is wider than the grid", "extend the grid")
        return
    if extent and (extent[0] < axis.low or extent[1] > axis.high):
        yield job.problem(
            where,
            f"the packet needs room from {job.write(extent[0], 'length')} to {job.write(extent[1], 'length')} "
            f"(6 sigma on both sides), the grid spans {job.write(axis.low, 'length')} to "
            f"{job.write(axis.high, 'length')}",
            "move the packet, narrow it, or extend the grid",
        )
    k = packet.widest_wavenumber(job.particle.mass)
    keys = job.keys.grid.x
    if k is not None and (keys.points or keys.spacing) and k * HEAD_ROOM > axis.k_max:
        needed = math.ceil(k * HEAD_ROOM * axis.length / math.pi)
        yield job.problem(
            ("grid", "x", "points" if keys.points else "spacing"),
            f"the packet has wave numbers up to {job.write(k, 'wavenumber')}, the grid holds "
            f"{job.write(axis.k_max, 'wavenumber')}",
            f"give at least {needed} points, or leave `points` out",
        )


def _observables(job: Job) -> Iterator[Problem]:
    axis = axis_as_written(job)
    for index, observable in enumerate(job.observables):
        wrong = observable.misplaced(axis)
        if wrong:
            kind = job.keys.observables[index].kind if job.keys.observables else ""
            yield job.problem(("observables", index, kind, wrong[0]), wrong[1], wrong[2])
        every = getattr(observable, "every", None)
        if every is not None and every > job.evolve.until - job.evolve.start:
            yield job.problem(("observables", index), "`every` is longer than the run", "shorten it")


def _evolution(job: Job) -> Iterator[Problem]:
    evolve = job.evolve
    duration = evolve.until - evolve.start
    if evolve.step is not None:
        steps = duration / evolve.step
        if steps > 2**40:
            yield job.problem(("evolve", "step"), f"{steps:.3g} steps are needed", "give a larger step or leave it out")
        elif abs(steps - round(steps)) > 1e-6 * max(steps, 1):
            near = max(round(steps), 1)
            yield job.problem(
                ("evolve", "step"),
                f"`until` is not a whole number of steps ({steps:.6g})",
                f"a step of {job.units.write(duration / near, 'time')} gives {near}",
            )
        if evolve.record is not None:
            per = evolve.record / evolve.step
            if per < 1 - 1e-9 or abs(per - round(per)) > 1e-6 * per:
                yield job.problem(
                    ("evolve", "record"),
                    f"`record` is not a whole number of steps ({per:.6g})",
                    f"write {job.units.write(max(round(per), 1) * evolve.step, 'time')}",
                )
    if evolve.record is not None and evolve.record > duration:
        yield job.problem(("evolve", "record"), "`record` is longer than the run", "shorten it")
    for name, bound in evolve.stop_when.items():
        path: Key = ("evolve", "stop_when", name)
        column = job.columns.get(name)
        if column is None:
            yield job.problem(path, *_unknown(name, "series column", list(job.columns)))
            continue
        side = "below" if bound.below is not None else "above"
        yield from _value(job, (*path, side), getattr(bound, side), column)
    if not isinstance(job.keys.film, str) and job.keys.film.view is not None:
        view, axis = job.keys.film.view.x, axis_as_written(job)
        if view.start < axis.low or view.stop > axis.high:
            yield job.problem(("film", "view", "x"), "the view reaches beyond the grid", "keep it within the grid")


def _expectations(job: Job) -> Iterator[Problem]:
    for index, expect in enumerate(job.keys.expect):
        path: Key = ("expect", index)
        figure = job.figures.get(expect.result)
        if figure is None:
            yield job.problem((*path, "result"), *_unknown(expect.result, "result", list(job.figures)))
            continue
        for key in ("equals", "tolerance", "below", "above"):
            if getattr(expect, key) is not None:
                yield from _value(job, (*path, key), getattr(expect, key), figure)
        for place, value in enumerate(expect.within or []):
            yield from _value(job, (*path, "within", place), value, figure)


def _unknown(name: str, what: str, known: list[str]) -> tuple[str, str]:
    near = nearest(name, known)
    listed = ", ".join(f"`{k}`" for k in known[:12]) + (", ..." if len(known) > 12 else "")
    return f"this job has no {what} `{name}`", f"did you mean `{near}`?" if near else f"there are: {listed}"


def _value(job: Job, path: Key, value: object, column: Column) -> Iterator[Problem]:
    """A problem where `value` is no quantity of the column's dimension."""
    try:
        job.units.read(value, column.dimension)  # type: ignore[arg-type]
    except QuantityError as error:
        yield job.problem(path, error.message, error.fix)
