"""The loop over recorded steps. It knows how to advance, when each output is due, and when to stop."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from ..problems import RunError
from ..state import Look
from .schedule import Schedule
from .stepper import Stepper


class Output(Protocol):
    """Something that wants to see the state now and then."""

    @property
    def schedule(self) -> Schedule: ...

    def see(self, look: Look) -> None:
        """Take what is needed from `look`; its arrays change with the next step."""


Control = Callable[[Look], str | None]


def go_on(_: Look) -> str | None:
    """The control that never stops a run."""
    return None


@dataclass(frozen=True)
class Outcome:
    """Where the loop ended: the step reached, and why if that was before the last one."""

    n: int
    stopped: str | None = None


def evolve(
    stepper: Stepper,
    *,
    steps: int,
    first: int = 0,
    outputs: Sequence[Output] = (),
    control: Control = go_on,
) -> Outcome:
    """Advance from step `first` to step `steps`, offering a look to each output when it is due.

    A run that begins at step 0 shows that step too; a resumed one does not show `first` again.
    `control` is asked at every look, after the outputs, and ends the run by giving a reason; then the
    outputs that were not due get this last look as well. Raises RunError once psi is no longer finite.
    """
    n, shown = first, first if first else -1
    while shown < steps:
        due = [output.schedule.next_after(shown) for output in outputs]
        target = min((step for step in due if step is not None and step < steps), default=steps)
        if target > n:
            stepper.advance(n, target - n)
        n = shown = target
        look = stepper.look(n)
        if not np.isfinite(look.norm).all():
            raise RunError(
                f"the wave function is no longer finite at step {n} (time {look.t:.6g})",
                "look for infinite values in the potential, or use a smaller step",
            )
        for output, when in zip(outputs, due, strict=True):
            if when == n:
                output.see(look)
        reason = control(look)
        if reason is not None:
            for output, when in zip(outputs, due, strict=True):
                if when != n:
                    output.see(look)
            return Outcome(n, reason)
    return Outcome(n)
