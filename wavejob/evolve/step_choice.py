"""The time step and the splitting that an accuracy asks for, estimated before the run."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ..hamiltonian import Hamiltonian
from .splittings import SPLITTINGS, Kick, Splitting

Array = np.ndarray

SITES = 24  # places along the axis where a packet is tried
WORST = 4  # of them that are followed over WINDOW steps
WINDOW = 48
ROOM = 5.0  # widths that trial packets keep from the ends
ENERGIES = 4.0  # standard deviations of energy above the mean that count for what is reached
PRESENT = 1e-6  # of the largest density: where the packet is
LEAST_CHANGE, MOST_CHANGE = 1.25, 8.0  # by which a step that errs too much is divided
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
    half steps, copies are followed over two windows of steps: a splitting errs once, by the change of
    variables that makes its own Hamiltonian of the true one, and then more and more, by the difference that
    is left. The first part counts once, the growth for the whole duration. A probability errs by at most
    twice the norm of the error.
    """
    longest = min(largest_step(hamiltonian), duration)
    trials = _trial_packets(hamiltonian, psi, start)
    choices = []
    for splitting in SPLITTINGS.values():
        if splitting.order not in orders or (splitting.uses_gradient and hamiltonian.couples):
            continue
        step = longest
        while True:
            error = 2 * _error(hamiltonian, splitting, trials, start, duration, step)
            if error <= accuracy or step <= longest * SMALLEST:
                break
            step /= min(max((error / accuracy) ** (1 / splitting.order), LEAST_CHANGE), MOST_CHANGE)
        limited = "the kinetic phase of pi" if step == longest else f"an estimated error of {error:.1e}"
        reason = f"order {splitting.order}, step limited by {limited}"
        choices.append(StepChoice(splitting, step, reason, error if math.isfinite(error) else math.inf))
    good = [choice for choice in choices if choice.error <= accuracy]
    if not good:
        return min(choices, key=lambda choice: choice.error)
    return min(good, key=lambda choice: choice.splitting.stages / choice.step)


def _trial_packets(hamiltonian: Hamiltonian, psi: Array, start: float) -> Array:
    """Copies of `psi` at places it may reach, each with the mean momentum of its energy there, (sites, points)."""
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
    return np.asarray(table / np.linalg.norm(table, axis=1, keepdims=True))


def _reach(x: Array, potential: Array, density: Array, energy: float) -> tuple[float, float]:
    """From the first to the last place where the packet is, or where its energy would let it be."""
    open_ = np.flatnonzero((potential <= energy) | (density > PRESENT * density.max()))
    return float(x[open_[0]]), float(x[open_[-1]])


def _error(
    hamiltonian: Hamiltonian, splitting: Splitting, packets: Array, start: float, duration: float, step: float
) -> float:
    """The estimated norm of the final error, from the worst of the packets and, in time, of a few starts."""
    times = start + duration * (np.arange(6) + 0.37) / 6 if hamiltonian.depends_on_time else [start]
    share = 1 / (1 - 2.0**-splitting.order)  # the half steps err too
    worst = 0.0
    for t in times:
        single = _differences(hamiltonian, splitting, packets, t, step, 1)[-1]
        followed = packets[np.argsort(single)[-WORST:]]
        middle, end = _differences(hamiltonian, splitting, followed, t, step, WINDOW)
        growth = np.maximum(end - middle, 0) / (WINDOW / 2 * step)
        worst = max(worst, share * float((end + growth * duration).max()))
    return worst


def _differences(
    hamiltonian: Hamiltonian, splitting: Splitting, packets: Array, t: float, step: float, steps: int
) -> tuple[Array, Array]:
    """Norm of the difference between steps and pairs of half steps, after half of `steps` and after all."""
    whole, half = _Steps(hamiltonian, splitting, step), _Steps(hamiltonian, splitting, step / 2)
    one = two = whole.continued(packets)
    found = []
    for n in range(steps):
        now = t + n * step
        one = whole.made(one, now)
        two = half.made(half.made(two, now), now + step / 2)
        if n + 1 in (steps // 2, steps):
            found.append(np.linalg.norm((one - two)[:, : packets.shape[1]], axis=1))
    return found[0], found[-1]


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
            slopes = [
                part.factor(at) * part.gradient(at)[0][0, 0] for part in self.hamiltonian.parts if part.gradient
            ]
            energy = energy - kick.gradient * self.step**2 * sum(slopes) ** 2 / self.hamiltonian.masses[0]
        factor = np.exp(-1j * self.step * kick.weight * energy)
        return np.concatenate([factor, factor[::-1]]) if self.walls else factor
