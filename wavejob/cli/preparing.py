"""Jobs planned and weighed before any of them is run."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from ..doubts import doubts
from ..forecast import Forecast, forecast
from ..job import Job
from ..plan import Plan, make_plan
from ..problems import JobFileError, Problem


@dataclass(frozen=True)
class Ready:
    """A job that can run, what is doubtful about it, and what it will take."""

    job: Job
    plan: Plan
    forecast: Forecast
    warnings: tuple[Problem, ...]


def prepare(
    jobs: Iterable[Job], memory: int | None, *, bars: bool = True, film: bool = True
) -> tuple[list[Ready], list[Problem]]:
    """Plans every job; what cannot be carried out, or needs more than `memory` bytes, becomes a problem."""
    ready, problems = [], []
    for job in jobs:
        try:
            plan = make_plan(job, memory)
        except JobFileError as error:
            problems += error.problems
            continue
        ready.append(Ready(job, plan, forecast(plan, bars=bars, film=film), tuple(doubts(plan))))
    return ready, problems
