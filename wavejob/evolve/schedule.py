"""When something is due, in step numbers."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Schedule:
    """Due at step 0, at every multiple of `every`, and at step `last`."""

    every: int
    last: int

    def next_after(self, n: int) -> int | None:
        """The first step later than `n` that is due, None after the last; -1 asks for the very first."""
        if n >= self.last:
            return None
        return min((n // self.every + 1) * self.every, self.last)

    def due(self, n: int) -> bool:
        return n % self.every == 0 or n == self.last
