"""A run with its evidence: error bars, settings that reach the accuracy wanted, judgement."""

from __future__ import annotations

import logging
import math
from collections.abc import Callable
from dataclasses import dataclass, replace

from ..plan import ACCURACY, Plan
from ..results import Check, Result
from ..simulate import Progress, Record, judged, simulate
from .bars import Difference, counted, weight, with_bars, worst
from .companions import Companion, coarser, finer

log = logging.getLogger(__name__)

MOST_LEVELS = 4  # finer runs after the first, at the most: each costs three times the one before or more
STALLED = 1.5  # by which a finer plan must lower the bars; else they do not converge

Tell = Callable[[Progress], None]


@dataclass(frozen=True)
class Assessed:
    """A record with bars and judgement; `notes` say how the bars were come by."""

    record: Record
    notes: tuple[str, ...]


def assess(plan: Plan, progress: Tell | None = None) -> Assessed:
    """Carries out `plan` and one companion of it with another step and another grid at once.

    Where bars exceed the accuracy wanted, a second companion tells step from grid. What the job leaves free
    is then made finer, and the run before serves as the companion of the next.
    """
    wanted = plan.job.evolve.accuracy or ACCURACY
    free_step, free_points = free(plan)
    record = simulate(plan, progress)
    companion = coarser(plan, until=record.steps)
    other = simulate(companion.plan, alone=False)
    factor = weight(record, coarser=companion.coarser)
    differences = [Difference("step and grid", record, other, factor)]
    barred = with_bars(record, differences)
    notes = [_note(companion, factor, barred)]
    if worst(barred) > wanted and companion.coarser and (free_step or free_points):
        companion = coarser(plan, points=False, until=record.steps)
        between = simulate(companion.plan, alone=False)
        differences = [Difference("step", record, between, factor), Difference("grid", between, other, factor)]
        barred = with_bars(record, differences)
        notes.append(_note(companion, factor, barred))
    for _ in range(MOST_LEVELS):
        step, points = (
            free_step and _too_large(barred, "step", wanted),
            free_points and _too_large(barred, "grid", wanted),
        )
        if not (step or points):
            break
        better = finer(
            barred.plan,
            step=_excess(barred, "step", wanted) ** (1 / plan.splitting.order) if step else 1.0,
            points=_excess(barred, "grid", wanted) ** (1 / 3) if points else 1.0,
            until=barred.steps,
        )
        run = replace(simulate(better.plan, progress, alone=False), stopped=barred.stopped)
        part = "step and grid" if step and points else "step" if step else "grid"
        kept = [d for d in differences if not (step and points) and d.part not in (part, "step and grid")]
        factor = weight(run)
        differences = [Difference(part, run, barred, factor), *kept]
        before, barred = barred, with_bars(run, differences)
        notes.append(_note(Companion(before.plan, 1 / better.step, 1 / better.points, "the run before"), factor, barred))
        if worst(barred) > worst(before) / STALLED:
            notes.append("a finer plan does not lower the bars: they do not converge")
            barred = replace(barred, results=tuple(_stalled(r, wanted) for r in barred.results))
            break
    for note in notes:
        log.info("error bars: %s", note)
    asked = plan.job.evolve.accuracy is not None or free_points
    return Assessed(judged(barred, (_reached(barred, wanted),) if asked else ()), tuple(notes))


def free(plan: Plan) -> tuple[bool, bool]:
    """Whether the job leaves step and points to be chosen."""
    axis = plan.job.keys.grid.x
    return plan.job.evolve.step is None, axis.points is None and axis.spacing is None


def _too_large(record: Record, part: str, wanted: float) -> bool:
    """Whether some result's error in `part` takes more than half of what is wanted, where all of it is too large."""
    return worst(record) > wanted and _excess(record, part, wanted) > 1


def _excess(record: Record, part: str, wanted: float) -> float:
    """By how much the errors in `part` exceed half of what is wanted."""
    shares = [
        sum(value for name, value in result.error_parts.items() if part in name) / result.scale
        for result in counted(record)
        if result.scale
    ]
    return max(shares, default=0.0) / (wanted / 2)


def _stalled(result: Result, wanted: float) -> Result:
    if result.error is not None and result.scale and result.error > wanted * result.scale:
        return replace(result, error_status="not_converging")
    return result


def _note(companion: Companion, factor: float, record: Record) -> str:
    return (
        f"a companion with {companion.step:.3g} times the step and {companion.points:.3g} times the points "
        f"({companion.reason}); bars are {factor:g} times the difference; the largest is {worst(record):.1e} of its scale"
    )


def _reached(record: Record, wanted: float) -> Check:
    largest = worst(record)
    named = next((r.name for r in counted(record) if r.error and r.scale and r.error / r.scale == largest), "none")
    passed = largest <= wanted
    enough = 10.0 ** math.ceil(math.log10(largest)) if largest > 0 else wanted
    return Check(
        "accuracy reached",
        passed,
        largest,
        wanted,
        f"largest error over its scale, of {named}",
        "" if passed else f"set `evolve.accuracy: {enough:.0e}` if that is enough, or give more `points`",
    )
