"""The trigonometric interpolant of a field between grid points: values, slopes, probabilities of regions."""

from __future__ import annotations

import numpy as np

from ..grid import Axis
from ..shapes import Breaks

Array = np.ndarray


def at_point(axis: Axis, x: float) -> Array:
    """Rows that give psi(x) and psi'(x) as dot products with psi on the grid, complex, shape (2, points)."""
    if axis.transform == "sine":
        here, there, k = axis.x - axis.low, x - axis.low, axis.k
        share = np.full(axis.points, 2.0 / axis.points)
        share[-1] /= 2
        waves = np.sin(np.outer(here, k)) * share
        return np.stack([waves @ np.sin(k * there), waves @ (k * np.cos(k * there))]).astype(complex)
    k = axis.k
    share = np.full(axis.points, 1.0 / axis.points)
    if axis.points % 2 == 0:
        share[axis.points // 2] = 0  # the wave number that cannot tell left from right
    waves = share * np.exp(1j * k * (x - axis.x[0]))
    return np.stack([np.fft.fft(waves), np.fft.fft(1j * k * waves)]).astype(complex)


def gradient(axis: Axis, psi: Array) -> Array:
    """psi' at the grid points; psi has shape (..., points)."""
    if axis.transform == "sine":
        from scipy import fft  # here, so that reading a job does not wait for it

        amplitudes = fft.dst(psi.real, type=2) + 1j * fft.dst(psi.imag, type=2)
        slopes = np.zeros_like(amplitudes)
        slopes[..., 1:] = (amplitudes * axis.k)[..., :-1]
        return np.asarray(fft.idct(slopes.real, type=2) + 1j * fft.idct(slopes.imag, type=2))
    k = axis.k.copy()
    if axis.points % 2 == 0:
        k[axis.points // 2] = 0
    return np.asarray(np.fft.ifft(1j * k * np.fft.fft(psi)))


def fine_density(axis: Axis, psi: Array) -> Array:
    """abs(psi)^2 of the interpolant at twice as many points, where its Fourier series is exact; (..., 2 points)."""
    points = axis.points
    if axis.transform == "sine":
        from scipy import fft

        padded = np.zeros((*psi.shape[:-1], 2 * points), complex)
        padded[..., :points] = fft.dst(psi.real, type=2) + 1j * fft.dst(psi.imag, type=2)
        padded[..., points - 1] /= 2  # the last sine has half the weight on the coarse points
        fine = 2 * (fft.idst(padded.real, type=2) + 1j * fft.idst(padded.imag, type=2))
        return np.asarray(np.abs(fine) ** 2)
    padded = np.zeros((*psi.shape[:-1], 2 * points), complex)
    amplitudes = np.fft.fft(psi)
    half = points // 2
    padded[..., : half + points % 2] = amplitudes[..., : half + points % 2]
    padded[..., -half:] = amplitudes[..., -half:]
    # The fine points stand a quarter of a coarse spacing before the coarse ones.
    k = 2 * np.pi * np.fft.fftfreq(2 * points, axis.spacing / 2)
    fine = 2 * np.fft.ifft(padded * np.exp(-0.25j * k * axis.spacing))
    return np.asarray(np.abs(fine) ** 2)


def finer(axis: Axis, psi: Array, times: int) -> Array:
    """The interpolant at `times` as many points, again half a spacing from the ends; psi and result (..., points)."""
    if axis.transform == "sine":
        doubled = Axis(axis.name, axis.low - axis.length, axis.high, 2 * axis.points)
        return finer(doubled, np.concatenate([-psi[..., ::-1], psi], axis=-1), times)[..., times * axis.points :]
    amplitudes = np.fft.fft(psi)
    half = axis.points // 2
    padded = np.zeros((*psi.shape[:-1], times * axis.points), complex)
    padded[..., : half + axis.points % 2] = amplitudes[..., : half + axis.points % 2]
    padded[..., -half:] = amplitudes[..., -half:]
    k = 2 * np.pi * np.fft.fftfreq(times * axis.points, axis.spacing / times)
    return np.asarray(times * np.fft.ifft(padded * np.exp(-0.5j * k * axis.spacing * (1 - 1 / times))))


def region_weights(axis: Axis, start: float, stop: float) -> Array:
    """Weights whose dot product with `fine_density` is the probability between two places, (2 points,)."""
    fine = Axis(axis.name, axis.low, axis.high, 2 * axis.points, axis.transform)
    inside = Breaks.of((max(start, axis.low), 1.0, 0.0), (min(stop, axis.high), -1.0, 0.0))
    return inside.sampled(fine, damped=False)[0] * fine.spacing
