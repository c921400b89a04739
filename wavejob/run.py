"""One job: planned, carried out, written, judged."""

from __future__ import annotations

import json
import logging
import time
from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Literal

import numpy as np

from .checks import judge_expectation, verdict
from .classical_companion import with_companion
from .evidence.assess import assess
from .job import Job, plain
from .outputs.fields import DensityTable, write_fields
from .outputs.files import atomic
from .outputs.folder import RunFolder
from .outputs.log import run_log
from .outputs.manifest import Account, write_manifest
from .outputs.resolved import write_resolved
from .outputs.tables import read_results, write_curve, write_results_csv, write_results_json, write_series
from .plan import Plan, make_plan
from .results import Verdict
from .simulate import Progress, Record, simulate

log = logging.getLogger(__name__)

Tell = Callable[[Progress], None]
FILM = "film"


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

    Raises RunError where the run cannot go on or its files cannot be written; JobFileError where the job
    cannot be planned. A folder without manifest.json is unfinished.
    """
    folder = RunFolder(runs, job.id, job.fingerprint)
    wanted_film = film and not isinstance(job.keys.film, str)
    if not again and is_current(job, runs, film=film):
        return _judged_again(job, folder)
    started, clock = datetime.now(UTC), time.perf_counter()
    plan = plan or make_plan(job)
    folder.begin()
    with run_log(folder.path / "run.log"):
        log.info("job %s, fingerprint %s", job.name, job.fingerprint)
        for key, why in plan.notes.items():
            log.info("%s: %s", key, why)
        planned = time.perf_counter()
        wanted_bars = bars and not isinstance(job.keys.error_bars, str)
        record = assess(plan, progress).record if wanted_bars else simulate(plan, progress)
        swarmed = time.perf_counter()
        record = with_companion(record)
        companion = time.perf_counter() - swarmed
        log.info("%d steps in %.2f s%s", record.steps, record.seconds, f"; {record.stopped}" if record.stopped else "")
        simulated = time.perf_counter()
        write_numbers(folder.path, record)
        written = time.perf_counter()
        draw(folder.path, record, wanted_film, film_progress)
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
            choices=_pictures(job),
            variant={one.key: one.text for one in job.variant},
            partial=() if wanted_film or isinstance(job.keys.film, str) else (FILM,),
            warnings=(record.stopped,) if record.stopped else (),
        )
        write_manifest(folder.path, account, job.units, job.tree.root)
    return Finished(job, folder.path, "done", record.verdict, record)


def is_current(job: Job, runs: Path, *, film: bool = True) -> bool:
    """Whether all that `job` asks for is in its folder, but for expectations that may have changed."""
    folder = RunFolder(runs, job.id, job.fingerprint)
    done = folder.finished()
    if done is None or not film or isinstance(job.keys.film, str):
        return done is not None
    return FILM not in folder.partial and bool(done["choices"] == _pictures(job))


def write_numbers(folder: Path, record: Record) -> None:
    """Every table of a run; each is whole or not there."""
    job, units = record.plan.job, record.plan.job.units
    with atomic(folder / "job.yml") as file:
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


def _pictures(job: Job) -> dict[str, Any]:
    """What pictures depend on beside the numbers."""
    return {"title": job.title, "film": plain(job.keys.film)}


def _judged_again(job: Job, folder: RunFolder) -> Finished:
    """A finished run whose numbers stand: its expectations are judged as they are written now."""
    stored = json.loads((folder.path / "results.json").read_text(encoding="utf-8"))
    if (folder.path / "job.yml").read_text(encoding="utf-8") == job.text:
        return Finished(job, folder.path, "up to date", stored["verdict"])
    results, checks = read_results(folder.path / "results.json", job.figures, job.units)
    by_name = {result.name: result for result in results}
    judgements = [judge_expectation(job, expect, by_name[expect.result]) for expect in job.keys.expect]
    judged = verdict(checks, judgements)
    with atomic(folder.path / "job.yml") as file:
        file.write(job.text)
    write_results_json(
        folder.path / "results.json",
        job=job.id,
        fingerprint=job.fingerprint,
        verdict=judged,
        results=results,
        checks=checks,
        judgements=judgements,
        units=job.units,
        classical=stored.get("classical"),
        variant=stored.get("variant"),
    )
    return Finished(job, folder.path, "up to date", judged)
