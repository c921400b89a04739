"""Many jobs at once: what workers tell becomes lines, bars, results and exit codes."""

from __future__ import annotations

from argparse import Namespace
from collections.abc import Callable, Sequence
from contextlib import closing

from ..machine import memory
from ..night.status import Status
from ..night.workers import Ended, Event, Failed, Said, Started, Went, carry_out
from . import terminal
from .annotations import about, annotate
from .bugs import report_trace
from .night_view import NightView, night_view
from .tasks import Task


def status_of(tasks: Sequence[Task], workers: int) -> Status:
    """How far these tasks are: not begun."""
    folders = tuple(dict.fromkeys(task.runs for task in tasks))
    return Status(folders, {task.name: task.seconds for task in tasks}, workers)


def run_batch(tasks: Sequence[Task], workers: int, options: Namespace, ended: Callable[[Task], None]) -> None:
    """Carries out all tasks, `workers` at a time; `ended` is told of each. KeyboardInterrupt passes through."""
    current = [task for task in tasks if task.stands(options)]
    rest = [task for task in tasks if not task.stands(options)]
    status = status_of(tasks, workers)
    with night_view(status, quiet=options.quiet) as view:
        try:
            for task in current:
                _judge(task, status, view, options)
                ended(task)
            orders = [task.order(number, options) for number, task in enumerate(rest)]
            with closing(carry_out(orders, workers, options.memory or memory())) as events:
                for event in events:
                    if event is None:
                        view.tick()
                        continue
                    task = rest[event.order.number]
                    _hear(event, task, status, view, options)
                    if isinstance(event, Ended | Failed):
                        ended(task)
        except KeyboardInterrupt:
            status.running.clear()
            status.write(stopped=True)
            raise
    status.write()


def _judge(task: Task, status: Status, view: NightView, options: Namespace) -> None:
    """A task that needs no worker: its expectations are judged as they are now."""
    from ..run import run_job  # here, because it loads the transforms, which a refused job never needs

    finished = run_job(task.job, task.runs, bars=not options.quick, film=not options.no_film)
    task.end(finished.status, finished.verdict)
    status.end(task.name)
    view.ended(task, None)


def _hear(event: Event, task: Task, status: Status, view: NightView, options: Namespace) -> None:
    name = task.name
    if isinstance(event, Started):
        task.status = "stopped"  # unless it ends
        status.start(name)
        view.started(task)
    elif isinstance(event, Went):
        status.go_on(name, event.share)
        view.tick()
    elif isinstance(event, Said):
        view.said(event.text)
    elif isinstance(event, Ended):
        task.end(event.status, event.verdict)
        task.took = event.seconds
        status.end(name, event.seconds)
        view.ended(task, event.seconds)
    elif isinstance(event, Failed):
        task.end("failed", "failed", error=event.reason)
        status.fail(name, event.reason)
        annotate([about(task.job, event.reason)])
        if event.trace:
            report_trace(event.reason, event.trace, verbose=options.verbose, doing=task.name)
        else:
            terminal.say(f"{task.name}: {event.reason}")
