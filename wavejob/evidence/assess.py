"""A run with its evidence: error bars, settings that reach the accuracy wanted, judgement."""

from __future__ import annotations

import logging
from collections.abc import Callable
from dataclasses import dataclass, replace

from ..plan import ACCURACY, Plan
from ..results import Check, Result
from ..simulate import Progress, Record, judged, simulate
from .bars import factor, with_bars, worst
from .companions import Companion, coarser, finer

log = logging.getLogger(__name__)

MOST_LEVELS = 3  # finer runs after the first, at the most: each costs about three times the one before
STALLED = 1.5  # by which a finer plan must lower the bars; else they do not converge

Tell = Callable[[Progress], None]


@dataclass(frozen=True)
class Assessed:
    """A record with bars and judgement; `notes` say how the bars were come by."""

    record: Record
    notes: tuple[str, ...]


def assess(plan: Plan, progress: Tell | None = None) -> Assessed:
    """Carries out `plan` and a companion of it.

    Where bars exceed the accuracy wanted and the job leaves step or points free, the plan is made finer and
    the run before serves as the companion of the next.
    """
    record = simulate(plan, progress)
    companion = coarser(plan, until=record.steps)
    barred = with_bars(record, companion, simulate(companion.plan, alone=False))
    notes = [_note(barred, companion)]
    wanted = plan.job.evolve.accuracy or ACCURACY
    step, points = free(plan)
    for _ in range(MOST_LEVELS):
        if not (step or points) or worst(barred) <= wanted:
            break
        better = finer(barred.plan, step=step, points=points, until=barred.steps).plan
        ratios = barred.plan.step / better.step, barred.plan.axis.points / better.axis.points
        companion = Companion(barred.plan, *ratios, "the run before, whose bars exceeded the accuracy wanted")
        before, barred = barred, with_bars(_ended(simulate(better, progress, alone=False), barred), companion, barred)
        notes.append(_note(barred, companion))
        if worst(barred) > worst(before) / STALLED:
            notes.append("a finer plan does not lower the bars: they do not converge")
            barred = replace(barred, results=tuple(_stalled(r, wanted) for r in barred.results))
            break
    for note in notes:
        log.info("error bars: %s", note)
    return Assessed(judged(barred, (_reached(barred, wanted),) if step or points else ()), tuple(notes))


def free(plan: Plan) -> tuple[bool, bool]:
    """Whether the job leaves step and points to be chosen."""
    axis = plan.job.keys.grid.x
    return plan.job.evolve.step is None, axis.points is None and axis.spacing is None


def _ended(record: Record, before: Record) -> Record:
    """The finer run ends where the one before did, for the same reason."""
    return replace(record, stopped=before.stopped)


def _stalled(result: Result, wanted: float) -> Result:
    if result.error is not None and result.scale and result.error > wanted * result.scale:
        return replace(result, error_status="not_converging")
    return result


def _note(record: Record, companion: Companion) -> str:
    return (
        f"a companion with {companion.step:.3g} times the step and {companion.points:.3g} times the points "
        f"({companion.reason}); bars are {factor(record, companion):g} times the difference; "
        f"the largest is {worst(record):.1e} of its scale"
    )


def _reached(record: Record, wanted: float) -> Check:
    largest = worst(record)
    named = next((r.name for r in record.results if r.error and r.scale and r.error / r.scale == largest), "none")
    passed = largest <= wanted
    return Check(
        "accuracy reached",
        passed,
        largest,
        wanted,
        f"largest error over its scale, of {named}",
        "" if passed else f"set `evolve.accuracy: {largest:.0e}` if that is enough, or give `points` and `step` by hand",
    )
