"""Lines of a spectrum: energies and weights of the exponentials that a signal is made of."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from .fourier import even_sums, sums

Array = np.ndarray

BETA = 14.0  # of the Kaiser window
LEAKAGE = 5.1e-6  # height of its largest side lobe over that of the line (-106 dB)
HALF_LOBE = math.hypot(BETA, math.pi)  # from the top of a line to its first zero, in hbar / duration
SPREAD = 0.17  # a doublet of equal lines s apart differs from one line by 0.17 s^2 duration^2 / (2 beta)
PER_LOBE = 8  # energies looked at in half a main lobe
ROUNDS, ENOUGH = 12, 1e-12  # of Newton's method; and its last step, in half lobes
MOST = 400  # lines fitted together


def resolution(duration: float) -> float:
    """Energy within which two lines are not told apart by a run of this duration (hbar = 1)."""
    return HALF_LOBE / duration


def line_shape(x: Array) -> tuple[Array, Array, Array]:
    """The Kaiser window's transform, 1 at x = 0, and its first two derivatives; x is energy times duration.

    sinh(r) / r with r^2 = beta^2 - x^2, over its value at 0 (J. F. Kaiser, in System Analysis by Digital
    Computer, 1966).
    """
    square = BETA**2 - np.asarray(x, dtype=complex) ** 2
    near = np.abs(square) < 1e-2
    r = np.sqrt(np.where(near, 1.0, square))
    scale = BETA / math.sinh(BETA)
    value = np.where(near, 1 + square / 6 + square**2 / 120, np.sinh(r) / r)
    # With g(q) = sinh(sqrt q) / sqrt q: 2 q g' = cosh(sqrt q) - g and 4 q g'' = g - 6 g'; near 0 the series.
    slope = np.where(near, 1 / 6 + square / 60 + square**2 / 1680, (np.cosh(r) - value) / (2 * r**2))
    bend = np.where(near, 1 / 60 + square / 840, (value - 6 * slope) / (4 * r**2))
    first = -2 * x * slope
    second = -2 * slope + 4 * x**2 * bend
    return (scale * value).real, (scale * first).real, (scale * second).real


@dataclass(frozen=True)
class Lines:
    """Energies in rising order, weights, and the largest deviation from one line near each: (lines,)."""

    energies: Array
    weights: Array
    deviations: Array


@dataclass(frozen=True)
class Signal:
    """c(t) = sum of w_n e^(-i E_n t) at evenly spaced times from 0 on, with c(-t) = conj c(t)."""

    spacing: float
    values: Array

    @property
    def duration(self) -> float:
        return self.spacing * (len(self.values) - 1)

    @property
    def times(self) -> Array:
        return np.asarray(self.spacing * np.arange(len(self.values)))

    def windowed(self) -> Array:
        """The samples, weighted so that a line of weight 1 has the height 1."""
        window = np.i0(BETA * np.sqrt(np.maximum(1 - (self.times / self.duration) ** 2, 0.0)))
        window[[0, -1]] /= 2
        return np.asarray(self.values * window / window.sum())

    def intensity(self, low: float, step: float, count: int) -> Array:
        """The windowed spectrum at low + j step, shape (count,)."""
        return np.asarray(even_sums(self.spacing, self.windowed(), low, step, count).real)

    def intensity_at(self, energies: Array) -> tuple[Array, Array]:
        """The windowed spectrum and its slope at any energies."""
        values, times = self.windowed(), self.times
        signals = np.stack([values, 1j * times * values], axis=1)
        found = sums(times, signals, energies).real
        return found[:, 0], found[:, 1]

    def lines(self, low: float, high: float, lightest: float) -> Lines:
        """All lines between two energies of at least the weight `lightest`."""
        step = resolution(self.duration) / PER_LOBE
        energies = low + step * np.arange(max(math.ceil((high - low) / step) + 1, 3))
        intensity = self.intensity(low, step, len(energies))
        tops = np.flatnonzero((intensity[1:-1] > intensity[:-2]) & (intensity[1:-1] >= intensity[2:])) + 1
        tops = tops[intensity[tops] > max(2 * LEAKAGE, lightest / 30)]
        tops = np.sort(tops[np.argsort(intensity[tops])[::-1][:MOST]])
        if not tops.size:
            return Lines(np.empty(0), np.empty(0), np.empty(0))
        found, weights = self._fitted(energies[tops], intensity[tops])
        kept = weights >= lightest
        model = _model(energies, found, weights, self.duration)
        away = np.abs(intensity - model)
        near = [np.abs(energies - e) < resolution(self.duration) for e in found[kept]]
        deviations = np.array([away[around].max(initial=0.0) for around in near])
        order = np.argsort(found[kept])
        return Lines(found[kept][order], weights[kept][order], deviations[order])

    def _fitted(self, energies: Array, weights: Array) -> tuple[Array, Array]:
        """Energies and weights for which all lines together have the spectrum's value and slope at each.

        So the side lobes of one line do not shift another: Newton's method from the tops.
        """
        duration, half = self.duration, resolution(self.duration)
        count = len(energies)
        for _ in range(ROUNDS):
            value, slope = self.intensity_at(energies)
            shape, first, second = line_shape((energies[:, None] - energies) * duration)
            missing = np.concatenate([value - shape @ weights, slope / duration - first @ weights])
            matrix = np.block([[shape, -first * weights], [first, -second * weights]])
            change = np.linalg.lstsq(matrix, missing, rcond=1e-10)[0]
            weights = weights + change[:count]
            moved = np.clip(change[count:] / duration, -half / 4, half / 4)
            energies = energies + moved
            if np.abs(moved).max() < ENOUGH * half:
                break
        return energies, weights


def _model(energies: Array, lines: Array, weights: Array, duration: float) -> Array:
    """The spectrum that these lines make."""
    total = np.zeros(len(energies))
    for line, weight in zip(lines, weights, strict=True):
        total += weight * line_shape((energies - line) * duration)[0]
    return total


def hidden_splitting(deviation: Array, duration: float) -> Array:
    """How far apart two equal lines are that differ from one by `deviation`, relative to its height."""
    return np.asarray(np.sqrt(2 * BETA * np.abs(deviation) / SPREAD) / duration)
