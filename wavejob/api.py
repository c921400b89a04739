"""What `import wavejob` offers: the commands as functions."""

from __future__ import annotations

from pathlib import Path

from .evidence.assess import assess
from .families import Family, load_family
from .job import Job
from .loading import load
from .plan import make_plan
from .reader import Run, open_run
from .run import Finished, run_job
from .simulate import Record
from .simulate import simulate as simulate_plan
from .variants import Sweep

__all__ = ["Family", "Finished", "Record", "Run", "load", "load_family", "open_run", "run", "run_family", "simulate"]


def simulate(job: Job, *, bars: bool = False) -> Record:
    """Carries out `job` in memory, with its error bars where `bars` is set. Nothing is written.

    Raises JobFileError where it cannot be planned, RunError for values that are not finite.
    """
    plan = make_plan(job)
    return assess(plan).record if bars else simulate_plan(plan)


def run(
    job: Job, runs: str | Path | None = None, *, again: bool = False, bars: bool = True, film: bool = True
) -> Finished:
    """Carries out `job` into its folder below `runs`, unless that is there already.

    `runs` is runs/ in the job tree if left out. `again` computes anew; without `bars` or `film` these
    are left out. Raises JobFileError and RunError.
    """
    folder = job.tree.runs_folder(Path(runs) if runs is not None else None)
    return run_job(job, folder, again=again, bars=bars, film=film)


def run_family(
    family: Family, runs: str | Path | None = None, *, again: bool = False, bars: bool = True, film: bool = True
) -> list[Finished]:
    """Carries out every variant of a varied job as `run` does, then writes variants.csv and its pictures."""
    folder = family.jobs[0].tree.runs_folder(Path(runs) if runs is not None else None)
    finished = [run_job(job, folder, again=again, bars=bars, film=film) for job in family.jobs]
    if family.is_varied:
        sweep = Sweep(family, folder)
        sweep.note_all()
        sweep.write()
        sweep.draw()
    return finished
