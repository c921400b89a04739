"""How far a batch is: bars on a terminal, elsewhere a line for each job and one a minute for the whole."""

from __future__ import annotations

import contextlib
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from typing import Any, Protocol

from ..night.status import Status
from . import terminal
from .progress import LONGEST_NAME, SPARSE, log_line
from .sizes import duration
from .tasks import Task


class NightView(Protocol):
    """What follows a batch."""

    def started(self, task: Task) -> None: ...

    def tick(self) -> None: ...

    def said(self, text: str) -> None: ...

    def ended(self, task: Task, seconds: float | None) -> None: ...


@contextlib.contextmanager
def night_view(status: Status, *, quiet: bool) -> Iterator[NightView]:
    """Shows how far a batch is while the block lasts."""
    if quiet:
        yield Nothing()
    elif terminal.is_live():
        with _bars(status) as bars:
            yield bars
    else:
        yield NightLines(status)


def whole(status: Status) -> str:
    """`12 of 40 ended, 2 running, 1 failed, 20 min left`."""
    parts = [f"{len(status.done) + len(status.failed)} of {len(status.forecasts)} ended"]
    parts += [f"{len(status.running)} running"] if status.running else []
    parts += [f"{len(status.failed)} failed"] if status.failed else []
    return ", ".join([*parts, f"{duration(status.seconds_left)} left"])


def _outcome(task: Task, seconds: float | None) -> str:
    said = f"{task.name}: {task.status}, {task.verdict}"
    return said if seconds is None else f"{said}, {duration(seconds)}"


class Nothing:
    """For --quiet."""

    def started(self, task: Task) -> None:
        pass

    def tick(self) -> None:
        pass

    def said(self, text: str) -> None:
        pass

    def ended(self, task: Task, seconds: float | None) -> None:
        pass


@dataclass
class NightLines:
    """Lines for a log."""

    status: Status
    clock: Callable[[], float] = time.monotonic
    warned: set[str] = field(default_factory=set)
    spoken: float = field(init=False)

    def __post_init__(self) -> None:
        self.spoken = self.clock()

    def started(self, task: Task) -> None:
        log_line(f"{task.name}: started, about {duration(task.seconds)}")

    def tick(self) -> None:
        if self.clock() - self.spoken >= SPARSE:
            self.spoken = self.clock()
            log_line(whole(self.status))

    def said(self, text: str) -> None:
        if text not in self.warned:  # each worker says it anew
            self.warned.add(text)
            terminal.say(f"warning: {text}")

    def ended(self, task: Task, seconds: float | None) -> None:
        log_line(_outcome(task, seconds))


class NightBars(NightLines):
    """A bar for the whole, and one for each job that runs."""

    def __init__(self, status: Status, bars: Any) -> None:
        super().__init__(status)
        self.bars = bars
        self.all = bars.add_task("", total=max(sum(status.forecasts.values()), 1e-9), said="")
        self.lines: dict[str, Any] = {}

    def started(self, task: Task) -> None:
        self.tick()

    def tick(self) -> None:
        status = self.status
        for name in [name for name in self.lines if name not in status.running]:
            self.bars.remove_task(self.lines.pop(name))
        for name, share in status.running.items():
            if name not in self.lines:
                short = name if len(name) <= LONGEST_NAME else "..." + name[3 - LONGEST_NAME :]
                self.lines[name] = self.bars.add_task(short, total=1.0, said="")
            self.bars.update(self.lines[name], completed=share)
        ended = {*status.done, *status.failed}
        done = sum(f * (1 if name in ended else status.running.get(name, 0)) for name, f in status.forecasts.items())
        self.bars.update(self.all, completed=done, said=whole(status))

    def ended(self, task: Task, seconds: float | None) -> None:
        terminal.say(_outcome(task, seconds))
        self.tick()


@contextlib.contextmanager
def _bars(status: Status) -> Iterator[NightBars]:
    """Bars on standard error, gone when the block ends."""
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TaskProgressColumn, TextColumn

    console = Console(stderr=True, highlight=False, markup=False)
    bars = Progress(
        TextColumn("{task.description}", markup=False),
        BarColumn(None),
        TaskProgressColumn(),
        TextColumn("{task.fields[said]}", markup=False),
        console=console,
        expand=True,
        transient=True,
    )
    with bars:
        yield NightBars(status, bars)
