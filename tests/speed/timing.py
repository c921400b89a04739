"""Times that survive a busy machine: contestants take turns, and only ratios within a turn count."""

from __future__ import annotations

import time
from collections.abc import Callable
from statistics import median

Contestant = Callable[[int], object]  # does its work that many times


def ratios(contestants: dict[str, Contestant], *, seconds: float = 0.02, turns: int = 15) -> dict[str, float]:
    """Median over the turns of each contestant's time over that of the first one.

    `seconds` is roughly how long the first one works in a turn; all work equally often.
    """
    names = list(contestants)
    for work in contestants.values():
        work(3)
    begun = time.perf_counter()
    contestants[names[0]](10)
    count = max(3, int(seconds / (time.perf_counter() - begun) * 10))
    times: dict[str, list[float]] = {name: [] for name in names}
    for _ in range(turns):
        for name, work in contestants.items():
            begun = time.perf_counter()
            work(count)
            times[name].append(time.perf_counter() - begun)
    base = times[names[0]]
    return {name: median(t / b for t, b in zip(taken, base, strict=True)) for name, taken in times.items()}
