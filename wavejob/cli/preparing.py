"""Jobs planned and weighed before any of them is run."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from itertools import groupby

from ..doubts import doubts
from ..families import told_once
from ..forecast import Forecast, forecast
from ..job import Job
from ..plan import Plan, make_plan
from ..problems import JobFileError, Problem
from .sizes import duration

MOST_PLANNED = 64  # variants of one file that are planned before any of them runs; the others resemble them


@dataclass(frozen=True)
class Ready:
    """A job that can run, what is doubtful about it, and what it will take.

    Variants keep no plan, which would take the memory of them all; where there are many, most have the
    forecast of a neighbour.
    """

    job: Job
    plan: Plan | None
    forecast: Forecast
    warnings: tuple[Problem, ...]


def prepare(
    jobs: Iterable[Job],
    memory: int | None,
    limit: float | None = None,
    *,
    bars: bool = True,
    film: bool = True,
) -> tuple[list[Ready], list[Problem]]:
    """Plans the jobs; what cannot be carried out, or needs more than `memory` bytes or `limit` seconds, becomes a
    problem. Of the variants of one file at most MOST_PLANNED are planned, evenly spread."""
    ready, problems = [], []
    for _, group in groupby(jobs, key=lambda job: (job.path, job.id)):
        several = list(group)
        planned, wrong = _planned(several, memory, limit, bars, film)
        count = len(_spread(len(several)))
        problems += told_once([(label(job), found) for job, found in wrong], count)
        if planned and not wrong:
            ready += _doubts_told_once(planned, count)
    return ready, problems


def label(job: Job) -> str:
    """What sets a variant apart; empty for a job that is not varied."""
    return ", ".join(map(str, job.variant))


def _planned(
    jobs: Sequence[Job], memory: int | None, limit: float | None, bars: bool, film: bool
) -> tuple[list[Ready], list[tuple[Job, list[Problem]]]]:
    """The variants of one file, or a job by itself."""
    chosen = _spread(len(jobs))
    ready: list[Ready] = []
    wrong: list[tuple[Job, list[Problem]]] = []
    for place, job in enumerate(jobs):
        if place not in chosen:
            if ready:
                ready.append(Ready(job, None, ready[-1].forecast, ()))
            continue
        try:
            plan = make_plan(job, memory)
        except JobFileError as error:
            wrong.append((job, error.problems))
            continue
        needed = forecast(plan, bars=bars, film=film)
        if limit is not None and needed.seconds > limit:
            wrong.append((job, [_too_long(plan, needed.seconds, limit)]))
        ready.append(Ready(job, plan if not job.variant else None, needed, tuple(doubts(plan))))
    return ready, wrong


def _spread(count: int) -> set[int]:
    """At most MOST_PLANNED places of `count`, first and last among them."""
    most = min(count, MOST_PLANNED)
    return {round(place * (count - 1) / max(most - 1, 1)) for place in range(most)}


def _doubts_told_once(ready: list[Ready], count: int) -> list[Ready]:
    """The same, with the doubts about all variants at the first of them."""
    told = told_once([(label(one.job), one.warnings) for one in ready], count)
    return [replace(one, warnings=tuple(told) if place == 0 else ()) for place, one in enumerate(ready)]


def _too_long(plan: Plan, needed: float, limit: float) -> Problem:
    """A run forecast to take longer than allowed."""
    return plan.job.problem(
        ("evolve",),
        f"{plan.steps} steps on {plan.axis.points} points take about {duration(needed)}, more than {duration(limit)}",
        "ask for less accuracy, shorten the run, or raise --limit",
    )
