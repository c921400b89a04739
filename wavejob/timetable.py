"""When a run steps, records and samples."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

from .hamiltonian import Hamiltonian
from .job import Job
from .misfits import exact_time
from .problems import JobFileError

Array = np.ndarray

ROWS = 400
FEWEST = 40  # steps, below which every one is a row
OVERSAMPLING = 8  # samples per shortest period of what is integrated over time
SPARSEST = 256  # steps between samples at the most: to sample more often costs nothing then


def sampling(job: Job, hamiltonian: Hamiltonian, psi: Array) -> float:
    """Time between samples that resolves every beat between energies the packet holds."""
    axis = hamiltonian.grid.axes[0]
    potential = hamiltonian.potential(job.evolve.start)[0, 0]
    k = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing)
    applied = np.fft.ifft(k**2 / (2 * job.particle.mass) * np.fft.fft(psi)) + potential * psi
    mean = float(np.vdot(psi, applied).real * axis.spacing)
    spread = math.sqrt(max(float(np.vdot(applied, applied).real * axis.spacing) - mean**2, 0.0))
    beat = max(min(mean + 8 * spread - float(potential.min()), 16 * spread), 1e-300)
    return min(2 * math.pi / (OVERSAMPLING * beat), fastest(job) / 16)


def timetable(job: Job, longest: float, shortest: float) -> tuple[float, int, int, int]:
    """Step, number of steps, steps between rows, steps between samples.

    `longest` is the longest step allowed, `shortest` the longest time allowed between samples.
    """
    evolve = job.evolve
    duration = evolve.until - evolve.start
    if evolve.step is not None:
        steps = round(duration / evolve.step)
        record = round(evolve.record / evolve.step) if evolve.record else _rows_apart(steps)
        return evolve.step, steps, record, _divisor(math.gcd(record, steps), max(int(shortest / evolve.step), 1))
    if evolve.record is not None:
        ratio = Fraction(duration / evolve.record).limit_denominator(1000)
        if abs(float(ratio) * evolve.record - duration) > 1e-9 * duration:
            raise JobFileError(
                [
                    job.problem(
                        ("evolve", "record"),
                        "`until` and `record` have no common step",
                        f"write {exact_time(job, duration / max(round(duration / evolve.record), 1))}",
                    )
                ]
            )
        per = max(math.ceil(evolve.record / ratio.denominator / longest - 1e-9), 1) * ratio.denominator
        step = evolve.record / per
        steps = round(duration / step)
        return duration / steps, steps, per, _divisor(math.gcd(per, steps), max(int(shortest / step), 1))
    least = math.ceil(duration / longest - 1e-9)
    if least < ROWS:  # two steps to a row, so that a companion may take one
        record = 2 if least > FEWEST else 1
        steps = record * math.ceil(least / record)
        return duration / steps, steps, record, 1
    wanted = min(max(int(shortest / longest), 1), SPARSEST)
    best = (
        min(
            (rows * sample * math.ceil(least / (rows * sample)), -sample, rows)
            for rows in range(ROWS - 50, ROWS + 51)
            for sample in range(max(wanted * 3 // 5, 1), wanted + 1)
            if rows * sample <= max(least, ROWS)
        )
        if wanted * (ROWS - 50) <= least
        else (ROWS * math.ceil(least / ROWS), 0, ROWS)
    )
    steps, rows = best[0], best[2]
    record = steps // rows
    return duration / steps, steps, record, _divisor(record, wanted)


def _rows_apart(steps: int) -> int:
    """Steps between rows, a divisor of `steps` where one is near."""
    about = max(steps // ROWS, 1)
    return next((d for d in range(about, max(about // 2, about - 10_000, 1) - 1, -1) if steps % d == 0), about)


def _divisor(number: int, at_most: int) -> int:
    """The largest divisor of `number` that is above neither `at_most` nor SPARSEST."""
    return next(d for d in range(min(at_most, number, SPARSEST), 0, -1) if number % d == 0)


def fastest(job: Job) -> float:
    """The shortest time over which a time-dependent term changes; infinity without one."""
    times = [math.inf]
    for item in job.keys.potential:
        if item.in_time:
            times.append(item.in_time.body.fastest(job.units))
        if item.path:
            times.append(item.path.x.body.fastest(job.units))
    if math.isinf(min(times)) and job.landscape.depends_on_time:
        times.append((job.evolve.until - job.evolve.start) / 200)
    return min(times)
