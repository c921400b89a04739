"""The lowest levels of p^2 / 2 mass + V on the points of an axis, hbar = 1.

A grid coarse enough for a dense matrix gives the levels; where the axis has more points, its states are
carried over and sharpened by the locally optimal block preconditioned conjugate gradient method
(A. V. Knyazev, SIAM J. Sci. Comput. 23, 517 (2001)) with the kinetic energy as preconditioner: what the
coarse grid lacks are fast waves, and those the kinetic energy rules.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from .grid import Axis, fast_size

Array = np.ndarray

DENSE = 256, 2048  # points of the coarse grid: first tried, and at the most
HEAD_ROOM = 2.5  # largest wave number of the coarse grid over that of the highest level, at the least
GUARDS = 4  # states carried along above those wanted
ITERATIONS = 200
ROUNDING = 1e-14  # residual that rounding leaves, relative to the largest kinetic and potential energy
CONVERGED = 1e-8  # largest residual over the kinetic room of the level (E - min V) that is accepted


class LevelsError(ValueError):
    """Why the levels cannot be had, and what to change."""

    def __init__(self, message: str, fix: str) -> None:
        super().__init__(message)
        self.message, self.fix = message, fix


@dataclass(frozen=True)
class Levels:
    """Energies in rising order and residuals ||H psi - E psi||, shape (count,); states (count, points).

    States are real, normalised to 1, and positive where, from the left, they first reach half their maximum.
    """

    energies: Array
    residuals: Array
    states: Array


Potential = Callable[[Axis], Array]  # values at the points of an axis


def lowest(axis: Axis, mass: float, potential: Potential, count: int) -> Levels:
    """The `count` lowest levels. Raises LevelsError where the axis cannot hold them or none are found."""
    if count + GUARDS > axis.points // 4:
        needed = 8 * (count + GUARDS)
        raise LevelsError(f"{axis.points} points cannot hold {count} levels", f"give at least {needed}")
    values = potential(axis)
    coarse, states = _coarse(axis, mass, potential, count + GUARDS)
    if coarse.points < axis.points:
        states = _carried(coarse, axis, states)
    energies, residuals, states = _sharpened(axis, mass, values, states, count)
    if np.any(residuals > np.maximum(CONVERGED * (energies - values.min()), 10 * _floor(axis, mass, values))):
        raise LevelsError("the levels do not converge on this grid", "give other points or a smoother potential")
    return Levels(energies, residuals, _signed(states) / math.sqrt(axis.spacing))


def apply_kinetic(axis: Axis, function: Callable[[Array], Array], states: Array) -> Array:
    """`function` of the wave numbers, applied to real states (..., points)."""
    from scipy import fft  # here, so that reading a job does not wait for it

    if axis.transform == "sine":
        return np.asarray(fft.idst(function(axis.k) * fft.dst(states, type=2), type=2))
    k = 2 * np.pi * fft.rfftfreq(axis.points, axis.spacing)
    return np.asarray(fft.irfft(function(k) * fft.rfft(states), axis.points))


def applied(axis: Axis, mass: float, values: Array, states: Array) -> Array:
    """H on real states (..., points), with the potential `values` at the points."""
    return np.asarray(apply_kinetic(axis, lambda k: k**2 / (2 * mass), states) + values * states)


def residual(axis: Axis, mass: float, values: Array, state: Array) -> tuple[float, float]:
    """Mean energy of a real normalised state, and ||H psi - E psi||."""
    image = applied(axis, mass, values, state)
    energy = float(state @ image) * axis.spacing
    return energy, float(np.linalg.norm(image - energy * state)) * math.sqrt(axis.spacing)


def _coarse(axis: Axis, mass: float, potential: Potential, count: int) -> tuple[Axis, Array]:
    """The levels on the coarsest grid whose waves are fast enough; the squares of a state add up to 1."""
    from scipy.linalg import eigh

    points = min(max(DENSE[0], fast_size(8 * count)), axis.points)
    while True:
        coarse = replace(axis, points=points)
        values = potential(coarse)
        matrix = applied(coarse, mass, 0.0 * values, np.eye(points)) + np.diag(values)
        energies, vectors = eigh((matrix + matrix.T) / 2, subset_by_index=(0, count - 1))
        needed = HEAD_ROOM * math.sqrt(2 * mass * max(float(energies[-1] - values.min()), 0.0))
        if points == axis.points or coarse.k_max > needed:
            return coarse, vectors.T
        if 2 * points > DENSE[1]:
            raise LevelsError(
                "the levels have waves too short for an axis this long",
                f"shorten it to {DENSE[1] * math.pi / needed:.3g}, or ask for lower levels",
            )
        points = min(2 * points, axis.points)


def _carried(coarse: Axis, axis: Axis, states: Array) -> Array:
    """States on the points of a finer axis, by their Fourier or sine series."""
    from scipy import fft

    if axis.transform == "sine":
        amplitudes = np.zeros((len(states), axis.points))
        amplitudes[:, : coarse.points] = fft.dst(states, type=2)
        return np.asarray(fft.idst(amplitudes, type=2))
    k = 2 * np.pi * fft.rfftfreq(coarse.points, coarse.spacing)
    amplitudes = np.zeros((len(states), axis.points // 2 + 1), complex)
    shifted = fft.rfft(states) * np.exp(1j * k * (axis.spacing - coarse.spacing) / 2)
    amplitudes[:, : shifted.shape[1] - 1] = shifted[:, :-1]
    return np.asarray(fft.irfft(amplitudes, axis.points))


def _sharpened(axis: Axis, mass: float, values: Array, states: Array, count: int) -> tuple[Array, Array, Array]:
    """Energies, residuals and states (rows of length 1) of the lowest `count` levels near the given ones."""
    floor, block, search, best = _floor(axis, mass, values), len(states), states, np.inf
    for _ in range(ITERATIONS):
        basis = np.linalg.qr(search.T)[0].T
        image = applied(axis, mass, values, basis)
        small = basis @ image.T
        energies, mixing = np.linalg.eigh((small + small.T) / 2)
        states, images = mixing.T[:block] @ basis, mixing.T[:block] @ image
        errors = images - energies[:block, None] * states
        residuals = np.linalg.norm(errors, axis=1)
        largest = float(residuals[:count].max())
        if largest < floor or (largest > 0.9 * best and largest < 100 * floor):
            break
        best = min(best, largest)
        room = max(float(energies[count - 1] - values.min()), floor)
        inverse = apply_kinetic(axis, partial(_inverse, mass, room), errors)
        moved = mixing[block:, :block].T @ basis[block:]
        search = np.concatenate([states, *(_scaled(rows) for rows in (inverse, moved) if np.any(rows))])
    return energies[:count], residuals[:count], states[:count]


def _floor(axis: Axis, mass: float, values: Array) -> float:
    return ROUNDING * (axis.k_max**2 / (2 * mass) + float(np.abs(values).max()))


def _inverse(mass: float, room: float, k: Array) -> Array:
    return 1 / (k**2 / (2 * mass) + room)


def _scaled(rows: Array) -> Array:
    lengths = np.linalg.norm(rows, axis=1, keepdims=True)
    return np.asarray(rows / np.where(lengths > 0, lengths, 1.0))


def _signed(states: Array) -> Array:
    size = np.abs(states)
    first = np.argmax(size >= 0.5 * size.max(axis=1, keepdims=True), axis=1)
    return np.asarray(states * np.sign(states[np.arange(len(states)), first])[:, None])
