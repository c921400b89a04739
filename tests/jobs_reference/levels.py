"""Packets expanded in the energy levels of a potential: exact at all times."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.special import ai_zeros, airy, eval_genlaguerre, gammaln

Array = np.ndarray


@dataclass(frozen=True)
class Levels:
    """Levels on a quadrature grid: x (points,), weight of a point, states (points, n), energies / hbar (n,)."""

    x: Array
    weight: float
    states: Array
    rates: Array

    def at(self, psi: Array, t: float) -> Array:
        """psi after a time t."""
        share = self.states.T @ psi * self.weight
        return np.asarray(self.states @ (share * np.exp(-1j * self.rates * t)))

    def captured(self, psi: Array) -> float:
        """How much of psi the levels hold; 1 where they are enough."""
        return float(np.sum(np.abs(self.states.T @ psi * self.weight) ** 2))


def gaussian(x: Array, at: float, sigma: float, k: float = 0.0) -> Array:
    return np.asarray((2 * np.pi * sigma**2) ** -0.25 * np.exp(-(((x - at) / (2 * sigma)) ** 2) + 1j * k * (x - at)))


def morse(omega: float, anharmonic: float, width: float, centre: float, x: Array) -> Levels:
    """Bound levels omega (v + 1/2) - anharmonic (v + 1/2)^2 and their states (Morse, Phys. Rev. 34 (1929) 57).

    omega and anharmonic as angular frequencies, width the length in exp(-(x - centre) / width).
    """
    twice = omega / anharmonic  # 2 lambda
    v = np.arange(int((twice - 1) / 2) + 1)
    z = twice * np.exp(-(x - centre) / width)
    columns = []
    for n in v:
        s = twice / 2 - n - 0.5
        log = 0.5 * (np.log(2 * s) + gammaln(n + 1) - gammaln(twice - n) - np.log(width)) + s * np.log(z) - z / 2
        columns.append(np.exp(log) * eval_genlaguerre(n, 2 * s, z))
    half = v + 0.5
    return Levels(x, x[1] - x[0], np.array(columns).T, omega * half - anharmonic * half**2)


def bouncer(scale: float, rate: float, count: int, x: Array) -> Levels:
    """Levels of a particle falling on a mirror at 0: energies rate abs(a_n), states Ai(x / scale + a_n).

    a_n zeros of Ai (DLMF 9.9), norm 1 / abs(Ai'(a_n)) (DLMF 9.11); scale (hbar^2 / 2 m^2 g)^(1/3),
    rate m g scale / hbar.
    """
    zeros, _, _, slopes = ai_zeros(count)
    states = airy(x[:, None] / scale + zeros)[0] / (np.abs(slopes) * np.sqrt(scale))
    return Levels(x, x[1] - x[0], states, -rate * zeros)


def sinc_grid(potential: Callable[[Array], Array], inertia: float, low: float, high: float, points: int) -> Levels:
    """All levels by diagonalising the Hamiltonian on a sinc grid (Colbert and Miller, J. Chem. Phys. 96
    (1992) 1982, from memory); `inertia` is hbar / 2 m and `potential` is V / hbar.
    """
    step = (high - low) / points
    x = low + (np.arange(points) + 0.5) * step
    apart = np.arange(points)[:, None] - np.arange(points)
    with np.errstate(divide="ignore"):
        kinetic = np.where(apart == 0, np.pi**2 / 3, 2.0 / apart.astype(float) ** 2) * (-1.0) ** apart
    rates, states = np.linalg.eigh(inertia / step**2 * kinetic + np.diag(potential(x)))
    return Levels(x, step, states / np.sqrt(step), rates)
