"""The grid of a job, its points chosen where they are left out, and the initial state on it."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from .grid import Axis, fast_size
from .job import Job
from .misfits import axis_as_written
from .packets.base import PacketError
from .problems import JobFileError
from .settings import MAX_POINTS

Array = np.ndarray

TAIL = 1e-10  # probability left out of the range of wave numbers


def initial_state(job: Job, axis: Axis) -> Array:
    """The packet at the points of `axis`. Raises JobFileError where it cannot be made on them."""
    try:
        return job.packet.field(axis, job.surroundings)
    except PacketError as error:
        problem = job.problem(("packet", job.keys.packet.kind), error.message, error.fix)
        raise JobFileError([problem]) from None


def chosen_axis(job: Job) -> tuple[Axis, dict[str, str]]:
    """The x axis, with its points chosen where the job leaves them out."""
    axis, keys = axis_as_written(job), job.keys.grid.x
    if keys.points:
        return axis, {"points": "as written"}
    if keys.spacing:
        points = fast_size(math.ceil((keys.stop - keys.start) / keys.spacing - 1e-9))
        return replace(axis, points=points), {"points": "the next size up from the spacing that transforms fast"}
    points, why = choose_points(job, axis)
    return replace(axis, points=points), {"points": why}


def choose_points(job: Job, axis: Axis) -> tuple[int, str]:
    """How many points hold the wave numbers of the packet wherever the potential lets it go."""
    accuracy = job.accuracy.first
    needed = highest_wavenumber(job, axis)
    jumps = np.abs(job.landscape.edges(job.evolve.start)[1])
    sharp = any(term.shape.breaks is not None for term in job.landscape.terms)
    if jumps.size:  # a wave decays or turns over this length at the highest edge
        needed = max(needed, math.sqrt(2 * job.particle.mass * float(jumps.max())))
    if sharp:
        # Errors fall with about the fifth power of the spacing, the third having been put back (`shapes.MISSED`).
        # Measured on barriers and wells: errors of 8e-4 at worst with a room of 6, 2e-5 with 13. With 16.5 the bar from
        # 0.7 of the points is small enough as well, which is cheaper than a second, finer run.
        room, why = max(4.0, 16.5 * (1e-4 / accuracy) ** (1 / 5)), ", for sharp edges"
    else:  # a companion with 0.7 of the points must still hold the packet and what the potential makes of it
        room, why = 1.8, ""
        needed = max(needed, (needed + potential_wavenumber(job, axis, accuracy) / 2) / 1.6)
    if job.landscape.depends_on_time:
        room *= 1.25
    points = max(fast_size(math.ceil(room * needed * axis.length / math.pi)), 64)
    shown = fast_size(math.ceil(axis.length / finest_detail(job)) + 1)  # else a chosen grid would be refused
    if points < shown <= MAX_POINTS:
        return shown, "as many as show the finest detail of the potential"
    return points, f"{room:.3g} times the largest wave number that matters, {job.write(needed, 'wavenumber')}{why}"


def finest_detail(job: Job) -> float:
    """The size of the finest detail of the potential; infinity where no term has one."""
    details = [item.body.detail() for item in job.keys.potential]
    return min((detail[1] for detail in details if detail), default=math.inf)


def potential_wavenumber(job: Job, axis: Axis, accuracy: float) -> float:
    """The wave number beyond which the force holds less than a share `accuracy` of its strength."""
    fine = replace(axis, points=2**14)
    force = job.landscape.slope(fine.x, job.evolve.start) * np.hanning(fine.points)
    strength = np.abs(np.fft.rfft(force)) ** 2
    beyond = np.cumsum(strength[::-1])[::-1]
    if beyond[0] == 0:
        return 0.0
    return float(2 * np.pi / axis.length * np.argmax(beyond <= accuracy**2 * beyond[0]))


def highest_wavenumber(job: Job, axis: Axis) -> float:
    """The largest wave number that the packet reaches where the potential is lowest."""
    mass = job.particle.mass
    k = job.packet.widest_wavenumber(mass)
    fine = replace(axis, points=2**14)
    potential = job.landscape.value(fine.x, job.evolve.start)
    extent = job.packet.extent()
    if k is not None and extent and extent[1] - extent[0] < 100 * fine.spacing:  # too narrow for these points
        here = job.landscape.value(np.linspace(*extent, 101), job.evolve.start)
    else:
        psi = initial_state(job, fine)
        if k is None:
            k = float(np.max(np.abs(wave_numbers(fine, psi)[0])))
        here = potential[np.abs(psi) ** 2 > TAIL * np.max(np.abs(psi) ** 2)]
    highest = k**2 / (2 * mass) + float(here.max()) - float(potential.min())
    return math.sqrt(2 * mass * max(highest, k**2 / (2 * mass)))


def wave_numbers(axis: Axis, psi: Array) -> tuple[Array, Array]:
    """Signed wave numbers that psi holds and their probabilities, without tails below 1e-10.

    On an axis with walls too, where the packet is far from them or a standing wave.
    """
    if axis.transform == "sine" and not np.any(psi.imag):
        from scipy.fft import dst  # here, so that reading a job does not wait for it

        waves = np.abs(dst(psi.real, type=2)) ** 2
        return _without_tail(np.concatenate([axis.k, -axis.k]), np.concatenate([waves, waves]))
    k = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing)
    return _without_tail(k, np.abs(np.fft.fft(psi)) ** 2)


def _without_tail(k: Array, weight: Array) -> tuple[Array, Array]:
    weight = weight / weight.sum()
    order = np.argsort(weight)
    kept = np.ones(k.size, bool)
    kept[order[np.cumsum(weight[order]) < TAIL]] = False
    return k[kept], weight[kept]
