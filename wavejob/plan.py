"""From a checked job to everything the loop needs: grid, potential on it, step, and when what is recorded."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from .endings import Ending, absorbing_ends, layers
from .evolve.schedule import Schedule
from .evolve.splittings import SPLITTINGS, Splitting
from .evolve.step_choice import choose_step, largest_step
from .grid import Axis
from .hamiltonian import Hamiltonian
from .job import Job
from .limits import refuse_grid, refuse_run, refuse_spacings, refuse_steps, shortest_spacing
from .misfit_terms import too_fine
from .observables.base import Bench
from .on_grid import on_grid
from .points import chosen_axis, initial_state, wave_numbers
from .problems import JobFileError
from .timetable import fastest, sampling, timetable

Array = np.ndarray

FRAMES = 300
OUT_OF_REACH = 100  # times the error wanted: an estimate no run need be tried for
ROUNDED = 1e-6  # estimated errors below this may be rounding


@dataclass(frozen=True)
class Plan:
    """A job made ready. Steps count from 0; `notes` say why each choice was made."""

    job: Job
    axis: Axis
    psi: Array  # the initial state, shape (points,)
    hamiltonian: Hamiltonian
    endings: tuple[Ending, ...]
    splitting: Splitting
    step: float
    steps: int
    record: int  # steps between rows of the series
    sample: int  # steps between samples of integrals over time; divides `record` and `steps`
    notes: dict[str, str]

    @property
    def recorded(self) -> Schedule:
        return Schedule(self.record, self.steps)

    @property
    def sampled(self) -> Schedule:
        return Schedule(self.sample, self.steps)

    def every(self, time: float) -> Schedule:
        """Due about every `time`, to the nearest step."""
        return Schedule(max(round(time / self.step), 1), self.steps)

    @property
    def frames(self) -> Schedule | None:
        """When the film takes a frame; None where there is no film."""
        film = self.job.keys.film
        if isinstance(film, str):
            return None
        if film.every is not None:
            return self.every(film.every)
        return Schedule(max(round(self.steps / FRAMES), 1), self.steps)

    @property
    def bench(self) -> Bench:
        """What observables measure on."""
        job = self.job
        return Bench(
            hamiltonian=self.hamiltonian,
            landscape=job.landscape,
            units=job.units,
            charge=job.particle.charge,
            start=job.evolve.start,
            stop=job.evolve.until,
            scales=scales(self),
            accuracy=job.accuracy.first,
            fastest=fastest(job),
        )

    @property
    def kinetic_phase(self) -> float:
        """hbar k_max^2 step / 2m."""
        return math.pi * self.step / largest_step(self.hamiltonian)


def make_plan(job: Job, memory: int | None = None) -> Plan:
    """The plan of a job. Raises JobFileError where the job cannot be carried out as it is written.

    `memory` is what the run may take, bytes; None stands for what there is. More is refused before it is taken.
    """
    axis, notes = chosen_axis(job)
    refuse_grid(job, axis.points, memory)
    if fine := list(too_fine(job, axis)):
        raise JobFileError(fine)
    psi = initial_state(job, axis)
    _refuse_lost(job, axis, psi)
    endings = absorbing_ends(job, axis, psi)
    hamiltonian = on_grid(job, axis, layers(axis, endings))
    splitting, longest, notes["step"] = _step(job, hamiltonian, psi)
    shortest = sampling(job, hamiltonian, psi)
    step, steps, record, sample = timetable(job, longest, shortest)
    refuse_steps(job, steps)
    refuse_spacings(job, step)
    plan = Plan(job, axis, psi, hamiltonian, endings, splitting, step, steps, record, sample, notes)
    refuse_run(job, axis.points, plan.recorded, plan.sampled, plan.frames, step, memory)
    _refuse_unfit(plan)
    return plan


def _refuse_lost(job: Job, axis: Axis, psi: Array) -> None:
    """Raises JobFileError where the grid cannot hold what the packet is made of."""
    k, _ = wave_numbers(axis, psi)
    if np.max(np.abs(k)) > 0.98 * axis.k_max:
        raise JobFileError(
            [
                job.problem(
                    ("grid", "x"),
                    "the grid is too coarse for the packet: its wave numbers reach the largest the points can hold",
                    "give more points, or leave `points` out",
                )
            ]
        )


def _refuse_unfit(plan: Plan) -> None:
    """Raises JobFileError where an observable cannot be had of this initial state."""
    found = []
    for index, observable in enumerate(plan.job.observables):
        wrong = observable.unfit(plan.bench, plan.psi)
        if wrong:
            kind = plan.job.keys.observables[index].kind if plan.job.keys.observables else ""
            found.append(plan.job.problem(("observables", index, kind, wrong[0]), wrong[1], wrong[2]))
    if found:
        raise JobFileError(found)


def _step(job: Job, hamiltonian: Hamiltonian, psi: Array) -> tuple[Splitting, float, str]:
    """The splitting, the longest step allowed, and why."""
    evolve = job.evolve
    by_order = {splitting.order: splitting for splitting in SPLITTINGS.values()}
    if evolve.step is not None:
        return by_order[evolve.order or 4], evolve.step, "as written"
    orders = (evolve.order,) if evolve.order else (2, 4)
    accuracy = job.accuracy.first
    duration = evolve.until - evolve.start
    choice = choose_step(hamiltonian, psi, evolve.start, duration, accuracy, orders)
    refuse_steps(job, duration / choice.step)
    if choice.error > max(OUT_OF_REACH * accuracy, ROUNDED):
        said = f"errors of {min(choice.error, 1.0):.1g} are left even with a step of {job.write(choice.step, 'time')}"
        fix = "make the potential or its changes in time gentler, or write a `step` to go on all the same"
        raise JobFileError([job.problem(("evolve", "accuracy"), said, fix)])
    shortest = shortest_spacing(job)
    if shortest < choice.step:
        return choice.splitting, shortest, "no longer than the time between two frames, stored fields or densities"
    return choice.splitting, choice.step, choice.reason


def scales(plan: Plan) -> dict[str, float]:
    """What errors are measured by: initial width, initial momentum width, mean kinetic energy, duration."""
    axis, psi, mass = plan.axis, plan.psi, plan.job.particle.mass
    density = np.abs(psi) ** 2 * axis.spacing
    mean = float(density @ axis.x)
    width = math.sqrt(float(density @ (axis.x - mean) ** 2))
    k, weight = wave_numbers(axis, psi)
    drift = float(weight @ k)
    duration = plan.job.evolve.until - plan.job.evolve.start
    return {
        "length": width,
        "momentum": math.sqrt(max(float(weight @ (k - drift) ** 2), 0.0)),
        "energy": float(weight @ k**2) / (2 * mass),
        "time": duration,
        "flux": 1 / duration,
        "force": math.sqrt(max(float(weight @ (k - drift) ** 2), 0.0)) / duration,
    }
