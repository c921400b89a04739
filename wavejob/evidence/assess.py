"""A run with its evidence: error bars, settings that reach the accuracy wanted, judgement."""

from __future__ import annotations

import logging
import math
from collections.abc import Callable
from dataclasses import dataclass, replace

from ..plan import Plan
from ..results import Accuracy, Check, Result
from ..settings import ErrorBarsKeys
from ..simulate import Progress, Record, judged, simulate
from . import edges
from .bars import FINER, Difference, counted, weight, with_bars, worst
from .companions import Companion, coarser, finer, larger

log = logging.getLogger(__name__)

MOST_LEVELS = 4  # finer runs after the first, at the most
MOST_COST = 200.0  # of the first run's, that finer runs may cost together
STALLED = 1.5  # by which a finer plan must lower the bars; else they do not converge
EDGE_SHARE = 0.3  # of the accuracy wanted, above which what comes back from the edges is measured by a run

TRACE = 1e-12  # a change of probabilities not worth a word

Tell = Callable[[Progress], None]


@dataclass(frozen=True)
class Assessed:
    """A record with bars and judgement; `notes` say how the bars were come by."""

    record: Record
    notes: tuple[str, ...]


def assess(plan: Plan, progress: Tell | None = None) -> Assessed:
    """Carries out `plan` and one companion of it with another step and another grid at once.

    Where bars exceed the accuracy wanted, a second companion tells step from grid. What the job leaves free
    is then made finer, and the run before serves as the companion of the next. Where the edges matter, a run
    on a larger grid with deeper layers adds their part.
    """
    keys = plan.job.keys.error_bars
    parts = ErrorBarsKeys() if isinstance(keys, str) else keys
    wanted, free_step, free_points = plan.job.accuracy, *free(plan)
    record = simulate(plan, progress)
    notes: list[str] = []
    tell = _staged(progress, "companion")
    differences = _first(record, parts, tell, notes)
    box = _box(record, differences, parts, tell, notes)
    barred = box.added(record, differences, parts)
    if worst(barred, wanted) > 1 and (free_step or free_points) and parts.step and parts.grid:
        differences = _apart(record, differences, tell, notes)
        barred = box.added(record, differences, parts)
        barred = _refined(barred, differences, box, parts, _staged(progress, "finer run"), notes)
    for note in notes:
        log.info("error bars: %s", note)
    checks = [_recorded(barred, wanted)] if parts.record else []
    if plan.job.evolve.accuracy is not None or free_points:
        checks.append(_reached(barred, wanted))
    return Assessed(judged(barred, tuple(checks)), tuple(notes))


@dataclass(frozen=True)
class _Box:
    """What the edges add to the bars: measured by a run, or a change of probabilities as predicted."""

    measured: tuple[Difference, ...] = ()
    predicted: float = 0.0

    def added(self, record: Record, differences: list[Difference], parts: ErrorBarsKeys) -> Record:
        """`record` with bars from `differences` and from the edges."""
        barred = with_bars(record, [*differences, *self.measured], recording=parts.record)
        if not self.predicted:
            return barred
        return edges.with_part(barred, self.predicted, measured=bool(self.measured))


def _staged(progress: Tell | None, stage: str) -> Tell | None:
    """Tells of a run that is not the first one."""
    return None if progress is None else lambda told: progress(replace(told, stage=stage))


def free(plan: Plan) -> tuple[bool, bool]:
    """Whether the job leaves step and points to be chosen."""
    axis = plan.job.keys.grid.x
    return plan.job.evolve.step is None, axis.points is None and axis.spacing is None


def _first(record: Record, parts: ErrorBarsKeys, tell: Tell | None, notes: list[str]) -> list[Difference]:
    """The difference to one companion that changes all that bars are wanted for."""
    if not (parts.step or parts.grid):
        return []
    companion = coarser(record.plan, step=parts.step, points=parts.grid, until=record.steps)
    factor = weight(record, companion)
    notes.append(_note(companion, factor))
    name = "step and grid" if parts.step and parts.grid else "step" if parts.step else "grid"
    return [Difference(name, record, simulate(companion.plan, tell, alone=False, pictures=False), factor)]


def _apart(record: Record, differences: list[Difference], tell: Tell | None, notes: list[str]) -> list[Difference]:
    """The same difference in two parts, by a second companion that changes the step alone."""
    both = differences[0]
    companion = coarser(record.plan, points=False, until=record.steps)
    notes.append(_note(companion, both.weight))
    between = simulate(companion.plan, tell, alone=False, pictures=False)
    return [Difference("step", record, between, both.weight), Difference("grid", between, both.theirs, both.weight)]


def _refined(
    barred: Record,
    differences: list[Difference],
    box: _Box,
    parts: ErrorBarsKeys,
    progress: Tell | None,
    notes: list[str],
) -> Record:
    """Finer runs until the bars are what is wanted, do not shrink, or cost too much."""
    plan, wanted = barred.plan, barred.plan.job.accuracy
    free_step, free_points = free(plan)
    spent, first = 0.0, _cost(plan)
    for level in range(MOST_LEVELS):
        step, points = free_step and _too_large(barred, "step"), free_points and _too_large(barred, "grid")
        if not (step or points):
            break
        better = finer(
            barred.plan,
            step=_excess(barred, "step") ** (1 / plan.splitting.order) if step else 1.0,
            points=_grid_ratio(barred) if points else 1.0,
            until=barred.steps,
        )
        spent += _cost(better.plan) / first
        if spent > MOST_COST:
            notes.append(f"to reach {wanted} would cost more than {MOST_COST:g} times the first run: not tried")
            break
        before, run = barred, replace(simulate(better.plan, progress, alone=False), stopped=barred.stopped)
        name = "step and grid" if step and points else "step" if step else "grid"
        kept = [] if step and points else [d for d in differences if d.part not in (name, "step and grid")]
        companion = Companion(before.plan, 1 / better.step, 1 / better.points, "the run before")
        factor = weight(run, companion)
        differences = [Difference(name, run, barred, factor), *kept]
        barred = box.added(run, differences, parts)
        notes.append(_note(companion, factor))
        # The first finer run shows the whole error of the one before, a coarser companion only a part: no comparison.
        if level > 0 and _excess(barred, name) > max(1.0, _excess(before, name) / STALLED):
            notes.append("a finer plan does not lower the bars: they do not converge")
            barred = replace(barred, results=tuple(_stalled(r, name, wanted) for r in barred.results))
            break
    return barred


def _grid_ratio(record: Record) -> float:
    """By how many times the points must grow: errors fall with the third power at sharp edges, else much faster."""
    sharp = any(term.shape.breaks is not None for term in record.plan.job.landscape.terms)
    return _excess(record, "grid") ** (1 / 3) if sharp else 1.5


def _cost(plan: Plan) -> float:
    return plan.steps * plan.splitting.stages * plan.axis.points * math.log2(plan.axis.points)


def _box(
    record: Record, differences: list[Difference], parts: ErrorBarsKeys, tell: Tell | None, notes: list[str]
) -> _Box:
    """What a larger grid changes, measured on the cheapest run there is: it hardly depends on step and spacing.

    Left to itself (`auto`) it is measured only where the prediction is no small share of what is wanted.
    """
    if parts.box == "no":
        return _Box()
    predicted = edges.returned(record)
    if parts.box == "auto" and predicted <= _least(record) * EDGE_SHARE:
        if predicted > TRACE:
            notes.append(f"what the edges send back changes probabilities by about {predicted:.1e}, as predicted")
        return _Box(predicted=predicted)
    cheapest = min([record, *(d.theirs for d in differences)], key=lambda r: _cost(r.plan))
    companion = larger(cheapest.plan, until=cheapest.steps)
    if companion is None:
        return _Box(predicted=predicted)
    notes.append(_note(companion, FINER))
    wider = simulate(companion.plan, tell, alone=False, pictures=False)
    return _Box((Difference("box", cheapest, wider, FINER, edges.of_what_is_left(record)),), predicted)


def _least(record: Record) -> float:
    """The smallest error, over its scale, that is wanted of a probability: `relative` asks for less of a small one."""
    wanted = record.plan.job.accuracy
    limits = [wanted.limit(result) for result in counted(record) if result.dimension == "number"]
    return min(limits, default=wanted.first)


def _too_large(record: Record, part: str) -> bool:
    """Whether errors in `part` exceed half of what is wanted, where all of them are too large."""
    return worst(record, record.plan.job.accuracy) > 1 and _excess(record, part) > 1


def _excess(record: Record, part: str) -> float:
    """By how much the errors in `part` exceed half of what is wanted."""
    return max((_share(result, part, record.plan.job.accuracy) for result in counted(record)), default=0.0)


def _share(result: Result, part: str, wanted: Accuracy) -> float:
    """The error of a result in `part` over half of what is wanted."""
    return 2 * sum(value for name, value in result.error_parts.items() if part in name) / wanted.limit(result)


def _stalled(result: Result, part: str, wanted: Accuracy) -> Result:
    """Marked where it is `part` that stays too large: what a fixed grid or step costs is a bar like any other."""
    if result.error is not None and result.error > wanted.limit(result) and _share(result, part, wanted) > 1:
        return replace(result, error_status="not_converging")
    return result


def _note(companion: Companion, factor: float) -> str:
    return (
        f"a companion with {companion.step:.3g} times the step and {companion.points:.3g} times the points "
        f"({companion.reason}); its difference counts {factor:g} times"
    )


def _recorded(record: Record, wanted: Accuracy) -> Check:
    """Whether rows and samples are close enough in time: what half of them give differs little."""
    shares = {r.name: r.error_parts.get("recording", 0.0) / wanted.limit(r) for r in counted(record)}
    named = max(shares, key=lambda name: shares[name], default="none")
    largest = shares.get(named, 0.0)
    passed = largest <= 1
    every = record.plan.job.write(record.plan.record * record.plan.step / max(math.ceil(largest**0.5), 2), "time")
    return Check(
        "record spacing",
        passed,
        largest * wanted.first,
        wanted.first,
        f"largest change of a result when every second row and sample is left out: {named}",
        "" if passed else f"set `evolve.record: {every}`",
    )


def _reached(record: Record, wanted: Accuracy) -> Check:
    largest = worst(record, wanted)
    named = next(
        (r.name for r in counted(record) if r.error is not None and r.error / wanted.limit(r) == largest), "none"
    )
    passed = largest <= 1
    enough = 10.0 ** math.ceil(math.log10(largest * wanted.first)) if largest > 0 else 0.0
    return Check(
        "accuracy reached",
        passed,
        largest * wanted.first,
        wanted.first,
        f"largest error of a result that counts, over what errors are measured by: {named}",
        "" if passed else f"set `evolve.accuracy: {enough:.0e}` if that is enough, or give more `points`",
    )
