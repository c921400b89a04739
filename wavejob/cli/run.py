"""Run job files, or all job files of folders; what is up to date is not computed again."""

from __future__ import annotations

import time
from argparse import ArgumentParser, ArgumentTypeError, Namespace
from collections.abc import Callable, Sequence
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

from ..machine import cores
from ..outputs.junit import Case, write_junit
from ..problems import JobFileError, Problem, RunError, in_order
from ..reader import Run
from ..reading.tree import shown
from . import terminal
from .annotations import about, annotate, judged
from .arguments import add_not_yet, add_paths, add_reading
from .batch import run_batch, status_of
from .gathering import Gathered, doubled, gather, tally
from .json_report import show_json
from .junit_cases import assertions, check_target, refused_cases
from .progress import log_line, watched
from .results import result_table
from .sizes import counted, duration
from .sweeps import write_sweep
from .tasks import ENDED, Task, make_tasks

if TYPE_CHECKING:
    from ..run import Finished


MOST_WORKERS = 1024


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
    parser.add_argument(
        "--workers", type=_workers, metavar="N", help="jobs carried out at once; as many as cores if left out"
    )
    parser.add_argument("--skip-bad", action="store_true", help="run the good job files beside others with mistakes")
    add_reading(parser)
    add_not_yet(parser, "--by", "--checkpoint", "--on")


def _workers(text: str) -> int:
    if not text.isascii() or not text.isdigit() or not 1 <= int(text) <= MOST_WORKERS:
        raise ArgumentTypeError(f"`{text}` is no number of workers; write a whole number from 1 to {MOST_WORKERS}")
    return int(text)


def run(options: Namespace) -> int:
    check_target(options)
    started = datetime.now(UTC)
    found = gather(options)
    if options.runs:
        found.problems += doubled(found.families)
    tasks, warnings = make_tasks(found, options)
    if found.problems and not (options.skip_bad and tasks):
        if options.junit:
            write_junit(options.junit, refused_cases(found.problems, found.jobs), started)
        return _refused(found, options)
    _say_first(found.problems, warnings, options)
    problems = in_order(found.problems + warnings)
    try:
        _carry_out_all(tasks, options)
    except KeyboardInterrupt as stop:
        _told(tasks, problems, options, started)
        raise type(stop)(_kept(tasks)) from None
    _told(tasks, problems, options, started)
    if len(tasks) > 1 and not options.quiet:
        terminal.say(_summary(tasks))
    code = _exit_code(tasks, strict=options.strict, warned=bool(warnings))
    return 1 if found.problems else code


def _say_first(mistakes: Sequence[Problem], warnings: Sequence[Problem], options: Namespace) -> None:
    """Mistakes of files that are skipped, and doubts about the others."""
    if options.format == "text":
        for problem in mistakes:
            terminal.say(problem.text())
    if not options.quiet:
        for warning in warnings:
            terminal.say(warning.text())
    annotate([*mistakes, *warnings], quiet=options.quiet)


def _carry_out_all(tasks: list[Task], options: Namespace) -> None:
    """One after another in this process, or in several; then the variants of each file side by side."""
    families: dict[int, list[Task]] = {}
    for task in tasks:
        if task.family.is_varied:
            families.setdefault(id(task.family), []).append(task)

    def ended(task: Task) -> None:
        if task.status != "failed":
            annotate(judged(task.job, Run(task.folder.path).document), quiet=options.quiet)
        variants = families.get(id(task.family))
        if variants is None:
            if options.format == "text" and task.status != "failed":
                _show(task)
        elif all(one.status in ENDED for one in variants):
            write_sweep(families.pop(id(task.family)), show=options.format == "text")

    workers = min(options.workers or cores(), len(tasks))
    try:
        if workers > 1:
            run_batch(tasks, workers, options, ended)
        else:
            _one_by_one(tasks, options, ended)
    finally:
        for variants in families.values():  # of a batch that was stopped
            write_sweep(variants, show=False)


def _one_by_one(tasks: list[Task], options: Namespace, ended: Callable[[Task], None]) -> None:
    """In this process; how far several jobs are is written to status.json."""
    status = status_of(tasks, 1)
    try:
        for task in tasks:
            if len(tasks) > 1:
                status.start(task.name)
            _carry_out(task, options)
            if len(tasks) > 1 and task.status == "failed":
                status.fail(task.name, task.error)
            elif len(tasks) > 1:
                status.end(task.name, task.took if task.status == "done" else None)
            ended(task)
    except KeyboardInterrupt:
        if len(tasks) > 1:
            status.running.clear()
            status.write(stopped=True)
        raise


def _told(tasks: list[Task], problems: list[Problem], options: Namespace, started: datetime) -> None:
    """What programs read of a batch that has ended."""
    if options.format == "json":
        show_json("run", problems, [task.entry for task in tasks])
    if options.junit:
        skipped = refused_cases([p for p in problems if p.severity == "error"], [])
        cases = [_case(task, strict=options.strict) for task in tasks]
        write_junit(options.junit, [*skipped, *cases], started)


def _case(task: Task, *, strict: bool) -> Case:
    case = Case(task.name, shown(task.job.path), task.took, error=task.error)
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
        log_line(f"{task.name}: started, about {duration(task.seconds)}")
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

        task.end("failed", "failed", error=f"an error inside wavejob ({type(error).__name__}: {error})")
        report(error, verbose=options.verbose, doing=task.name)
        return
    finally:
        task.took = time.monotonic() - begun
    task.end(finished.status, finished.verdict)
    if not options.quiet:
        _say_ended(task)


def _failed(task: Task, said: str, problems: Sequence[Problem] = ()) -> None:
    """Notes and tells why a job could not be carried out."""
    task.end("failed", "failed", error=said)
    terminal.say(f"{task.name}: {said}")
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
    said = f"{task.name}: {task.status}, {task.verdict}"
    if task.status == "done":
        said += f", {duration(task.took)}"
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
        said += f"; {cut.name} was cut short and starts anew next time"
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
