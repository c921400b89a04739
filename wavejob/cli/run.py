"""Run job files, or all job files of folders, one after another; what is up to date is not computed again."""

from __future__ import annotations

import time
from argparse import ArgumentParser, Namespace
from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..forecast import Forecast
from ..job import Job
from ..outputs.folder import RunFolder
from ..outputs.junit import Case, write_junit
from ..plan import Plan
from ..problems import JobFileError, Problem, RunError, in_order
from ..reader import Run
from ..reading.tree import shown
from ..standing import stands
from . import terminal
from .annotations import about, annotate, judged
from .arguments import add_not_yet, add_paths, add_reading
from .gathering import Gathered, doubled, gather, tally
from .json_report import job_entry, show_json
from .junit_cases import assertions, check_target, refused_cases
from .preparing import prepare
from .progress import log_line, watched
from .results import result_table
from .sizes import counted, duration

if TYPE_CHECKING:
    from ..run import Finished


@dataclass
class Task:
    """A job that is to be run, and how it ended. One that is up to date needs no plan."""

    job: Job
    runs: Path
    plan: Plan | None = None
    forecast: Forecast | None = None
    status: str = "not started"
    verdict: str | None = None
    seconds: float = 0.0
    error: str = ""  # why it could not be carried out

    @property
    def folder(self) -> RunFolder:
        return RunFolder(self.runs, self.job.id, self.job.fingerprint)

    @property
    def entry(self) -> dict[str, Any]:
        job, folder = self.job, shown(self.folder.path)
        return job_entry(
            job.id, job.fingerprint, self.status, folder=folder, verdict=self.verdict, forecast=self.forecast
        )


def add_arguments(parser: ArgumentParser) -> None:
    add_paths(parser)
    parser.add_argument(
        "--runs", type=Path, metavar="DIR", help="where runs are kept, instead of runs/ in the job tree"
    )
    parser.add_argument("--again", action="store_true", help="compute again what is there already")
    parser.add_argument("--quick", action="store_true", help="no error bars")
    parser.add_argument("--no-film", action="store_true", help="draw no film")
    parser.add_argument(
        "--junit", type=Path, metavar="FILE", help="write what became of each job as JUnit XML, for code hosts"
    )
    add_reading(parser)
    add_not_yet(parser, "--workers", "--by", "--checkpoint", "--on")


def run(options: Namespace) -> int:
    check_target(options)
    started = datetime.now(UTC)
    found = gather(options)
    if options.runs:
        found.problems += doubled(found.jobs)
    tasks, warnings = _tasks(found, options)
    if found.problems:
        if options.junit:
            write_junit(options.junit, refused_cases(found.problems, found.jobs), started)
        return _refused(found, options)
    if not options.quiet:
        for warning in warnings:
            terminal.say(warning.text())
    annotate(warnings, quiet=options.quiet)
    try:
        for task in tasks:
            _carry_out(task, options)
    except KeyboardInterrupt as stop:
        _told(tasks, warnings, options, started)
        raise type(stop)(_kept(tasks)) from None
    _told(tasks, warnings, options, started)
    if len(tasks) > 1 and not options.quiet:
        terminal.say(_summary(tasks))
    return _exit_code(tasks, strict=options.strict, warned=bool(warnings))


def _tasks(found: Gathered, options: Namespace) -> tuple[list[Task], list[Problem]]:
    """What is to be run, the most urgent first, and doubts about it; mistakes are added to those found."""
    tasks = [Task(job, options.runs or job.tree.root / "runs") for job in found.jobs]
    by_job = {id(task.job): task for task in tasks}
    bars, film = not options.quick, not options.no_film
    fresh = [t.job for t in tasks if options.again or not stands(t.job, t.folder, bars=bars, film=film)]
    ready, refused = prepare(fresh, options.memory, options.limit, bars=bars, film=film)
    found.problems += refused
    for one in ready:
        task = by_job[id(one.job)]
        task.plan, task.forecast = one.plan, one.forecast
    if not found.problems:
        try:
            for tree in {task.job.tree for task in tasks}:
                tree.runs_folder(options.runs)
        except JobFileError as error:
            found.problems += error.problems
    warnings = in_order(warning for one in ready for warning in one.warnings)
    return sorted(tasks, key=lambda task: -task.job.keys.priority), warnings


def _told(tasks: list[Task], warnings: list[Problem], options: Namespace, started: datetime) -> None:
    """What programs read of a batch that has ended."""
    if options.format == "json":
        show_json("run", warnings, [task.entry for task in tasks])
    if options.junit:
        write_junit(options.junit, [_case(task, strict=options.strict) for task in tasks], started)


def _case(task: Task, *, strict: bool) -> Case:
    case = Case(task.job.id, shown(task.job.path), task.seconds, error=task.error)
    if task.status in ("done", "up to date"):
        return replace(case, assertions=assertions(Run(task.folder.path).document, strict=strict))
    return case if task.error else replace(case, skipped=task.status)


def _refused(found: Gathered, options: Namespace) -> int:
    problems = in_order(found.problems)
    annotate(problems)
    if options.format == "json":
        show_json("run", problems, [])
        return 2
    for problem in problems:
        terminal.say(problem.text())
    if not options.quiet:
        terminal.say(f"{counted(found.files, 'job file')} read: {tally(problems)}; nothing was started")
    return 2


def _carry_out(task: Task, options: Namespace) -> None:
    """Runs one job; its failure is told and noted, and does not stop the others."""
    begun = time.monotonic()
    if task.forecast and not options.quiet and not terminal.is_live():
        log_line(f"{task.job.id}: started, about {duration(task.forecast.seconds)}")
    task.status = "stopped"  # unless it ends below
    try:
        finished = _run(task, options)
    except JobFileError as error:
        _failed(task, str(error), error.problems)
        return
    except RunError as error:
        _failed(task, str(error))
        return
    except MemoryError:
        _failed(task, "the memory is used up; take fewer points, or stop other programs")
        return
    except Exception as error:
        from .bugs import report

        task.status, task.verdict = "failed", "failed"
        task.error = f"an error inside wavejob ({type(error).__name__}: {error})"
        report(error, verbose=options.verbose, doing=task.job.id)
        return
    finally:
        task.seconds = time.monotonic() - begun
    task.status, task.verdict, task.plan = finished.status, finished.verdict, None
    if not options.quiet:
        _say_ended(task)
    if options.format == "text":
        _show(task)
    annotate(judged(task.job, Run(task.folder.path).document), quiet=options.quiet)


def _failed(task: Task, said: str, problems: Sequence[Problem] = ()) -> None:
    """Notes and tells why a job could not be carried out."""
    task.status, task.verdict, task.error = "failed", "failed", said
    terminal.say(f"{task.job.id}: {said}")
    annotate(problems or [about(task.job, said)])


def _run(task: Task, options: Namespace) -> Finished:
    from ..run import run_job  # here, because it loads the transforms, which a refused job never needs

    with watched(task.job, quiet=options.quiet) as watcher:
        return run_job(
            task.job,
            task.runs,
            again=options.again,
            bars=not options.quick,
            film=not options.no_film,
            plan=task.plan,
            progress=watcher.step,
            film_progress=watcher.frame,
        )


def _show(task: Task) -> None:
    job = task.job
    title = f"{job.id}: {job.title}" if job.title != job.id else job.id
    terminal.show(result_table(title, shown(task.folder.path), Run(task.folder.path)))


def _say_ended(task: Task) -> None:
    said = f"{task.job.id}: {task.status}, {task.verdict}"
    if task.status == "done":
        said += f", {duration(task.seconds)}"
    if terminal.is_live():
        terminal.say(said)
    else:
        log_line(said)


def _kept(tasks: list[Task]) -> str:
    """What is left of a batch that was stopped."""
    kept = sum(task.status in ("done", "up to date") for task in tasks)
    cut = next((task for task in tasks if task.status == "stopped"), None)
    said = f"stopped: {counted(kept, 'job')} of {len(tasks)} finished and kept"
    if cut is not None:
        said += f"; {cut.job.id} was cut short and starts anew next time"
    return said


def _summary(tasks: list[Task]) -> str:
    verdicts = [task.verdict for task in tasks]
    listed = [f"{verdicts.count(v)} {v}" for v in ("trusted", "doubtful", "failed") if v in verdicts]
    return f"{counted(len(tasks), 'job')}: {', '.join(listed)}"


def _exit_code(tasks: list[Task], *, strict: bool, warned: bool) -> int:
    """1 where a job failed, an expectation was missed or is undecided; with `strict` for any doubt."""
    if any(task.verdict == "failed" or _undecided(task) for task in tasks):
        return 1
    return 1 if strict and (warned or any(task.verdict == "doubtful" for task in tasks)) else 0


def _undecided(task: Task) -> bool:
    if task.verdict != "doubtful":
        return False
    return any(entry["outcome"] == "undecided" for entry in Run(task.folder.path).document["expectations"])
