"""Stationary states from one run: the field at some places, Fourier transformed in time at each energy."""

from __future__ import annotations

import numpy as np

from ..grid import Axis
from .fourier import sums
from .integrals import every
from .interpolant import at_point

Array = np.ndarray


class Probes:
    """psi and psi' at some places, gathered while a run goes on."""

    def __init__(self, axis: Axis, places: tuple[float, ...], start: float) -> None:
        self._start = start
        self._points = np.concatenate([at_point(axis, x) for x in places])
        self._times: list[float] = []
        self._values: list[Array] = []

    def add(self, t: float, psi: Array) -> None:
        """psi of shape (points,) at time t."""
        self._times.append(t - self._start)
        # Not through BLAS: its threads cost more than this small product where cores are shared.
        self._values.append(np.einsum("ij,j->i", self._points, psi))

    def at(self, energies: Array, stride: int = 1) -> Array:
        """Integrals over time of psi, psi' and t psi times e^(iEt), t from the start; (places, 3, energies).

        The trapezoidal rule has no error for a signal that is sampled faster than the width of its spectrum
        and has died away at both ends; where the run ends early, `remainder.Remainder` says what is missing.
        """
        kept = every(stride, len(self._times))
        times, values = np.array(self._times)[kept], np.array(self._values)[kept].T
        weights = np.zeros(len(times))
        weights[1:] += np.diff(times) / 2
        weights[:-1] += np.diff(times) / 2
        psi, slope = values[::2] * weights, values[1::2] * weights
        signals = np.stack([psi, slope, times * psi], axis=1)
        return sums(times, signals.reshape(-1, len(times)).T, energies).T.reshape(-1, 3, len(energies))
