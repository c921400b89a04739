"""The time step and the splitting that an accuracy asks for, estimated before the run."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ..hamiltonian import Hamiltonian
from .splittings import SPLITTINGS, Splitting

Array = np.ndarray

SITES = 24  # places along the axis where a packet is tried
WORST = 4  # of them that are followed over WINDOW steps
WINDOW = 48
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
    trials = _trial_packets(hamiltonian, psi)
    choices = []
    for splitting in SPLITTINGS.values():
        if splitting.order not in orders or (splitting.uses_gradient and hamiltonian.couples):
            continue
        step = longest
        while True:
            error = 2 * _error(hamiltonian, splitting, trials, start, duration, step)
            if error <= accuracy or step <= longest * SMALLEST:
                break
            # The order is read off what halving does, not assumed; never less than halve, never more than 8 times.
            step /= min(max((error / accuracy) ** (1 / splitting.order), 2.0), 8.0) if error > accuracy else 2
        limited = "the kinetic phase of pi" if step == longest else f"an estimated error of {error:.1e}"
        reason = f"order {splitting.order}, step limited by {limited}"
        choices.append(StepChoice(splitting, step, reason, error if math.isfinite(error) else math.inf))
    good = [choice for choice in choices if choice.error <= accuracy]
    if not good:
        return min(choices, key=lambda choice: choice.error)
    return min(good, key=lambda choice: choice.splitting.stages / choice.step)


def _trial_packets(hamiltonian: Hamiltonian, psi: Array) -> Array:
    """Copies of `psi` at SITES places, each with the mean momentum of its energy there, shape (sites, points)."""
    axis, mass = hamiltonian.grid.axes[0], hamiltonian.masses[0]
    potential = hamiltonian.potential(0.0)[0, 0]
    density = np.abs(psi) ** 2
    density /= density.sum()
    mean = float(density @ axis.x)
    spread = math.sqrt(float(density @ (axis.x - mean) ** 2))
    slope = np.gradient(psi, axis.spacing)
    k0 = float(np.vdot(psi, slope).imag / np.vdot(psi, psi).real)
    energy = k0**2 / (2 * mass) + float(density @ potential)
    width = min(spread, axis.length / 12)
    places = axis.low + axis.length * (np.arange(SITES) + 0.5) / SITES
    steepest = axis.x[np.argsort(np.abs(np.gradient(potential)))[::-1][:4]]
    packets = []
    for place in (*places, *steepest):
        local = np.exp(-(((axis.x - place) / (2 * width)) ** 2))
        here = float(np.interp(place, axis.x, potential))
        k = math.sqrt(max(2 * mass * (energy - here), 0.0))
        packets.append(local * np.exp(1j * k * (axis.x - place)))
    packets.append(psi)
    table = np.array(packets)
    return table / np.linalg.norm(table, axis=1, keepdims=True)


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
    whole = halves = packets
    found = []
    for n in range(steps):
        now = t + n * step
        whole = _stepped(hamiltonian, splitting, whole, now, step)
        halves = _stepped(hamiltonian, splitting, halves, now, step / 2)
        halves = _stepped(hamiltonian, splitting, halves, now + step / 2, step / 2)
        if n + 1 in (steps // 2, steps):
            found.append(np.linalg.norm(whole - halves, axis=1))
    return found[0], found[-1]


def _stepped(hamiltonian: Hamiltonian, splitting: Splitting, packets: Array, t: float, step: float) -> Array:
    """One step by plain numpy transforms; on an axis with walls the odd continuation is advanced."""
    axis, mass = hamiltonian.grid.axes[0], hamiltonian.masses[0]
    walls = axis.transform == "sine"
    psi = np.concatenate([packets, -packets[:, ::-1]], axis=1) if walls else packets
    k = 2 * np.pi * np.fft.fftfreq(psi.shape[1], axis.spacing)
    for index, kick in enumerate(splitting.kicks):
        at = t + kick.at * step
        energy = hamiltonian.potential(at)[0, 0]
        if kick.gradient:
            slope = sum(part.factor(at) * part.gradient(at)[0][0, 0] for part in hamiltonian.parts if part.gradient)
            energy = energy - kick.gradient * step**2 * slope**2 / mass
        if walls:
            energy = np.concatenate([energy, energy[::-1]])
        psi = psi * np.exp(-1j * step * kick.weight * energy)
        if index < len(splitting.drifts):
            drift = np.exp(-1j * step * splitting.drifts[index] * k**2 / (2 * mass))
            psi = np.fft.ifft(drift * np.fft.fft(psi))
    return psi[:, : packets.shape[1]]
