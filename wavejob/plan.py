"""From a checked job to everything the loop needs: grid, potential on it, step, and when what is recorded."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import cached_property

import numpy as np

from .edges import LayerShape, Momenta, layer, recommended_depth, tuned
from .evolve.schedule import Schedule
from .evolve.splittings import SPLITTINGS, Splitting
from .evolve.step_choice import choose_step, largest_step
from .grid import Axis, fast_size
from .hamiltonian import Hamiltonian, Layer
from .job import Job
from .limits import refuse_grid, refuse_run, refuse_spacings, refuse_steps
from .misfit_terms import too_fine
from .misfits import axis_as_written, exact_time
from .observables.base import Bench
from .on_grid import on_grid
from .packets.base import PacketError
from .problems import JobFileError
from .settings import Absorb

Array = np.ndarray

ROWS = 400
FRAMES = 300
OVERSAMPLING = 8  # samples per shortest period of what is integrated over time
SPARSEST = 256  # steps between samples at the most: to sample more often costs nothing then
OUT_OF_REACH = 100  # times the error wanted: an estimate no run need be tried for
ROUNDED = 1e-6  # estimated errors below this may be rounding
DEEPEST, SHALLOWEST = 1e-9, 1e-5  # limits of what a layer whose depth is chosen may send back
LONGEST_LAYER = 0.4  # of the axis
TAIL = 1e-10  # probability left out of the range of wave numbers


@dataclass(frozen=True)
class Ending:
    """One absorbing end: the layer, with what it reflects as predicted, and what it must absorb."""

    side: str
    shape: LayerShape
    momenta: Momenta
    spacing: float

    @cached_property
    def recommended(self) -> float:
        """The depth that would do; found when first asked for, because it takes a while."""
        return recommended_depth(self.shape.mass, self.momenta, self.spacing)

    def deeper(self, by: float) -> Ending:
        """The same end with its layer deeper, tuned anew."""
        shape = tuned(self.shape.depth + by, self.shape.mass, self.momenta, self.spacing)
        return Ending(self.side, shape, self.momenta, self.spacing)


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
    endings = _endings(job, axis, psi)
    hamiltonian = on_grid(job, axis, layers(axis, endings))
    splitting, longest, notes["step"] = _step(job, hamiltonian, psi)
    shortest = _sampling(job, hamiltonian, psi)
    step, steps, record, sample = _timetable(job, longest, shortest)
    refuse_steps(job, steps)
    refuse_spacings(job, step)
    plan = Plan(job, axis, psi, hamiltonian, endings, splitting, step, steps, record, sample, notes)
    refuse_run(job, axis.points, plan.recorded, plan.sampled, plan.frames, step, memory)
    _refuse_unfit(plan)
    return plan


def initial_state(job: Job, axis: Axis) -> Array:
    """The packet at the points of `axis`. Raises JobFileError where it cannot be made on them."""
    try:
        return job.packet.field(axis, job.surroundings)
    except PacketError as error:
        problem = job.problem(("packet", job.keys.packet.kind), error.message, error.fix)
        raise JobFileError([problem]) from None


def layers(axis: Axis, endings: tuple[Ending, ...]) -> tuple[Layer, ...]:
    """The absorbing layers on the points of `axis`."""
    return tuple(layer(0, axis, ending.shape, "low" if ending.side == "low" else "high") for ending in endings)


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
    if sharp:  # errors fall with the third power of the spacing; measured on rectangular barriers
        room, why = max(4.0, 13.0 * (1e-4 / accuracy) ** (1 / 3)), ", for sharp edges"
    else:  # a companion with 0.7 of the points must still hold the packet and what the potential makes of it
        room, why = 1.8, ""
        needed = max(needed, (needed + potential_wavenumber(job, axis, accuracy) / 2) / 1.6)
    if job.landscape.depends_on_time:
        room *= 1.25
    points = max(fast_size(math.ceil(room * needed * axis.length / math.pi)), 64)
    return points, f"{room:.3g} times the largest wave number that matters, {job.write(needed, 'wavenumber')}{why}"


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


def _endings(job: Job, axis: Axis, psi: Array) -> tuple[Ending, ...]:
    """The absorbing ends, each layer as deep as written, or as deep as the accuracy wanted needs."""
    found = []
    for side in ("low", "high"):
        end = getattr(job.keys.edges.x, side)
        if isinstance(end, Absorb):
            momenta = _arriving(job, axis, psi, side, end)
            depth = end.absorb if isinstance(end.absorb, float) else _needed_depth(job, axis, momenta, side)
            shape = tuned(depth, job.particle.mass, momenta, axis.spacing)
            found.append(Ending(side, shape, momenta, axis.spacing))
    return tuple(found)


def retuned(plan: Plan, axis: Axis) -> tuple[Ending, ...]:
    """The absorbing ends of a plan on another grid: the same depths, tuned anew."""
    job, psi, found = plan.job, initial_state(plan.job, axis), []
    for ending in plan.endings:
        momenta = _arriving(job, axis, psi, ending.side, getattr(job.keys.edges.x, ending.side))
        shape = tuned(ending.shape.depth, job.particle.mass, momenta, axis.spacing)
        found.append(Ending(ending.side, shape, momenta, axis.spacing))
    return tuple(found)


def _needed_depth(job: Job, axis: Axis, momenta: Momenta, side: str) -> float:
    """The depth that sends back so little that it changes probabilities by less than the accuracy wanted.

    A share R that comes back changes a probability by up to 2 sqrt(R) times the amplitude it meets, which is
    small by then: 2 accuracy^2 leaves room for a tenth.
    """
    limit = min(max(2 * job.accuracy.first**2, DEEPEST), SHALLOWEST)
    depth = recommended_depth(job.particle.mass, momenta, axis.spacing, limit)
    if depth > LONGEST_LAYER * axis.length:
        fix = "give `energies:` of what it must absorb, extend the grid, or give a depth"
        if math.isfinite(depth):
            wanted = job.write(depth, "length")
            said = f"a layer at x.{side} that sends back less than {limit:.0e} needs {wanted}, too much of this grid"
        else:
            said = f"no layer at x.{side} absorbs waves as slow as some of this packet's"
        raise JobFileError([job.problem(("edges", "x"), said, fix)])
    return depth


def _arriving(job: Job, axis: Axis, psi: Array, side: str, end: Absorb) -> Momenta:
    """The wave numbers that may come to one end: those of the energies given, or the packet's, turned back or let
    through, at the end's potential."""
    mass, landscape, start = job.particle.mass, job.landscape, job.evolve.start
    if end.energies is not None:
        return Momenta.of_energies(end.energies.start, end.energies.stop, mass)
    k, weight = wave_numbers(axis, psi)
    if not landscape.terms:
        return Momenta.of_density(k, weight, "low" if side == "low" else "high")
    extent = job.packet.extent()
    middle = 0.5 * (extent[0] + extent[1]) if extent else 0.5 * (axis.low + axis.high)
    here = float(landscape.value(np.array([middle]), start)[0])
    inset = axis.low + 2 * axis.spacing if side == "low" else axis.high - 2 * axis.spacing
    there = float(landscape.value(np.array([inset]), start)[0])
    squared = k**2 + 2 * mass * (here - there)
    kept = squared > 0
    return Momenta.of_density(np.sqrt(squared[kept]), weight[kept])


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
    return choice.splitting, choice.step, choice.reason


def _sampling(job: Job, hamiltonian: Hamiltonian, psi: Array) -> float:
    """Time between samples that resolves every beat between energies the packet holds."""
    axis = hamiltonian.grid.axes[0]
    potential = hamiltonian.potential(job.evolve.start)[0, 0]
    k = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing)
    applied = np.fft.ifft(k**2 / (2 * job.particle.mass) * np.fft.fft(psi)) + potential * psi
    mean = float(np.vdot(psi, applied).real * axis.spacing)
    spread = math.sqrt(max(float(np.vdot(applied, applied).real * axis.spacing) - mean**2, 0.0))
    beat = max(min(mean + 8 * spread - float(potential.min()), 16 * spread), 1e-300)
    return min(2 * math.pi / (OVERSAMPLING * beat), fastest(job) / 16)


def _timetable(job: Job, longest: float, shortest: float) -> tuple[float, int, int, int]:
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
    if least < ROWS:
        return duration / least, least, 1, 1
    wanted = min(max(int(shortest / longest), 1), SPARSEST)
    best = min(
        (rows * sample * math.ceil(least / (rows * sample)), -sample, rows)
        for rows in range(ROWS - 50, ROWS + 51)
        for sample in range(max(wanted * 3 // 5, 1), wanted + 1)
        if rows * sample <= max(least, ROWS)
    ) if wanted * (ROWS - 50) <= least else (ROWS * math.ceil(least / ROWS), 0, ROWS)
    steps, rows = best[0], best[2]
    record = steps // rows
    return duration / steps, steps, record, _divisor(record, wanted)


def _rows_apart(steps: int) -> int:
    """Steps between rows, a divisor of `steps` where one is near."""
    about = max(steps // ROWS, 1)
    return next((d for d in range(about, max(about // 2, about - 10_000), -1) if steps % d == 0), about)


def _divisor(number: int, at_most: int) -> int:
    """The largest divisor of `number` that is above neither `at_most` nor SPARSEST."""
    return next(d for d in range(min(at_most, number, SPARSEST), 0, -1) if number % d == 0)


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
