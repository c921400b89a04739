"""How far a batch is, in memory and in `status.json` beside its runs, for whoever looks from outside."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from ..outputs.log import utc
from ..outputs.tables import write_json

STATUS = "status.json"
SPARSE = 5.0  # seconds between two writings where nothing began or ended


@dataclass
class Status:
    """Jobs by name; `forecasts` holds the seconds that each should take, alone on a core."""

    runs: Sequence[Path]
    forecasts: dict[str, float]
    workers: int = 1
    clock: Callable[[], float] = time.monotonic
    running: dict[str, float] = field(default_factory=dict)  # share done
    done: list[str] = field(default_factory=list)
    failed: dict[str, str] = field(default_factory=dict)  # reason
    began: datetime = field(default_factory=lambda: datetime.now(UTC))
    _spent: float = 0.0  # seconds of the finished
    _awaited: float = 0.0  # what was forecast for them
    _written: float = float("-inf")

    @property
    def left(self) -> int:
        """Jobs that were not begun."""
        return len(self.forecasts) - len(self.running) - len(self.done) - len(self.failed)

    @property
    def seconds_left(self) -> float:
        """What the rest will take, if forecasts are as wrong for it as they were so far."""
        ended = {*self.done, *self.failed}
        ours = {name: f * (1 - self.running.get(name, 0)) for name, f in self.forecasts.items() if name not in ended}
        pace = self._spent / self._awaited if self._awaited and self._spent else 1.0
        return pace * max(sum(ours.values()) / self.workers, max(ours.values(), default=0.0))

    def start(self, name: str) -> None:
        self.running[name] = 0.0
        self.write()

    def go_on(self, name: str, share: float) -> None:
        self.running[name] = max(share, self.running.get(name, 0.0))
        if self.clock() - self._written >= SPARSE:
            self.write()

    def end(self, name: str, seconds: float | None = None) -> None:
        """`seconds` is what a job took that was computed, None for one that was up to date."""
        self.running.pop(name, None)
        self.done.append(name)
        if seconds is not None:
            self._spent += seconds
            self._awaited += self.forecasts[name]
        self.write()

    def fail(self, name: str, reason: str) -> None:
        self.running.pop(name, None)
        self.failed[name] = reason
        self.write()

    def write(self, *, stopped: bool = False) -> None:
        """Writes status.json anew. Raises RunError where it cannot be written."""
        self._written = self.clock()
        document: dict[str, Any] = {
            "format": 1,
            "began": utc(self.began),
            "written": utc(datetime.now(UTC)),
            "state": "stopped" if stopped else "running" if self.running or self.left else "finished",
            "jobs": len(self.forecasts),
            "done": len(self.done),
            "running": [{"job": name, "share": round(share, 3)} for name, share in self.running.items()],
            "left": self.left,
            "failed": [{"job": name, "reason": reason} for name, reason in self.failed.items()],
            "seconds_left": round(self.seconds_left, 1),
        }
        for folder in self.runs:
            write_json(folder / STATUS, document)
