"""Jobs planned and weighed before any of them is run."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from ..doubts import doubts
from ..forecast import Forecast, forecast
from ..job import Job
from ..plan import Plan, make_plan
from ..problems import JobFileError, Problem
from .sizes import duration


@dataclass(frozen=True)
class Ready:
    """A job that can run, what is doubtful about it, and what it will take."""

    job: Job
    plan: Plan
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
    """Plans every job; what cannot be carried out, or needs more than `memory` bytes or `limit` seconds, becomes a
    problem."""
    ready, problems = [], []
    for job in jobs:
        try:
            plan = make_plan(job, memory)
        except JobFileError as error:
            problems += error.problems
            continue
        needed = forecast(plan, bars=bars, film=film)
        if limit is not None and needed.seconds > limit:
            problems.append(_too_long(plan, needed.seconds, limit))
        ready.append(Ready(job, plan, needed, tuple(doubts(plan))))
    return ready, problems


def _too_long(plan: Plan, needed: float, limit: float) -> Problem:
    """A run forecast to take longer than allowed."""
    return plan.job.problem(
        ("evolve",),
        f"{plan.steps} steps on {plan.axis.points} points take about {duration(needed)}, more than {duration(limit)}",
        "ask for less accuracy, shorten the run, or raise --limit",
    )
