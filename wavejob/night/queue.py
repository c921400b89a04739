"""Which job is started next: the most urgent, then the longest, of those that memory has room for."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from ..reading.tree import JobTree


@dataclass(frozen=True)
class Order:
    """One job for a worker. It is read anew from its file, which must still be the one that was checked."""

    number: int  # of the order, from 0; tells orders apart
    name: str  # of the job, for messages
    path: Path
    tree: JobTree
    variant: int  # among the jobs of the file, from 0
    fingerprint: str
    runs: Path
    again: bool = False
    bars: bool = True
    film: bool = True
    trust: bool = False
    priority: int = 0
    seconds: float = 0.0  # forecast
    memory: int = 0  # bytes, forecast


class Queue:
    """Orders that wait and that run; the forecasts of those that run stay within `memory` bytes in all.

    Alone a job may run whatever it needs: that it fits the machine was checked before.
    """

    def __init__(self, orders: Iterable[Order], memory: int) -> None:
        self.waiting = sorted(orders, key=lambda order: (-order.priority, -order.seconds, order.number))
        self.running: dict[int, Order] = {}
        self.memory = memory

    @property
    def free(self) -> int:
        """Bytes that no running job needs."""
        return self.memory - sum(order.memory for order in self.running.values())

    def start(self) -> Order | None:
        """The next order, now running; None where none waits or none that waits has room."""
        free = self.free
        for place, order in enumerate(self.waiting):
            if order.memory <= free or not self.running:
                self.running[order.number] = order
                return self.waiting.pop(place)
        return None

    def end(self, order: Order) -> None:
        """The order is no longer running."""
        del self.running[order.number]
