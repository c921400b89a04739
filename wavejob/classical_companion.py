"""The classical companion of a run: what F = m a gives for the same job, and what it is enough for."""

from __future__ import annotations

import logging
import math
from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np

from .classical import Answer, Path, path
from .ensemble import Followed, drawn, follow, trajectories
from .observables.swarm import OWN_FIGURES, PREFIX, ClassicalMeter, by_newton
from .plan import Plan
from .problems import RunError
from .results import Column, Result
from .simulate import Record, judged
from .wigner import GROUPS, WignerError

log = logging.getLogger(__name__)

Array = np.ndarray

COVER = 2.13  # standard errors that hold in 95 of 100 cases (Student's t of 16 groups)
OPEN = 0.1  # of the quantum width: a gap of mean places that can be seen
LEAST_LEFT = 1e-2  # of the probability: mean places of less say little of the packet
MEAN, LEFT = "mean place", "left"  # rows of the companion's own
NAMED = 4  # results of one kind named in the sentence
PATH_TOLERANCE = 1e-6  # of the length of the axis


def with_companion(record: Record) -> Record:
    """The record with the columns and results of F = m a, and its expectations judged on them too.

    Unchanged where the job says `classical: none`. Where trajectories cannot be drawn or followed, the
    figures are there and say so: a run is not lost for that.
    """
    plan = record.plan
    if isinstance(plan.job.keys.classical, str):
        return record
    way = None
    observables = [(o, o.classical(plan.bench)) for o in plan.job.measured]
    meters = [meter for _, meter in observables if meter is not None]
    meters.append(ClassicalMeter(lambda swarm: {MEAN: swarm.mean(swarm.x), LEFT: swarm.norm}, lambda _: {}))
    number = trajectories(plan)
    try:
        way = mean_path(plan, np.union1d(record.frames.times, record.times[-1:]))
        followed = follow(plan, drawn(plan, number), meters, record.times)
    except (WignerError, RunError) as error:
        return _refused(record, way, str(error))
    results = tuple(_results(record, meters, followed))
    gaps = _gaps(record, followed.pooled.rows[MEAN], followed.pooled.rows[LEFT])
    errors = _errors(followed, MEAN) / record.moments[:, 2]
    answer = _answer(record, results, way, number, gaps, errors)
    gap_error = None if answer.largest_gap is None else float(errors[np.nanargmax(gaps)])
    log.info("%d trajectories: %s", number, answer.sentence)
    joined = replace(
        record,
        results=(*record.results, *results, *_own_results(record, answer, gap_error)),
        classical=answer,
    )
    columns = [c for o, _ in observables for c in o.columns(plan.job.outline) if c.name in followed.pooled.rows]
    return judged(_with_columns(joined, columns, followed))


def _with_columns(record: Record, columns: list[Column], followed: Followed) -> Record:
    """The record with the series of F = m a and their errors."""
    if not columns:
        return record
    values = np.stack([followed.pooled.rows[column.name] for column in columns], axis=1)
    errors = np.stack([_errors(followed, column.name) for column in columns], axis=1)
    theirs = np.full(record.series.shape, np.nan) if record.series_errors is None else record.series_errors
    return replace(
        record,
        columns=(*record.columns, *(by_newton(column) for column in columns)),
        series=np.concatenate([record.series, values], axis=1),
        series_errors=np.concatenate([theirs, errors], axis=1),
    )


def mean_path(plan: Plan, times: Array) -> Path:
    """F = m a from the mean place and the mean momentum of the packet."""
    axis, mass = plan.axis, plan.job.particle.mass
    density = np.abs(plan.psi) ** 2 * axis.spacing
    # every wave number, since a mean without its tails errs in the ninth digit
    k, weight = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing), np.abs(np.fft.fft(plan.psi)) ** 2
    weight = weight / weight.sum()
    x0, p0 = float(density @ axis.x), float(weight @ k)
    if abs(p0) < 1e-9 * float(np.sqrt(weight @ k**2)):
        p0 = 0.0  # what rounding leaves of a packet at rest would tip it off the top of a barrier
    inside = (1 - 1e-9) * axis.length / 2
    middle = (axis.low + axis.high) / 2
    x0 = min(max(x0, middle - inside), middle + inside)
    return path(
        plan.job.landscape,
        mass,
        x0,
        p0,
        times,
        low=axis.low,
        high=axis.high,
        ends=axis.transform,
        tolerance=PATH_TOLERANCE,
    )


def _errors(followed: Followed, name: str) -> Array:
    """Error of a column, from the spread of the groups; shape (rows,)."""
    values = np.stack([group.rows[name] for group in followed.groups])
    return np.asarray(COVER * values.std(axis=0, ddof=1) / math.sqrt(GROUPS))


def _results(record: Record, meters: Sequence[ClassicalMeter], followed: Followed) -> Iterator[Result]:
    """Every classical figure with its statistical error, in the order of the job's figures."""
    found: dict[str, tuple[float | None, float | None]] = {}
    dimensions = {figure.name: figure.dimension for figure in record.plan.job.classical_figures}
    for meter in meters:
        groups = [meter.figures(group) for group in followed.groups]
        for name, value in meter.figures(followed.pooled).items():
            spread = _spread([group[name] for group in groups])
            if spread is not None and meter.counts and dimensions[PREFIX + name] == "number":
                spread = max(spread, 1 / followed.number)
            found[name] = value, spread
    for figure in record.plan.job.classical_figures:
        name = figure.name.removeprefix(PREFIX)
        if name not in found:
            continue
        value, error = found[name]
        if value is None or not np.isfinite(value):
            yield _without(record, figure, "no trajectory passed, or the force at sharp edges has no value")
        else:
            yield _result(record, figure, value, error)


def _spread(values: Sequence[float | None]) -> float | None:
    known = [value for value in values if value is not None and np.isfinite(value)]
    return float(COVER * np.std(known, ddof=1) / math.sqrt(GROUPS)) if len(known) == GROUPS else None


def _result(record: Record, figure: Column, value: float, error: float | None) -> Result:
    return Result(
        figure.name,
        value,
        figure.dimension,
        record.plan.bench.scale(figure.dimension),
        figure.meaning,
        error,
        "off" if error is None else "estimated",
        {} if error is None else {"sampling": error},
    )


def _without(record: Record, figure: Column, why: str) -> Result:
    scale = record.plan.bench.scale(figure.dimension)
    return Result(figure.name, None, figure.dimension, scale, figure.meaning, note=why)


def _gaps(record: Record, places: Array, left: Array) -> Array:
    """Difference of mean places over the quantum width at each row, nan where little of either is left."""
    norm, place, width = record.moments.T
    gaps = np.abs(place - places) / np.where(width > 0, width, np.nan)
    return np.where(np.minimum(norm, left) > LEAST_LEFT, gaps, np.nan)


def _own_results(record: Record, answer: Answer, gap_error: float | None) -> Iterator[Result]:
    """Actions along the path of the mean start, and how far the mean places come apart."""
    action, lagrangian, largest, opens = OWN_FIGURES
    way = answer.path
    for figure in (action, lagrangian):
        if way is None:
            yield _without(record, figure, answer.sentence)
            continue
        total = way.action if figure is action else way.lagrangian_action
        result = _result(record, figure, float(total[-1]), way.action_error)
        yield replace(result, error_parts={"step": way.action_error})
    if answer.largest_gap is None:
        yield _without(record, largest, "no trajectories, or too little left of the packet")
    else:
        yield _result(record, largest, answer.largest_gap, gap_error)
    if answer.opens is None:
        yield _without(record, opens, "it never does")
    else:
        yield _result(record, opens, answer.opens, None)


def _answer(record: Record, results: Sequence[Result], way: Path, number: int, gaps: Array, errors: Array) -> Answer:
    """For which results F = m a is enough, and when the mean places come apart."""
    known = bool(np.isfinite(gaps).any())
    widest = int(np.nanargmax(gaps)) if known else 0
    seen = np.flatnonzero((gaps > OPEN) & (gaps > errors))
    theirs = {result.name: result for result in results}
    sorted_out: dict[str, list[str]] = {"enough": [], "not_enough": [], "undecided": []}
    said = []
    expected = [expect.result for expect in record.plan.job.keys.expect]
    for mine in sorted(record.results, key=lambda result: result.name not in expected):
        other = theirs.get(PREFIX + mine.name)
        if other is None or mine.value is None or other.value is None:
            continue
        away, error = abs(mine.value - other.value), (mine.error or 0.0) + (other.error or 0.0)
        limit = record.plan.job.accuracy.limit(mine)
        kind = "enough" if away + error <= limit else "not_enough" if away - error > limit else "undecided"
        sorted_out[kind].append(mine.name)
        if kind == "not_enough":
            said.append(f"{mine.name} ({_figure(record, mine)} against {_figure(record, other)})")
    return Answer(
        sentence=sentence(str(record.plan.job.accuracy), sorted_out["enough"], said, sorted_out["undecided"], number),
        path=way,
        trajectories=number,
        largest_gap=float(gaps[widest]) if known else None,
        gap_time=float(record.times[widest]) if known else None,
        opens=float(record.times[seen[0]]) if seen.size else None,
        enough=tuple(sorted_out["enough"]),
        not_enough=tuple(sorted_out["not_enough"]),
        undecided=tuple(sorted_out["undecided"]),
    )


def sentence(accuracy: str, enough: list[str], not_enough: list[str], undecided: list[str], number: int) -> str:
    """For which results F = m a is good enough, in one sentence."""
    parts = []
    if enough:
        parts.append(f"is good enough at the accuracy asked ({accuracy}) for {_listed(enough)}")
    if not_enough:
        parts.append(f"is not good enough for {_listed(not_enough)}")
    if undecided:
        parts.append(f"cannot be told from the quantum answer by {number} trajectories for {_listed(undecided)}")
    return f"F = m a {'; '.join(parts)}." if parts else "No result of this job has a counterpart by F = m a."


def _listed(names: list[str]) -> str:
    more = [f"{len(names) - NAMED} more"] if len(names) > NAMED + 1 else []
    shown = [*(names if not more else names[:NAMED]), *more]
    return shown[0] if len(shown) == 1 else f"{', '.join(shown[:-1])} and {shown[-1]}"


def _figure(record: Record, result: Result) -> str:
    return record.plan.job.write(0.0 if result.value is None else result.value, result.dimension)


def _refused(record: Record, way: Path | None, why: str) -> Record:
    """The record where no trajectories can be followed: the figures say why they have no value."""
    answer = Answer(f"F = m a is not compared: {why}.", way, 0, None, None, None)
    own = {result.name: result for result in _own_results(record, answer, None)}
    results = (own.get(f.name) or _without(record, f, why) for f in record.plan.job.classical_figures)
    log.info("%s", answer.sentence)
    return judged(replace(record, results=(*record.results, *results), classical=answer))
