"""Sums of samples times e^(iEt), at any energies and at evenly spaced ones."""

from __future__ import annotations

import numpy as np

Array = np.ndarray

AT_ONCE = 2**22  # complex exponentials held at a time


def sums(times: Array, signals: Array, energies: Array) -> Array:
    """Sum over times of e^(i E t) signals, (energies, signals); `signals` has shape (times, signals)."""
    batches = np.array_split(energies, max(len(energies) * len(times) // AT_ONCE, 1))
    return np.concatenate([np.exp(1j * np.outer(batch, times)) @ signals for batch in batches])


def even_sums(spacing: float, values: Array, low: float, step: float, count: int) -> Array:
    """Sum over n of e^(i E n spacing) values[n] at E = low + m step, shape (count,).

    With nm = (n^2 + m^2 - (m - n)^2) / 2 it is a convolution (L. I. Bluestein, IEEE Trans. 18, 451 (1970)).
    """
    n, m = np.arange(len(values)), np.arange(count)
    size = 1 << (len(values) + count - 2).bit_length()
    turn = 0.5j * step * spacing
    chirp = np.zeros(size, complex)
    chirp[:count] = np.exp(-turn * m.astype(float) ** 2)
    chirp[size - len(values) + 1 :] = np.exp(-turn * n[:0:-1].astype(float) ** 2)
    turned = values * np.exp(1j * low * spacing * n + turn * n.astype(float) ** 2)
    found = np.fft.ifft(np.fft.fft(turned, size) * np.fft.fft(chirp))[:count]
    return np.asarray(found * np.exp(turn * m.astype(float) ** 2))
