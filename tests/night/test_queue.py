"""The order in which jobs start, and the memory that they share."""

from __future__ import annotations

from pathlib import Path

from wavejob.night.queue import Order, Queue
from wavejob.reading.tree import JobTree


def order(number: int, *, priority: int = 0, seconds: float = 1.0, memory: int = 1) -> Order:
    here = Path("job.yml")
    return Order(
        number, str(number), here, JobTree(Path()), 0, "0", here, priority=priority, seconds=seconds, memory=memory
    )


def started(queue: Queue) -> list[int]:
    """All that may start now."""
    numbers = []
    while (one := queue.start()) is not None:
        numbers.append(one.number)
    return numbers


def test_the_urgent_go_first_then_the_long() -> None:
    queue = Queue([order(0), order(1, seconds=9), order(2, priority=1), order(3, seconds=9)], memory=100)
    assert started(queue) == [2, 1, 3, 0]


def test_what_has_no_room_waits_and_what_fits_goes_before() -> None:
    big, small, other = order(0, seconds=9, memory=80), order(1, memory=30), order(2, memory=20)
    queue = Queue([big, small, other], memory=100)
    assert started(queue) == [0, 2]
    assert queue.free == 0
    queue.end(big)
    assert started(queue) == [1]
    assert queue.waiting == []


def test_alone_a_job_runs_whatever_it_needs() -> None:
    queue = Queue([order(0, memory=500), order(1, memory=400)], memory=100)
    assert started(queue) == [0]
    queue.end(queue.running[0])
    assert started(queue) == [1]
