"""Stationary states from one run: the field at a place, Fourier transformed in time at each energy."""

from __future__ import annotations

import numpy as np

from ..grid import Axis
from .integrals import every
from .interpolant import at_point

Array = np.ndarray

AT_ONCE = 2**22  # complex exponentials held at a time


class Probe:
    """psi and psi' at one place, gathered while a run goes on."""

    def __init__(self, axis: Axis, x: float, start: float) -> None:
        self.x, self._start = x, start
        self._point = at_point(axis, x)
        self._times: list[float] = []
        self._values: list[Array] = []

    def add(self, t: float, psi: Array) -> None:
        """psi of shape (points,) at time t."""
        self._times.append(t - self._start)
        self._values.append(self._point @ psi)

    def at(self, energies: Array, stride: int = 1) -> Array:
        """Integrals over time of psi, psi' and t psi times e^(iEt), t from the start; shape (3, energies).

        The trapezoidal rule has no error for a signal that is sampled faster than the width of its spectrum
        and has died away at both ends; where the run ends early, `remainder.Remainder` says what is missing.
        """
        kept = every(stride, len(self._times))
        times, values = np.array(self._times)[kept], np.array(self._values)[kept]
        weights = np.zeros(len(times))
        weights[1:] += np.diff(times) / 2
        weights[:-1] += np.diff(times) / 2
        signals = np.stack([values[:, 0], values[:, 1], times * values[:, 0]], axis=1) * weights[:, None]
        batches = np.array_split(energies, max(len(energies) * len(times) // AT_ONCE, 1))
        return np.concatenate([np.exp(1j * np.outer(batch, times)) @ signals for batch in batches]).T
