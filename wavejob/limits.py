"""What is refused before anything large is begun: more memory than there is, endless runs."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from .evolve.schedule import Schedule
from .job import Job
from .machine import memory
from .observables.densities import Density
from .problems import JobFileError, Problem
from .reading.merging import Key

MOST_STEPS = 10**11
STEP_SECONDS = 1e-5  # of one step on a small grid, at the least
POINT_BYTES = 3500  # held per grid point while the step is chosen, which tries many packets at once: measured
BYTES_TO_START = 100 * 2**20  # Python and the libraries

FIELD_BYTES = 16  # a complex number; a density takes half of it
FRAME_POINTS, FRAME_BYTES = 8192, 8  # a frame is thinned to at most so many places, density and phase
ROW_BYTES = 100  # of each value of a row of the time series, and of the row itself
SAMPLE_BYTES = 200  # of what is integrated over time, for each observable that is
SAMPLED = ("crossing", "autocorrelation", "ehrenfest", "arrival", "dwell", "transmission", "spectrum")


@dataclass(frozen=True)
class Need:
    """Memory for one thing, and the key that decides how much."""

    size: float  # bytes
    what: str
    key: Key
    cure: str


def refuse_grid(job: Job, points: int, allowed: int | None = None) -> None:
    """Raises JobFileError where `points` do not fit in `allowed` bytes (default: what there is)."""
    _refuse(job, [grid_need(job, points)], allowed)


def grid_need(job: Job, points: int) -> Need:
    """The memory for the grid itself."""
    keys = job.keys.grid.x
    key = "points" if keys.points else "spacing" if keys.spacing else ""
    where: Key = ("grid", "x", key) if key else ("grid", "x")
    chosen = "" if key else ", as many as the packet and the potential ask for,"
    cure = "take fewer points" if key else "shorten the grid"
    return Need(POINT_BYTES * points, f"{points} points{chosen}", where, cure)


def refuse_steps(job: Job, steps: float) -> None:
    """Raises JobFileError where there are more steps than anyone waits for."""
    if steps > MOST_STEPS:
        key, cure = _cause(job)
        said = f"the run has {steps:.1e} steps, which take {_years(steps * STEP_SECONDS)} at the least"
        raise JobFileError([job.problem(key, said, cure)])


def refuse_spacings(job: Job, step: float) -> None:
    """Raises JobFileError where less than a step lies between two frames, stored fields or densities."""
    short = [key for key, every in _spacings(job) if every < 0.999 * step]
    if short:
        said = f"this is shorter than a time step, {job.write(step, 'time')}"
        fix = "take a longer time, or fix a shorter `evolve.step`"
        raise JobFileError([job.problem(key, said, fix) for key in short])


def _cause(job: Job) -> tuple[Key, str]:
    """The key that makes a run so long, and what to do about it."""
    evolve = job.evolve
    if evolve.step is not None:
        return ("evolve", "step"), "take a larger step"
    if evolve.record is not None and (evolve.until - evolve.start) / evolve.record > MOST_STEPS:
        return ("evolve", "record"), "record less often"
    return ("evolve", "until"), "end it earlier, or ask for less accuracy"


def shortest_spacing(job: Job) -> float:
    """The shortest time between two frames, stored fields or densities that the job asks for; infinity without any."""
    return min((every for _, every in _spacings(job)), default=math.inf)


def _spacings(job: Job) -> Iterator[tuple[Key, float]]:
    """The times between two frames, stored fields and densities that the job asks for, and their keys."""
    if not isinstance(job.keys.film, str) and job.keys.film.every is not None:
        yield ("film", "every"), job.keys.film.every
    if job.keys.snapshots is not None:
        yield ("snapshots", "every"), job.keys.snapshots.every
    for index, item in enumerate(job.keys.observables or []):
        if isinstance(item.body, Density) and item.body.every is not None:
            yield ("observables", index, item.kind, "every"), item.body.every


def refuse_run(
    job: Job,
    points: int,
    recorded: Schedule,
    sampled: Schedule,
    frames: Schedule | None,
    step: float,
    allowed: int | None,
) -> None:
    """Raises JobFileError where what a run keeps does not fit in `allowed` bytes (default: what there is)."""
    _refuse(job, needs(job, points, recorded, sampled, frames, step), allowed)


def needs(
    job: Job, points: int, recorded: Schedule, sampled: Schedule, frames: Schedule | None, step: float
) -> list[Need]:
    """The memory for all that a run holds and keeps."""
    return [grid_need(job, points), *_kept(job, points, recorded, sampled, frames, step)]


def total(needs: list[Need]) -> float:
    """Bytes for all of `needs` and for the program itself."""
    return BYTES_TO_START + sum(need.size for need in needs)


def _kept(
    job: Job, points: int, recorded: Schedule, sampled: Schedule, frames: Schedule | None, step: float
) -> Iterator[Need]:
    """The memory for what is kept until the end of the run."""
    rows = _count(recorded)
    key: Key = ("evolve", "record") if job.evolve.record is not None else ("evolve", "until")
    yield Need(rows * ROW_BYTES * (1 + len(job.columns)), f"{rows} recorded times", key, "record less often")
    users = sum(item.kind in SAMPLED for item in job.keys.observables or [])
    samples = _count(sampled)
    yield Need(
        samples * SAMPLE_BYTES * users,
        f"{samples} samples of integrals over time",
        ("observables",),
        "drop some",
    )
    if frames is not None:
        count, kept = _count(frames), min(points, FRAME_POINTS)
        yield Need(count * kept * FRAME_BYTES, f"{count} frames of the film", ("film", "every"), "take fewer frames")
    if job.keys.snapshots is not None:
        count = _count(_every(job.keys.snapshots.every, step, recorded.last))
        what = f"{count} stored fields of {points} points"
        yield Need(count * points * FIELD_BYTES, what, ("snapshots", "every"), "store fewer")
    for index, observable in enumerate(job.observables):
        if isinstance(observable, Density):
            count = _count(_every(observable.every, step, recorded.last) if observable.every else recorded)
            what = f"{count} stored densities of {points} points"
            kind = job.keys.observables[index].kind if job.keys.observables else ""
            where = ("observables", index, kind, "every")
            yield Need(count * points * FIELD_BYTES / 2, what, where, "store fewer")


def _every(time: float, step: float, steps: int) -> Schedule:
    return Schedule(max(round(time / step), 1), steps)


def _count(schedule: Schedule) -> int:
    return -(-schedule.last // schedule.every) + 1


def _refuse(job: Job, needs: list[Need], allowed: int | None) -> None:
    limit = memory() if allowed is None else allowed
    if total(needs) > limit:
        most = max(needs, key=lambda need: need.size)
        raise JobFileError([_too_much(job, most, total(needs), limit)])


def _too_much(job: Job, most: Need, taken: float, limit: int) -> Problem:
    said = f"{most.what} take {readable(most.size)} of memory"
    if taken > 1.1 * most.size:
        said += f", and the job {readable(taken)} in all"
    said += f", but {readable(limit)} may be used"
    return job.problem(most.key, said, f"{most.cure}, or allow more with --memory")


def readable(size: float) -> str:
    """Bytes as a person reads them."""
    for unit in ("bytes", "KiB", "MiB", "GiB", "TiB"):
        if size < 1024:
            return f"{size:.3g} {unit}"
        size /= 1024
    return f"{size:.3g} PiB"


def _years(seconds: float) -> str:
    days = seconds / 86400
    return f"{days:.3g} days" if days < 1000 else f"{days / 365.25:.3g} years"
