"""What a job file can only be wrong about as a whole: things that do not fit each other."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from .grid import Axis
from .job import Job
from .misfit_terms import span, term_misfits, too_fine
from .models import Item
from .packets.base import Packet, PacketError
from .packets.file import FilePacket
from .problems import Problem, nearest, shown
from .reading.merging import Key
from .reading.quantities import QuantityError
from .reading.validation import problem_at
from .reading.yaml_tree import dotted
from .results import Column
from .settings import MAX_POINTS, Absorb

HEAD_ROOM = 1.25  # largest wave number of the grid over the largest of the packet, at the least
FINEST = 1e-11  # a spacing, over the distance from 0, below which places lose their digits
# Names of columns and files there are anyway, and of devices, which some file systems have instead of files.
RESERVED = (
    "time",
    "series",
    "results",
    "variants",
    "con",
    "prn",
    "aux",
    "nul",
    "com1",
    "com2",
    "lpt1",
    "lpt2",
)
SHORTEST = 1e-8  # a duration, over the time since 0, below which times lose their digits


def misfits(job: Job, lost: Sequence[Key] = ()) -> list[Problem]:
    """Everything in a job that does not fit together.

    `lost` are the paths of the file that could not be read; nothing is said about what rests on them.
    """
    found = [
        *_names(job),
        *_grid(job),
        *term_misfits(job, axis_as_written(job)),
        *_edges(job),
        *_packet(job, job.packet, ("packet", job.keys.packet.kind)),
        *_observables(job),
        *_evolution(job),
        *_pictures(job),
    ]
    if not {"observables", "edges"} & {path[0] for path in lost if path}:  # what results there are is known
        found += [*_stop_when(job), *_expectations(job)]
    gone = [dotted(path) for path in lost]
    return [p for p in found if not any(_within(p.key, key) or _within(key, p.key) for key in gone)]


def _within(key: str, outer: str) -> bool:
    return key == outer or key.startswith((f"{outer}.", f"{outer}["))


def axis_as_written(job: Job) -> Axis:
    """The x axis, with 8 points where their number is still to be chosen."""
    keys, ends = job.keys.grid.x, job.keys.edges.x
    points = keys.points or (math.ceil((keys.stop - keys.start) / keys.spacing) if keys.spacing else 8)
    transform = "sine" if "wall" in (ends.low, ends.high) else "periodic"
    return Axis("x", keys.start, keys.stop, points, "sine" if transform == "sine" else "periodic")


def _names(job: Job) -> Iterator[Problem]:
    """Columns, results and files must not share a name, not even where a file system takes A for a."""
    taken = {name: name for name in RESERVED}
    for index, observable in enumerate(job.observables):
        made = (*observable.figures(job.outline), *observable.columns(job.outline))
        own = getattr(observable, "name", "")
        names = {column.name for column in made} | ({own} if own else set())
        shared = sorted(name for name in names if name.lower() in taken)
        if shared:
            kind = job.keys.observables[index].kind if job.keys.observables else ""
            other = taken[shared[0].lower()]
            also = "" if other == shared[0] else f", and files cannot tell it from `{shared[0]}`"
            yield job.problem(
                ("observables", index, kind, "name") if own else ("observables", index),
                f"the name `{other}` is taken already{also}",
                "choose another `name:`" if own else "drop one of the two",
            )
        taken |= {name.lower(): name for name in names}


def _grid(job: Job) -> Iterator[Problem]:
    axis, keys = axis_as_written(job), job.keys.grid.x
    points = axis.points if keys.points or keys.spacing else 1000
    if axis.length / points < FINEST * max(abs(axis.low), abs(axis.high)):
        yield job.problem(
            ("grid", "x"),
            "the grid is so far from 0 that its places lose their digits",
            "move 0 nearer to the grid",
        )
    if keys.points or keys.spacing:
        yield from too_fine(job, axis)


def _edges(job: Job) -> Iterator[Problem]:
    axis, ends = axis_as_written(job), job.keys.edges.x
    layers = [end for end in (ends.low, ends.high) if isinstance(end, Absorb)]
    depths = [layer.absorb for layer in layers if isinstance(layer.absorb, float)]
    if sum(depths) > 0.8 * axis.length:
        taken, whole = job.write(sum(depths), "length"), job.write(axis.length, "length")
        said = f"the absorbing layers take {taken} of the {whole} of the grid"
        yield job.problem(("edges", "x"), said, "make them thinner or the grid longer")


def _packet(job: Job, packet: Packet, where: Key) -> Iterator[Problem]:
    """What keeps a packet from standing on the grid."""
    axis, keys = axis_as_written(job), job.keys.grid.x
    try:
        packet.check(job.particle.mass)
    except PacketError as error:
        yield job.problem(where, error.message, error.fix)
        return
    if isinstance(packet, FilePacket):
        places = packet.places(job.units)
        if places[0] < axis.low - axis.spacing or places[-1] > axis.high + axis.spacing:
            stored = f"{job.write(float(places[0]), 'length')} to {job.write(float(places[-1]), 'length')}"
            said = f"the stored field reaches from {stored}, the grid from {span(job, axis)}"
            yield job.problem((*where, "path"), said, "extend the grid")
        return
    extent = packet.extent()
    if extent and (extent[0] < axis.low or extent[1] > axis.high):
        needs = f"{job.write(extent[0], 'length')} to {job.write(extent[1], 'length')}"
        yield job.problem(
            where,
            f"the packet needs room from {needs} (6 sigma on both sides), the grid reaches from {span(job, axis)}",
            "move the packet, narrow it, or extend the grid",
        )
    k = packet.widest_wavenumber(job.particle.mass)
    if k is not None and (keys.points or keys.spacing) and k * HEAD_ROOM > axis.k_max:
        key = "points" if keys.points else "spacing"
        yield job.problem(
            ("grid", "x", key),
            f"the packet has wave numbers up to {job.write(k, 'wavenumber')}, the grid holds "
            f"{job.write(axis.k_max, 'wavenumber')}",
            _finer(job, k * HEAD_ROOM * axis.length / math.pi, axis, key),
        )


def _finer(job: Job, needed: float, axis: Axis, key: str) -> str:
    """What to write for a grid of `needed` points."""
    if needed > MAX_POINTS:
        return "make the packet slower or wider, or the grid shorter"
    points = math.ceil(needed)
    what = f"{points} points" if key == "points" else job.write(axis.length / points, "length")
    return f"give at {'least' if key == 'points' else 'most'} {what}, or leave `{key}` out"


def _observables(job: Job) -> Iterator[Problem]:
    axis = axis_as_written(job)
    for index, observable in enumerate(job.observables):
        kind = job.keys.observables[index].kind if job.keys.observables else ""
        wrong = observable.misplaced(axis)
        if wrong:
            yield job.problem(("observables", index, kind, wrong[0]), wrong[1], wrong[2])
        yield from _spaced(job, getattr(observable, "every", None), ("observables", index, kind, "every"))
        state = getattr(observable, "with_", None)
        if isinstance(state, Item):
            yield from _packet(job, state.body, ("observables", index, kind, "with", state.kind))


def _spaced(job: Job, every: float | None, key: Key) -> Iterator[Problem]:
    """A problem where the time between two is longer than the run."""
    duration = job.evolve.until - job.evolve.start
    if every is not None and every > duration * (1 + 1e-9):
        yield job.problem(key, f"`{key[-1]}` is longer than the run ({job.write(duration, 'time')})", "shorten it")


def _evolution(job: Job) -> Iterator[Problem]:
    evolve = job.evolve
    duration = evolve.until - evolve.start
    if duration < SHORTEST * max(abs(evolve.start), abs(evolve.until)):
        yield job.problem(
            ("evolve", "until"), "the run is so far from t = 0 that times lose their digits", "start at 0"
        )
        return
    if evolve.step is not None:
        steps = duration / evolve.step
        if evolve.step > duration * (1 + 1e-9):
            yield from _spaced(job, evolve.step, ("evolve", "step"))
            return
        if abs(steps - round(steps)) > 1e-6 * max(steps, 1):
            yield job.problem(
                ("evolve", "step"),
                f"the run is {steps:.6g} steps long, not a whole number of them",
                f"a step of {exact_time(job, duration / round(steps))} makes {round(steps)}",
            )
        if evolve.record is not None:
            per = evolve.record / evolve.step
            if abs(per - round(per)) > 1e-6 * per:
                yield job.problem(
                    ("evolve", "record"),
                    f"`record` is {per:.6g} steps long, not a whole number of them",
                    f"write {exact_time(job, max(round(per), 1) * evolve.step)}",
                )
    yield from _spaced(job, evolve.record, ("evolve", "record"))


def exact_time(job: Job, time: float) -> str:
    """A time to as many digits as make a whole number of steps."""
    return f"{job.units.to_file(time, 'time'):.10g} {job.units.label('time')}".rstrip()


def _stop_when(job: Job) -> Iterator[Problem]:
    for name, bound in job.evolve.stop_when.items():
        path: Key = ("evolve", "stop_when", name)
        column = job.columns.get(name)
        if column is None:
            message, fix = _unknown(name, "series column", list(job.columns))
            yield problem_at(job.document, path, message, fix, key=True)
            continue
        side = "below" if bound.below is not None else "above"
        yield from _value(job, (*path, side), getattr(bound, side), column)


def _pictures(job: Job) -> Iterator[Problem]:
    axis = axis_as_written(job)
    if job.keys.snapshots is not None:
        yield from _spaced(job, job.keys.snapshots.every, ("snapshots", "every"))
    if isinstance(job.keys.film, str):
        return
    yield from _spaced(job, job.keys.film.every, ("film", "every"))
    if job.keys.film.view is not None:
        view = job.keys.film.view.x
        if view.start < axis.low or view.stop > axis.high:
            key = "from" if view.start < axis.low else "to"
            said = f"the view reaches beyond the grid ({span(job, axis)})"
            yield job.problem(("film", "view", "x", key), said, "keep it within the grid")
        elif view.stop - view.start < 2 * axis.length / (axis.points if job.keys.grid.x.points else 1000):
            yield job.problem(("film", "view", "x"), "the view is narrower than two grid points", "widen it")


def _expectations(job: Job) -> Iterator[Problem]:
    for index, expect in enumerate(job.keys.expect):
        path: Key = ("expect", index)
        figure = job.figures.get(expect.result)
        if figure is None:
            yield job.problem((*path, "result"), *_unknown(expect.result, "result", list(job.figures)))
            continue
        wrong = [
            problem
            for key in ("equals", "tolerance", "below", "above")
            if getattr(expect, key) is not None
            for problem in _value(job, (*path, key), getattr(expect, key), figure)
        ]
        for place, value in enumerate(expect.within or []):
            wrong += _value(job, (*path, "within", place), value, figure)
        yield from wrong
        if wrong:
            continue
        if expect.tolerance is not None and job.units.read(expect.tolerance, figure.dimension) < 0:
            yield job.problem((*path, "tolerance"), "a tolerance below 0 is never met", "write 0 or more")
        if expect.within:
            low, high = (job.units.read(value, figure.dimension) for value in expect.within)
            if low > high:
                yield job.problem((*path, "within"), "the lowest value is above the highest", "swap them")


def _unknown(name: str, what: str, known: list[str]) -> tuple[str, str]:
    said = f"this job has no {what} {shown(name)}"
    begun = [k for k in known if k.startswith(f"{name}.")]
    near = nearest(name, known)
    if begun:
        return said, "there are: " + ", ".join(f"`{k}`" for k in begun)
    if near or not known:
        return said, f"did you mean `{near}`?" if near else "add an observable"
    return said, "there are: " + ", ".join(f"`{k}`" for k in known[:12]) + (", ..." if len(known) > 12 else "")


def _value(job: Job, path: Key, value: object, column: Column) -> Iterator[Problem]:
    """A problem where `value` is no quantity of the column's dimension."""
    try:
        job.units.read(value, column.dimension)  # type: ignore[arg-type]
    except QuantityError as error:
        yield job.problem(path, error.message, error.fix)
