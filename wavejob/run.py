"""One job: planned, carried out, written, judged."""

from __future__ import annotations

import logging
import time
from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Literal

import numpy as np

from .checks import judge_expectation, verdict
from .classical_companion import with_companion
from .evidence.assess import assess
from .job import Job
from .outputs.encode import video_encoder
from .outputs.fields import DensityTable, write_fields
from .outputs.files import atomic
from .outputs.folder import RESULTS, RunFolder
from .outputs.log import run_log
from .outputs.manifest import Account, renew_digests, write_manifest
from .outputs.resolved import write_resolved
from .outputs.tables import (
    expectations,
    read_results,
    write_curve,
    write_json,
    write_results_csv,
    write_results_json,
    write_series,
)
from .plan import Plan, make_plan
from .reader import Run
from .results import Verdict
from .simulate import Progress, Record, simulate
from .standing import BARS, FILM, film_name, has_bars, made_before, pictures, stands

log = logging.getLogger(__name__)

Tell = Callable[[Progress], None]
COPY = "job.yml"  # of the job file


@dataclass(frozen=True)
class Finished:
    """How a job ended, and where its files are; `record` is None where nothing was computed."""

    job: Job
    folder: Path
    status: Literal["done", "up to date"]
    verdict: Verdict
    record: Record | None = None


def run_job(
    job: Job,
    runs: Path,
    *,
    again: bool = False,
    bars: bool = True,
    film: bool = True,
    plan: Plan | None = None,
    progress: Tell | None = None,
    film_progress: Callable[[int, int], None] | None = None,
) -> Finished:
    """Carries out `job` into its folder below `runs`, unless that is there already and `again` is not set.

    Error bars and film that a run has are made again with it, whether or not `bars` and `film` are set.
    Raises RunError where the run cannot go on, its files cannot be written, or another process works on them;
    JobFileError where the job cannot be planned. A folder without manifest.json is unfinished.
    """
    folder = RunFolder(runs, job.id, job.fingerprint)
    if not again:
        if stands(job, folder, bars=bars, film=film):
            return _judged_again(job, folder)
        had_bars, had_film = made_before(folder)
        bars, film = bars or had_bars, film or had_film
    with folder.held():
        return _carried_out(job, folder, bars, film, plan, progress, film_progress)


def _carried_out(
    job: Job,
    folder: RunFolder,
    bars: bool,
    film: bool,
    plan: Plan | None,
    progress: Tell | None,
    film_progress: Callable[[int, int], None] | None,
) -> Finished:
    started, clock = datetime.now(UTC), time.perf_counter()
    plan = plan or make_plan(job)
    if film and film_name(job) == "film.mp4":
        video_encoder()  # missed now, not when hours of work are to be shown
    folder.begin()
    with run_log(folder.path / "run.log"):
        log.info("job %s, fingerprint %s", job.name, job.fingerprint)
        for key, why in plan.notes.items():
            log.info("%s: %s", key, why)
        planned = time.perf_counter()
        no_bars, no_film = not has_bars(job), film_name(job) is None
        record = assess(plan, progress).record if bars and not no_bars else simulate(plan, progress)
        swarmed = time.perf_counter()
        record = with_companion(record)
        companion = time.perf_counter() - swarmed
        log.info("%d steps in %.2f s%s", record.steps, record.seconds, f"; {record.stopped}" if record.stopped else "")
        simulated = time.perf_counter()
        write_numbers(folder.path, record)
        written = time.perf_counter()
        draw(folder.path, record, film, film_progress)
        drawn = time.perf_counter()
        for check in record.checks:
            log.info("check %s: %s", check.name, "passed" if check.passed else f"failed; {check.advice}")
        for judgement in record.judgements:
            log.info("expectation %s: %s", judgement.outcome, judgement.text)
        log.info("verdict: %s", record.verdict)
        account = Account(
            job=job.id,
            fingerprint=job.fingerprint,
            started=started,
            ended=datetime.now(UTC),
            grid=plan.hamiltonian.grid,
            step=plan.step,
            steps=record.steps,
            order=plan.splitting.order,
            precision=job.evolve.precision,
            timings={
                "plan": planned - clock,
                "loop": record.seconds,
                "classical": companion,
                "simulate": simulated - planned,
                "write": written - simulated,
                "pictures": drawn - written,
            },
            choices=pictures(job),
            variant={one.key: one.text for one in job.variant},
            partial=tuple(what for what, made in ((BARS, bars or no_bars), (FILM, film or no_film)) if not made),
            warnings=(record.stopped,) if record.stopped else (),
        )
        write_manifest(folder.path, account, job.units, job.tree.root)
    return Finished(job, folder.path, "done", record.verdict, record)


def write_numbers(folder: Path, record: Record) -> None:
    """Every table of a run; each is whole or not there."""
    job, units = record.plan.job, record.plan.job.units
    with atomic(folder / COPY) as file:
        file.write(job.text)
    write_resolved(folder / "resolved.yml", record.plan)
    errors = record.series_errors
    by_column = {} if errors is None else {c.name: errors[:, i] for i, c in enumerate(record.columns)}
    by_column = {name: column for name, column in by_column.items() if not np.isnan(column).all()}
    write_series(folder / "series.csv", record.times, record.columns, record.series, units, by_column)
    for curve in record.curves:
        write_curve(folder, curve, units, (record.curve_errors or {}).get(curve.name))
    write_fields(
        folder / "fields.nc",
        grid=record.plan.hamiltonian.grid,
        times=record.field_times,
        fields=(field[None] for field in record.fields),
        units=units,
        tables=[DensityTable(d.name, d.times, d.rows) for d in record.densities],  # type: ignore[arg-type]
        about={"job": job.id, "fingerprint": job.fingerprint},
    )
    write_results_csv(folder / "results.csv", record.results, units)
    write_results_json(
        folder / "results.json",
        job=job.id,
        fingerprint=job.fingerprint,
        verdict=record.verdict,
        results=record.results,
        checks=record.checks,
        judgements=record.judgements,
        units=units,
        classical=record.classical,
        variant={one.key: one.text for one in job.variant},
    )


def draw(folder: Path, record: Record, film: bool, progress: Callable[[int, int], None] | None) -> None:
    """overview.png, and the film where it is wanted."""
    from .outputs.film import draw_film  # here, so that a run without pictures does not wait for matplotlib
    from .outputs.overview import draw_overview
    from .outputs.staging import stage

    scene = stage(record)
    draw_overview(scene, folder / "overview.png")
    keys = record.plan.job.keys.film
    if film and not isinstance(keys, str):
        draw_film(scene, folder / f"film.{keys.format}", fps=keys.fps, progress=progress)


def _judged_again(job: Job, folder: RunFolder) -> Finished:
    """A finished run whose numbers stand: its expectations are judged as they are now, here or in a base."""
    stored = Run(folder.path).document
    results, checks = read_results(stored, job.figures, job.units)
    by_name = {result.name: result for result in results}
    judgements = [judge_expectation(job, expect, by_name[expect.result]) for expect in job.keys.expect]
    judged = verdict(checks, judgements)
    now = {**stored, "verdict": judged, "expectations": expectations(judgements)}
    copy = folder.path / COPY
    if now != stored or not copy.is_file() or copy.read_bytes() != job.text.encode():
        with folder.held():
            write_json(folder.path / RESULTS, now)
            with atomic(copy) as file:
                file.write(job.text)
            renew_digests(folder.path)
    return Finished(job, folder.path, "up to date", judged)
