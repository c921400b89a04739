"""Exponentials of the channel matrix of each point, where channels are coupled."""

from __future__ import annotations

import numpy as np

Array = np.ndarray


def matrix_exponential(diagonal: Array, coupling: Array, share: float) -> Array:
    """exp(-i share H) with H = coupling + diag(diagonal), Hermitian.

    diagonal  real, broadcasting against (runs, channels, *grid)
    coupling  shape (1 or runs, channels, channels, *grid), as is the result
    """
    channels = coupling.shape[1]
    unit = np.eye(channels).reshape(1, channels, channels, *(1,) * (diagonal.ndim - 2))
    matrix = coupling + diagonal[:, :, None] * unit
    if channels == 2:
        return _two_by_two(matrix, share)
    energies, states = np.linalg.eigh(np.moveaxis(matrix, (1, 2), (-2, -1)))
    turned = (states * np.exp(-1j * share * energies)[..., None, :]) @ states.conj().swapaxes(-1, -2)
    return np.ascontiguousarray(np.moveaxis(turned, (-2, -1), (1, 2)))


def _two_by_two(matrix: Array, share: float) -> Array:
    """With H = mean + D and D^2 = w^2: exp(-i s H) = exp(-i s mean) (cos(s w) - i D sin(s w) / w) (Rabi)."""
    upper, lower = matrix[:, 0, 0].real, matrix[:, 1, 1].real
    mean, half = (upper + lower) / 2, (upper - lower) / 2
    angle = share * np.hypot(half, np.abs(matrix[:, 0, 1]))
    cosine, turn = np.cos(angle), -1j * share * np.sinc(angle / np.pi)
    table = np.empty(matrix.shape, complex)
    table[:, 0, 0] = cosine + turn * half
    table[:, 1, 1] = cosine - turn * half
    table[:, 0, 1] = turn * matrix[:, 0, 1]
    table[:, 1, 0] = turn * matrix[:, 1, 0]
    table *= np.exp(-1j * share * mean)[:, None, None]
    return table
