"""What `wavejob run` has to do: one task a job, and what the variants of a file are shown as."""

from __future__ import annotations

from argparse import Namespace
from collections import Counter
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from ..families import Family
from ..forecast import Forecast
from ..job import Job
from ..night.queue import Order
from ..outputs.folder import RunFolder
from ..plan import Plan
from ..problems import JobFileError, Problem, in_order
from ..reading.tree import shown
from ..standing import stands
from .gathering import Gathered
from .json_report import job_entry
from .preparing import prepare

ENDED = ("done", "up to date", "failed")


@dataclass(eq=False)
class Task:
    """A job that is to be run, and how it ended. One that is up to date needs no plan."""

    job: Job
    runs: Path
    family: Family
    index: int  # among the variants of its file
    name: str  # no other task has it
    plan: Plan | None = None
    forecast: Forecast | None = None
    status: str = "not started"
    verdict: str | None = None
    took: float = 0.0  # seconds
    error: str = ""  # why it could not be carried out

    @property
    def folder(self) -> RunFolder:
        return RunFolder(self.runs, self.job.id, self.job.fingerprint)

    @property
    def seconds(self) -> float:
        """Forecast."""
        return self.forecast.seconds if self.forecast else 0.0

    @property
    def entry(self) -> dict[str, Any]:
        """What `--format json` says of it."""
        job, folder = self.job, shown(self.folder.path)
        return job_entry(
            job.id,
            job.fingerprint,
            self.status,
            folder=folder,
            verdict=self.verdict,
            forecast=self.forecast,
            variant={one.key: one.text for one in job.variant},
        )

    def stands(self, options: Namespace) -> bool:
        """Whether all that is wanted is in its folder, and is not to be computed again."""
        bars, film = not options.quick, not options.no_film
        return not options.again and stands(self.job, self.folder, bars=bars, film=film)

    def end(self, status: str, verdict: str, *, error: str = "") -> None:
        """Notes how it ended; its plan is needed no longer."""
        self.status, self.verdict, self.error, self.plan = status, verdict, error, None

    def order(self, number: int, options: Namespace) -> Order:
        """The same for a worker."""
        job, needed = self.job, self.forecast
        return Order(
            number=number,
            name=self.name,
            path=job.path,
            tree=job.tree,
            variant=self.index,
            fingerprint=job.fingerprint,
            runs=self.runs,
            again=options.again,
            bars=not options.quick,
            film=not options.no_film,
            trust=options.trust_paths,
            priority=job.keys.priority,
            seconds=self.seconds,
            memory=needed.memory if needed else 0,
        )


def make_tasks(found: Gathered, options: Namespace) -> tuple[list[Task], list[Problem]]:
    """What is to be run, the most urgent first, and doubts about it; mistakes are added to those found.

    Variants that are the same job make one task. With `--skip-bad` what has a mistake is left out.
    """
    tasks: dict[Path, Task] = {}
    shared = Counter(family.id for family in found.families)
    for family in found.families:
        for index, job in enumerate(family.jobs):
            name = job.name if shared[job.id] == 1 else f"{shown(job.path)}: {job.name}"
            task = Task(job, options.runs or job.tree.root / "runs", family, index, name)
            tasks.setdefault(task.folder.path, task)
    fresh = {id(task.job): task for task in tasks.values() if not task.stands(options)}
    jobs, bars, film = [task.job for task in fresh.values()], not options.quick, not options.no_film
    ready, refused = prepare(jobs, options.memory, options.limit, bars=bars, film=film)
    found.problems += refused
    for one in ready:
        task = fresh.pop(id(one.job))
        task.plan, task.forecast = one.plan, one.forecast
    good = [task for task in tasks.values() if id(task.job) not in fresh]
    if not found.problems or (options.skip_bad and good):
        try:
            for tree in {task.job.tree for task in good}:
                tree.runs_folder(options.runs)
        except JobFileError as error:
            found.problems += error.problems
            good = []
    warnings = in_order(warning for one in ready for warning in one.warnings)
    return sorted(good, key=lambda task: -task.job.keys.priority), warnings
