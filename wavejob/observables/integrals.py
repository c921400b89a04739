"""Integrals over time of evenly sampled values."""

from __future__ import annotations

from typing import Any

import numpy as np

Array = np.ndarray


class Samples:
    """Values at evenly spaced times, gathered during a run."""

    def __init__(self) -> None:
        self._times: list[float] = []
        self._values: list[float] = []

    def add(self, t: float, value: float) -> None:
        self._times.append(t)
        self._values.append(value)

    def thinned(self, stride: int) -> tuple[Array, Array]:
        """Times and values of every `stride`-th sample, and of the last."""
        kept = every(stride, len(self._times))
        return np.array(self._times)[kept], np.array(self._values)[kept]


def every(stride: int, count: int) -> Array:
    """Indices of every `stride`-th of `count`, and of the last."""
    return np.unique(np.append(np.arange(0, count, stride), count - 1))


def spline(times: Array, values: Array) -> Any:
    """The quintic spline through the samples (of lower degree where there are few).

    Its integral has weight 1 on inner samples, so that it is spectrally exact for a signal that the
    samples resolve and that has died away at both ends, and of sixth order where it has not.
    """
    from scipy.interpolate import make_interp_spline

    return make_interp_spline(times, values, k=min(5, len(times) - 1))


def running(times: Array, values: Array) -> Array:
    """The integral from the first time up to each time, shape (samples,)."""
    if len(times) < 2:
        return np.zeros(len(times))
    return np.asarray(spline(times, values).antiderivative()(times))


def positive_part(times: Array, values: Array) -> float:
    """Integral of max(value, 0), the spline asked at eight times as many places."""
    if len(times) < 2:
        return 0.0
    fine = np.linspace(times[0], times[-1], 8 * (len(times) - 1) + 1)
    return float(np.trapezoid(np.maximum(spline(times, values)(fine), 0), fine))
