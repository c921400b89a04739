"""The time step and the splitting that an accuracy asks for, estimated before the run."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ..hamiltonian import Hamiltonian
from .splittings import SPLITTINGS, Kick, Splitting

Array = np.ndarray

SITES = 24  # places along the axis where a packet is tried
WORST = 4  # of them that are followed
FEWEST, MOST = 48, 512  # steps over which they are followed
EFFORT = 120_000  # points times steps that they may be followed, between those bounds
QUARTERS = 4  # parts of this stretch, over each of which growth is looked for
STARTS = 3  # times, evenly over the run, at which they are let go where the potential changes
INSTANTS, CLOSER = 2001, 2  # times at which f(t) is asked, to find where it bends most, and how often, ever closer
LEAD = 8.5  # steps before such a bend at which packets are let go: a corner errs most in the middle of a step
ROOM = 5.0  # widths that trial packets keep from the ends
ENERGIES = 4.0  # standard deviations of energy above the mean that count for what is reached
PRESENT = 1e-6  # of the largest density: where the packet is
LEAST_CHANGE, MOST_CHANGE = 1.25, 8.0  # by which a step that errs too much is divided
GENEROUS = 10.0  # below the accuracy by this much, a longer step is tried once
COARSEST = math.pi  # largest kinetic phase per step, hbar k_max^2 step / 2m: beyond it errors do not shrink smoothly
SMALLEST = 2.0**-14  # of the coarsest step: where accuracy is beyond reach, rounding is


@dataclass(frozen=True)
class StepChoice:
    """A splitting, the longest step it may take, why, and the estimated error in probabilities."""

    splitting: Splitting
    step: float
    reason: str
    error: float


def largest_step(hamiltonian: Hamiltonian) -> float:
    """The step at which the kinetic phase of the largest wave number is pi."""
    fastest = max(
        axis.k_max**2 / (2 * mass) for axis, mass in zip(hamiltonian.grid.axes, hamiltonian.masses, strict=True)
    )
    return COARSEST / fastest


def choose_step(
    hamiltonian: Hamiltonian, psi: Array, start: float, duration: float, accuracy: float, orders: tuple[int, ...]
) -> StepChoice:
    """The cheapest of the splittings of `orders` whose estimated error in probabilities stays below `accuracy`.

    psi: the initial state on one axis, shape (points,). Copies of it with the momentum that energy
    conservation gives them are set down at places all along the axis. Where one step errs most against two
    half steps, copies and the packet itself are followed over a stretch of steps. A splitting errs once, by the
    change of variables that makes its own Hamiltonian of the true one, and then in proportion to time, by the
    difference that is left; the two are taken to be independent, so that squares of errors are compared with squares
    of times. A probability errs by at most twice the norm of the error, a mean place or
    momentum, measured in initial widths, by that times how far apart parts of the packet may come.

    Checked on 18 kinds of motion, trapped, scattered, driven, moved and absorbed, at accuracies of 1e-2 to 1e-6: no
    figure erred by more than 0.7 of what was wanted, most by far less.
    """
    longest = min(largest_step(hamiltonian), duration)
    trials, spread = _trial_packets(hamiltonian, psi, start, duration)
    busy = _busiest(hamiltonian, start, duration)
    choices = []
    for splitting in SPLITTINGS.values():
        if splitting.order not in orders or (splitting.uses_gradient and hamiltonian.couples):
            continue
        step, failed = longest, math.inf
        while True:
            error = 2 * spread * _error(hamiltonian, splitting, trials, start, duration, step, busy)
            if error <= accuracy or step <= longest * SMALLEST:
                break
            failed = step
            step /= min(max((error / accuracy) ** (1 / splitting.order), LEAST_CHANGE), MOST_CHANGE)
        if error < accuracy / GENEROUS and math.isfinite(failed):  # near the largest phase errors fall at once
            longer = math.sqrt(step * failed)
            larger = 2 * spread * _error(hamiltonian, splitting, trials, start, duration, longer, busy)
            if larger <= accuracy:
                step, error = longer, larger
        limited = "the kinetic phase of pi" if step == longest else f"an estimated error of {error:.1e}"
        reason = f"order {splitting.order}, step limited by {limited}"
        choices.append(StepChoice(splitting, step, reason, error if math.isfinite(error) else math.inf))
    good = [choice for choice in choices if choice.error <= accuracy]
    if not good:
        return min(choices, key=lambda choice: choice.error)
    return min(good, key=lambda choice: choice.splitting.stages / choice.step)


def _trial_packets(hamiltonian: Hamiltonian, psi: Array, start: float, duration: float) -> tuple[Array, float]:
    """`psi`, and copies of it at places it may reach, each with the mean momentum of its energy there, (sites, points).

    What has more energy than the packet holds is left out. Second, how far apart two parts of the packet may come,
    in place or in momentum, over twice the initial widths.
    """
    axis, mass = hamiltonian.grid.axes[0], hamiltonian.masses[0]
    potential = hamiltonian.potential(start)[0, 0]
    density = np.abs(psi) ** 2
    density /= density.sum()
    mean = float(density @ axis.x)
    spread = math.sqrt(float(density @ (axis.x - mean) ** 2))
    k = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing)
    applied = np.fft.ifft(k**2 / (2 * mass) * np.fft.fft(psi)) + potential * psi
    energy = float(np.vdot(psi, applied).real / np.vdot(psi, psi).real)
    scatter = math.sqrt(max(float(np.vdot(applied, applied).real / np.vdot(psi, psi).real) - energy**2, 0.0))
    low, high = _reach(axis.x, potential, density, energy + ENERGIES * scatter)
    width = min(spread, axis.length / 12)
    inset = ROOM * width  # a packet over an end that wraps would feel a jump that the run never meets
    low, high = max(low, min(axis.low + inset, mean)), min(high, max(axis.high - inset, mean))
    places = low + (high - low) * (np.arange(SITES) + 0.5) / SITES
    within = (axis.x >= low) & (axis.x <= high)
    steepest = axis.x[np.argsort(np.abs(np.gradient(potential)) * within)[::-1][:4]]
    packets = [psi]
    for place in (*places, *steepest):
        local = np.exp(-(((axis.x - place) / (2 * width)) ** 2))
        here = float(np.interp(place, axis.x, potential))
        packets.append(local * np.exp(1j * math.sqrt(max(2 * mass * (energy - here), 0.0)) * (axis.x - place)))
    table = np.array(packets)
    table /= np.linalg.norm(table, axis=1, keepdims=True)
    kinetic = np.abs(np.fft.fft(table)) ** 2 @ k**2 / (2 * mass * axis.points)
    present = kinetic + np.abs(table) ** 2 @ potential <= energy + ENERGIES * scatter
    present[0] = True
    fastest = math.sqrt(max(2 * mass * (energy - float(potential[within].min())), 0.0))
    apart = max(min(high - low, 2 * fastest / mass * duration) / (2 * spread), 2 * spread * fastest, 1.0)
    return table[present], apart


def _reach(x: Array, potential: Array, density: Array, energy: float) -> tuple[float, float]:
    """From the first to the last place where the packet is, or where its energy would let it be."""
    open_ = np.flatnonzero((potential <= energy) | (density > PRESENT * density.max()))
    return float(x[open_[0]]), float(x[open_[-1]])


def _busiest(hamiltonian: Hamiltonian, start: float, duration: float) -> list[float]:
    """For each f(t), the time at which it bends most: the middle of a pulse, or the corner of a ramp."""
    found = []
    for part in hamiltonian.parts:
        if part.in_time is not None:
            low, high = start, start + duration
            for _ in range(CLOSER):
                clock = np.linspace(low, high, INSTANTS)
                most = int(np.argmax(np.abs(np.diff([part.factor(float(t)) for t in clock], 2)))) + 1
                low, high = float(clock[most - 1]), float(clock[most + 1])
            found.append((low + high) / 2)
    return found


def _error(
    hamiltonian: Hamiltonian,
    splitting: Splitting,
    packets: Array,
    start: float,
    duration: float,
    step: float,
    busy: list[float],
) -> float:
    """The estimated norm of the final error, from the worst of the packets and, in time, of a few starts."""
    times = [start]
    if hamiltonian.depends_on_time:
        times = [start + duration * (n + 0.37) / STARTS for n in range(STARTS)]
        times += [max(t - LEAD * step, start) for t in busy]
    share = 1 / (1 - 2.0**-splitting.order)  # the half steps err too
    effort = EFFORT // len(times)
    window = min(max(effort // packets.shape[1], FEWEST), MOST, math.ceil(duration / step))
    worst = 0.0
    for t in times:
        single = _differences(hamiltonian, splitting, packets, t, step, [1])[0]
        followed = packets[np.unique([0, *np.argsort(single)[-WORST:]])]
        marks = np.ceil(np.arange(1, QUARTERS + 1) / QUARTERS * window).astype(int)
        reached = _differences(hamiltonian, splitting, followed, t, step, list(marks))
        times_squared = (marks * step) ** 2
        growth = np.diff(reached**2, axis=0) / np.maximum(np.diff(times_squared), 1e-300)[:, None]
        rate = np.sqrt(np.maximum(growth, 0.0).max(0)) if len(growth) else 0.0
        worst = max(worst, share * float((reached.max(0) + rate * duration).max()))
    return worst


def _differences(
    hamiltonian: Hamiltonian, splitting: Splitting, packets: Array, t: float, step: float, marks: list[int]
) -> Array:
    """Norm of the difference between steps and pairs of half steps after each number of steps in `marks`."""
    whole, half = _Steps(hamiltonian, splitting, step), _Steps(hamiltonian, splitting, step / 2)
    one = two = whole.continued(packets)
    found = {}
    for n in range(marks[-1]):
        now = t + n * step
        one = whole.made(one, now)
        two = half.made(half.made(two, now), now + step / 2)
        if n + 1 in marks:
            found[n + 1] = np.linalg.norm((one - two)[:, : packets.shape[1]], axis=1)
    return np.array([found[mark] for mark in marks])


class _Steps:
    """Steps by plain numpy transforms; on an axis with walls the odd continuation is advanced."""

    def __init__(self, hamiltonian: Hamiltonian, splitting: Splitting, step: float) -> None:
        axis, mass = hamiltonian.grid.axes[0], hamiltonian.masses[0]
        self.hamiltonian, self.splitting, self.step = hamiltonian, splitting, step
        self.walls = axis.transform == "sine"
        k = 2 * np.pi * np.fft.fftfreq(axis.points * (2 if self.walls else 1), axis.spacing)
        self.drifts = [np.exp(-1j * step * share * k**2 / (2 * mass)) for share in splitting.drifts]
        still = not hamiltonian.depends_on_time
        self.kicks = [self._kick(kick, 0.0) for kick in splitting.kicks] if still else None

    def continued(self, packets: Array) -> Array:
        """What is advanced: the packets, beyond a wall with their mirror images."""
        return np.concatenate([packets, -packets[:, ::-1]], axis=1) if self.walls else packets

    def made(self, psi: Array, t: float) -> Array:
        """`psi` one step after time t."""
        kicks = self.kicks or [self._kick(kick, t) for kick in self.splitting.kicks]
        for kick, drift in zip(kicks[:-1], self.drifts, strict=True):
            psi = np.fft.ifft(drift * np.fft.fft(kick * psi))
        return np.asarray(kicks[-1] * psi)

    def _kick(self, kick: Kick, t: float) -> Array:
        at = t + kick.at * self.step
        energy = self.hamiltonian.potential(at)[0, 0]
        if kick.gradient:
            slopes = [part.factor(at) * part.gradient(at)[0][0, 0] for part in self.hamiltonian.parts if part.gradient]
            energy = energy - kick.gradient * self.step**2 * sum(slopes) ** 2 / self.hamiltonian.masses[0]
        factor = np.exp(-1j * self.step * kick.weight * energy)
        return np.concatenate([factor, factor[::-1]]) if self.walls else factor
