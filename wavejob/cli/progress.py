"""How far a job is: a bar that redraws itself on a terminal, a line now and then elsewhere."""

from __future__ import annotations

import contextlib
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime
from typing import Any, Protocol

from ..job import Job
from ..simulate import Progress
from . import terminal
from .sizes import duration

SPARSE = 60.0  # seconds between two lines in a log
LONGEST_NAME = 30


class Watcher(Protocol):
    """What follows a job."""

    def step(self, progress: Progress) -> None: ...

    def frame(self, done: int, total: int) -> None: ...


@contextlib.contextmanager
def watched(job: Job, *, quiet: bool) -> Iterator[Watcher]:
    """Shows how far `job` is while the block lasts."""
    if quiet:
        yield Silent()
    elif terminal.is_live():
        with _bar(job) as bar:
            yield bar
    else:
        yield Lines(job)


class Silent:
    def step(self, progress: Progress) -> None:
        pass

    def frame(self, done: int, total: int) -> None:
        pass


def state(job: Job, progress: Progress) -> str:
    """Time, norm and probabilities of the moment, `t = 340 fs, norm 0.99874, transmitted 0.1213`."""
    shares = [f"{name} {value:.4g}" for name, value in progress.probabilities]
    stage = [progress.stage] if progress.stage else []
    return ", ".join([*stage, f"t = {job.write(progress.t, 'time')}", f"norm {progress.norm:.6g}", *shares])


def log_line(text: str) -> None:
    """A line with its time, for a log."""
    terminal.say(f"{datetime.now(UTC):%Y-%m-%dT%H:%M:%SZ} {text}")


@dataclass
class Lines:
    """At most one line a minute."""

    job: Job
    clock: Callable[[], float] = time.monotonic
    begun: float = field(init=False)
    spoken: float = field(init=False)

    def __post_init__(self) -> None:
        self.begun = self.spoken = self.clock()

    def step(self, progress: Progress) -> None:
        if self._due() and progress.step:
            share = progress.step / progress.steps
            left = (self.clock() - self.begun) * (1 - share) / share
            log_line(f"{self.job.id}: {share:.0%}, {state(self.job, progress)}, {duration(left)} left")

    def frame(self, done: int, total: int) -> None:
        if self._due():
            log_line(f"{self.job.id}: film {done / total:.0%}")

    def _due(self) -> bool:
        if self.clock() - self.spoken < SPARSE:
            return False
        self.spoken = self.clock()
        return True


class Bar:
    """Two lines: the bar with the time left, and below it the state of the moment."""

    def __init__(self, job: Job, bars: Any, text: Any) -> None:
        self.job, self.bars, self.text = job, bars, text
        self.task: Any = None
        self.stage = ""

    def step(self, progress: Progress) -> None:
        self._advance("run", progress.step, progress.steps)
        ended = progress.step == progress.steps  # what follows takes its time and tells nothing
        self.text.plain = "  error bars and tables" if ended else f"  {state(self.job, progress)}"

    def frame(self, done: int, total: int) -> None:
        self._advance("film", done, total)
        self.text.plain = f"  frame {done} of {total}"

    def _advance(self, stage: str, done: int, total: int) -> None:
        """A new bar for each stage, and for each run of a job with error bars."""
        if stage != self.stage or done < self.bars.tasks[-1].completed:
            if self.task is not None:
                self.bars.remove_task(self.task)
            name = self.job.id if len(self.job.id) <= LONGEST_NAME else "..." + self.job.id[3 - LONGEST_NAME :]
            self.task, self.stage = self.bars.add_task(name, total=total, stage=stage), stage
        self.bars.update(self.task, completed=done, total=total)


@contextlib.contextmanager
def _bar(job: Job) -> Iterator[Bar]:
    """A bar on standard error, gone when the block ends."""
    from rich.console import Console, Group
    from rich.live import Live
    from rich.progress import BarColumn, TaskProgressColumn, TextColumn, TimeRemainingColumn
    from rich.progress import Progress as Bars
    from rich.text import Text

    console = Console(stderr=True, highlight=False, markup=False)
    bars = Bars(
        TextColumn("{task.description}", markup=False),
        TextColumn("{task.fields[stage]}", markup=False),
        BarColumn(None),
        TaskProgressColumn(),
        TimeRemainingColumn(compact=True),
        console=console,
        expand=True,
    )
    text = Text(no_wrap=True, overflow="ellipsis")
    with Live(Group(bars, text), console=console, transient=True, refresh_per_second=8):
        yield Bar(job, bars, text)
