"""One planned job carried out in memory: nothing is written."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from .checks import judge_expectation, judge_run, verdict
from .classical import Answer
from .evolve.loop import Output, evolve, go_on
from .evolve.schedule import Schedule
from .evolve.stepper import plan as plan_steps
from .observables.base import Meter, Observable, Series
from .observables.densities import Density, MomentumDensity
from .plan import FRAMES, Plan
from .problems import RunError
from .recording import Frames, Rows, Sampler, Stored, Ticker, Watch
from .results import Check, Column, Curve, Judgement, Result, Verdict
from .state import Look

Array = np.ndarray


@dataclass(frozen=True)
class Progress:
    """How far a run is."""

    step: int
    steps: int
    t: float  # scaled units
    norm: float
    probabilities: tuple[tuple[str, float], ...]
    stage: str = ""  # "companion" and the like, where it is not the run itself


@dataclass(frozen=True)
class StoredDensity:
    """A density at regular times, rows of shape (1, points)."""

    name: str
    times: Array
    rows: list[Array]


@dataclass(frozen=True)
class Record:
    """All that a run yields, in scaled units."""

    plan: Plan
    steps: int  # done
    stopped: str | None  # why the run ended early
    columns: tuple[Column, ...]
    times: Array  # (rows,)
    series: Array  # (rows, columns)
    results: tuple[Result, ...]
    curves: tuple[Curve, ...]
    checks: tuple[Check, ...]
    judgements: tuple[Judgement, ...]
    verdict: Verdict
    norm_drift: float  # what rounding errors did to norm + absorbed
    left: float  # probability on the grid at the end
    absorbed: dict[str, float]  # by layer, at the end
    thinned: dict[str, float]  # results from every second row and sample
    psi: Array  # the final state, (points,)
    field_times: Array  # of the stored fields, the final state last
    fields: tuple[Array, ...]  # (points,) each
    densities: tuple[StoredDensity, ...]
    frames: Frames
    moments: Array  # (rows, 3): norm, mean place and width of the packet
    crossed: dict[str, Array]  # detector -> probability crossed so far, at the frames
    seconds: float  # of the loop
    series_errors: Array | None = None  # like `series`
    curve_errors: dict[str, dict[str, Array]] | None = None  # curve -> column -> errors
    classical: Answer | None = None  # what F = m a says

    def column(self, name: str) -> Array:
        """One column of the time series."""
        return self.series[:, [c.name for c in self.columns].index(name)]

    def result(self, name: str) -> Result:
        return next(r for r in self.results if r.name == name)


def simulate(
    plan: Plan, progress: Callable[[Progress], None] | None = None, *, alone: bool = True, pictures: bool = True
) -> Record:
    """Carries out `plan`. Raises RunError for values that are not finite; KeyboardInterrupt passes through.

    With `alone` not set it is one of several runs of a job: all its steps are made, whatever `stop_when` says.
    Without `pictures` its first and last frame alone are kept.
    """
    job, bench = plan.job, plan.bench
    stepper = plan_steps(
        plan.hamiltonian,
        plan.splitting,
        plan.step,
        plan.psi[None, None],
        start=job.evolve.start,
        precision=job.evolve.precision,
        reproducible=job.evolve.reproducible,
    )
    meters = [observable.meter(bench) for observable in job.measured]
    rows, watch = Rows(plan.recorded, meters), Watch(plan.recorded, bench)
    shown = plan.frames or plan.every((job.evolve.until - job.evolve.start) / FRAMES)
    frames = Frames(shown if pictures else Schedule(plan.steps, plan.steps), bench, _view(plan))
    fields = _stored_fields(plan)
    densities = [_stored_density(plan, o) for o in job.measured if isinstance(o, Density)]
    outputs: list[Output] = [Sampler(plan.sampled, meters), rows, watch, frames]
    outputs += [stored for stored in [fields, *(d for _, d in densities)] if stored is not None]
    if progress is not None:
        outputs.append(Ticker(plan.recorded, lambda look: progress(_told(plan, rows, look))))

    first = stepper.look(0)
    for meter in meters:
        meter.start(first)
    begun = time.perf_counter()
    outcome = evolve(stepper, steps=plan.steps, outputs=outputs, control=_stopper(plan, rows) if alone else go_on)
    seconds = time.perf_counter() - begun

    table = [meter.finished(rows.series(index)) for index, meter in enumerate(meters)]
    results = [
        result
        for observable, meter, series in zip(job.measured, meters, table, strict=True)
        for result in _results(plan, observable, meter, series)
    ]
    thinned = {
        name: value
        for meter, series in zip(meters, table, strict=True)
        for name, value in meter.results(series.thinned(), 2).items()
        if value is not None
    }
    kept = fields.values if fields else []
    psi = stepper.psi[0, 0].copy()
    ended = stepper.time(outcome.n)
    stored = list(zip(fields.times if fields else [], kept, strict=True))
    if not stored or stored[-1][0] != ended:
        stored.append((ended, psi))
    record = Record(
        plan=plan,
        steps=outcome.n,
        stopped=outcome.stopped,
        columns=tuple(column for o in job.measured for column in o.columns(job.outline)),
        times=np.array(rows.times),
        series=np.concatenate([series.values for series in table], axis=1) if table else np.empty((len(rows.times), 0)),
        results=tuple(results),
        curves=tuple(curve for meter in meters for curve in meter.curves()),
        checks=(*judge_run(plan, watch, outcome.n), *(check for meter in meters for check in meter.checks())),
        judgements=(),
        verdict="doubtful",
        norm_drift=watch.norm_drift,
        absorbed={name: float(taken[0]) for name, taken in stepper.absorbed.items()},
        left=float(np.sum(np.abs(psi) ** 2) * plan.axis.spacing),
        thinned=thinned,
        psi=psi,
        field_times=np.array([t for t, _ in stored]),
        fields=tuple(field for _, field in stored),
        densities=tuple(StoredDensity(name, np.array(d.times), d.values) for name, d in densities),
        frames=frames,
        moments=np.array(watch.moments),
        crossed={
            name: np.interp(frames.times, times, running)
            for meter in meters
            for name, times, running in meter.progress()
        },
        seconds=seconds,
    )
    return judged(record)


def judged(record: Record, checks: tuple[Check, ...] = ()) -> Record:
    """The record with further checks, its expectations judged with the bars it has, and its verdict."""
    job = record.plan.job
    known = {result.name: result for result in record.results}  # those of F = m a come later
    judgements = [judge_expectation(job, e, known[e.result]) for e in job.keys.expect if e.result in known]
    checks = (*record.checks, *checks)
    return replace(record, checks=checks, judgements=tuple(judgements), verdict=verdict(list(checks), judgements))


def _view(plan: Plan) -> tuple[float, float]:
    film = plan.job.keys.film
    if not isinstance(film, str) and film.view is not None:
        return film.view.x.start, film.view.x.stop
    return plan.axis.low, plan.axis.high


def _stored_fields(plan: Plan) -> Stored | None:
    snapshots = plan.job.keys.snapshots
    if snapshots is None:
        return None
    return Stored(plan.every(snapshots.every), lambda look: look.psi[0, 0].copy())


def _stored_density(plan: Plan, density: Density) -> tuple[str, Stored]:
    schedule = plan.every(density.every) if density.every else plan.recorded
    if isinstance(density, MomentumDensity):
        width = abs(plan.axis.k[1] - plan.axis.k[0])
        return "momentum_density", Stored(schedule, lambda look: look.momentum_density[0] / width)
    return "density", Stored(schedule, lambda look: look.density[0].copy())


def _results(plan: Plan, observable: Observable, meter: Meter, series: Series) -> list[Result]:
    values, notes, errors = meter.results(series), meter.notes(), meter.own_errors()
    found = []
    for figure in observable.figures(plan.job.outline):
        value = values[figure.name]
        if value is not None and not np.isfinite(value):
            value = None
        found.append(
            Result(
                figure.name,
                value,
                figure.dimension,
                plan.bench.scale(figure.dimension),
                figure.meaning,
                error_parts=dict(errors.get(figure.name, {})),
                note=notes.get(figure.name, "it is not finite") if value is None else "",
            )
        )
    return found


def _stopper(plan: Plan, rows: Rows) -> Callable[[Look], str | None]:
    """Ends the run at a recorded time at which a bound of `stop_when` is passed."""
    job = plan.job
    recorded = Schedule(plan.record, plan.steps)
    names = [column.name for o in job.measured for column in o.columns(job.outline)]
    bounds: list[tuple[str, int, float, float]] = []
    for name, bound in job.evolve.stop_when.items():
        below = bound.below is not None
        limit: Any = bound.below if below else bound.above
        size = job.units.read(limit, job.columns[name].dimension)
        bounds.append((name, names.index(name), -1.0 if below else 1.0, size))

    def control(look: Look) -> str | None:
        if not bounds or not recorded.due(look.n):
            return None
        values: Sequence[float] = [value for meter in rows.rows[-1] for value in meter]
        for name, index, side, limit in bounds:
            if side * values[index] > side * limit:
                if look.n == 0:
                    where = "below" if side < 0 else "above"
                    raise RunError(f"`evolve.stop_when`: {name} starts {where} its bound", "give another bound")
                return f"{name} {'fell below' if side < 0 else 'rose above'} its bound of stop_when"
        return None

    return control


def _told(plan: Plan, rows: Rows, look: Look) -> Progress:
    job = plan.job
    latest = [value for meter in rows.rows[-1] for value in meter]
    columns = [column for o in job.measured for column in o.columns(job.outline)]
    shares = tuple(
        (column.name, value)
        for column, value in zip(columns, latest, strict=True)
        if column.dimension == "number" and column.name != "norm"
    )
    return Progress(look.n, plan.steps, look.t, float(look.norm[0]), shares[:3])
