"""The Hamiltonian as one dense matrix, from plane waves and sines written out: no FFT, no splitting."""

from __future__ import annotations

import numpy as np

from wavejob.grid import Axis
from wavejob.hamiltonian import Hamiltonian

Array = np.ndarray


def kinetic_matrix(axis: Axis, mass: float) -> Array:
    """p^2 / 2m between the points of one axis."""
    n, d = axis.points, axis.x - axis.low
    if axis.transform == "sine":
        k = np.pi * np.arange(1, n + 1) / axis.length
        waves = np.sin(np.outer(d, k))
        waves /= np.sqrt((waves**2).sum(0))
    else:
        k = 2 * np.pi * (np.arange(n) - n // 2) / axis.length
        waves = np.exp(1j * np.outer(d, k)) / np.sqrt(n)
    return (waves * k**2 / (2 * mass)) @ waves.conj().T


def matrix(hamiltonian: Hamiltonian, t: float, *, runs: int, channels: int) -> list[Array]:
    """H(t) of each run, shape (channels * points,) * 2, points in C order."""
    grid = hamiltonian.grid
    points = int(np.prod(grid.shape))
    kinetic = np.zeros((1, 1))
    for axis, mass in zip(grid.axes, hamiltonian.masses, strict=True):
        here = kinetic_matrix(axis, mass)
        kinetic = np.kron(kinetic, np.eye(len(here))) + np.kron(np.eye(len(kinetic)), here)
    rates = np.zeros(grid.shape)
    for layer in hamiltonian.layers:
        along = np.zeros(grid.shape[layer.axis])
        along[layer.first : layer.first + len(layer.rate)] = layer.rate
        rates += grid.along(layer.axis, along)
    result = []
    for run in range(runs):
        total = np.zeros((channels, points, channels, points), complex)
        for c in range(channels):
            total[c, :, c] = kinetic - 1j * np.diag(rates.ravel())
        for part in hamiltonian.parts:
            values = part.factor(t) * part.values(t)
            shape = (runs, channels, channels) if part.couples else (runs, channels)
            values = np.broadcast_to(values, (*shape, *grid.shape))[run].reshape(*shape[1:], points)
            for c in range(channels):
                if part.couples:
                    for d in range(channels):
                        total[c, :, d] += np.diag(values[c, d])
                else:
                    total[c, :, c] += np.diag(values[c])
        result.append(total.reshape(channels * points, channels * points))
    return result
