"""Transmission through potentials that end flat on both sides, averaged over a Gaussian packet.

Wave numbers and lengths in any one unit, energies as U = 2 m V / hbar^2, a squared wave number.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.integrate import quad
from scipy.special import airy

from .constants import HBAR


def squared_wavenumber(energy: float, mass: float, unit: float) -> float:
    """2 m E / hbar^2 in 1 / unit^2; energy in J, mass in kg, unit in m."""
    return 2 * mass * energy / HBAR**2 * unit**2


def packet_average(
    value: Callable[[float], float], k0: float, sigma: float, breaks: list[float] | None = None
) -> float:
    """Integral of abs(phi(k))^2 value(k) over k > 0, phi of a Gaussian packet.

    Exact for the late probability of a packet that starts where the potential is flat.
    """
    spread = 1 / (2 * sigma)

    def integrand(k: float) -> float:
        return np.sqrt(2 / np.pi) * sigma * np.exp(-2 * (sigma * (k - k0)) ** 2) * value(k)

    low, high = max(k0 - 9 * spread, 1e-9), k0 + 9 * spread
    inside = [b for b in breaks or [] if low < b < high]
    return float(quad(integrand, low, high, points=inside or None, epsabs=1e-13, epsrel=1e-11, limit=2000)[0])


def layers(k: float, thicknesses: list[float], heights: list[float], after: float = 0.0) -> tuple[float, np.ndarray]:
    """T and the amplitudes (right, left) at the start of every layer, for 1 incident from the left.

    The transfer matrix of piecewise constant potentials with one mass: Tsu and Esaki, Appl. Phys. Lett. 22 (1973)
    562 (from memory). `after` is U beyond the last layer.
    """
    inside = [np.sqrt(complex(k**2 - u)) for u in heights]
    beyond = np.sqrt(complex(k**2 - after))
    state, found = np.array([1.0 + 0j, 0.0]), []
    wave = beyond
    for q, d in zip(reversed(inside), reversed(thicknesses), strict=True):
        ratio = wave / q
        state = 0.5 * np.array([[1 + ratio, 1 - ratio], [1 - ratio, 1 + ratio]]) @ state
        state = np.array([np.exp(-1j * q * d), np.exp(1j * q * d)]) * state
        found.append(state)
        wave = q
    ratio = wave / k
    incident = 0.5 * ((1 + ratio) * state[0] + (1 - ratio) * state[1])
    share = float(beyond.real / k) / abs(incident) ** 2 if after < k**2 else 0.0
    return share, np.array(found[::-1]) / incident


def layer_dwell(k: float, thicknesses: list[float], heights: list[float], which: int) -> float:
    """Integral of abs(psi)^2 over one layer, divided by k: times m / hbar it is the dwell time in that layer.

    Averaged over the packet this is the time integral of the probability inside: Buettiker, Phys. Rev. B 27 (1983)
    6178 (from memory).
    """
    _, amplitudes = layers(k, thicknesses, heights)
    right, left = amplitudes[which]
    q, d = np.sqrt(complex(k**2 - heights[which])), thicknesses[which]

    def density(x: float) -> float:
        return float(abs(right * np.exp(1j * q * x) + left * np.exp(-1j * q * x)) ** 2)

    nodes, weights = np.polynomial.legendre.leggauss(40)
    return float(sum(w * density(d * (1 + z) / 2) for z, w in zip(nodes, weights, strict=True)) * d / 2 / k)


def tilted_barrier(k: float, width: float, height: float, drop: float) -> float:
    """T of a barrier of U = height whose top falls by `drop` across it, U = -drop beyond.

    Airy functions matched at both edges: Gundlach, Solid-State Electron. 9 (1966) 949 (from memory).
    """
    slope = (drop / width) ** (1 / 3)
    beyond = np.sqrt(k**2 + drop)

    def values(x: float) -> tuple[np.ndarray, np.ndarray]:
        ai, aip, bi, bip = airy((height - drop * x / width - k**2) / slope**2)
        return np.array([ai, bi]), -slope * np.array([aip, bip])

    (right, right_slope), (left, left_slope) = values(width), values(0.0)
    matrix = np.array([right, right_slope])
    inner = np.linalg.solve(matrix.astype(complex), np.array([1.0, 1j * beyond]))
    psi, slope_here = left @ inner, left_slope @ inner
    incident = 0.5 * (psi + slope_here / (1j * k))
    return float(beyond / k / abs(incident) ** 2)


def step(k: float, height: float) -> float:
    """T of a sharp step; 0 below it (Landau and Lifshitz, Quantum Mechanics, section 25)."""
    if k**2 <= height:
        return 0.0
    q = np.sqrt(k**2 - height)
    return float(4 * k * q / (k + q) ** 2)


def graded_step(k: float, height: float, width: float) -> float:
    """T of U = height (1 + tanh(x / width)) / 2 (Landau and Lifshitz, section 25, problem 3)."""
    if k**2 <= height:
        return 0.0
    q = np.sqrt(k**2 - height)
    reflected = (np.sinh(np.pi * width * (k - q) / 2) / np.sinh(np.pi * width * (k + q) / 2)) ** 2
    return float(1 - reflected)


def eckart(k: float, width: float, a: float, b: float) -> float:
    """T of A u / (1 + u) + B u / (1 + u)^2, u = exp(x / width) (Eckart, Phys. Rev. 35 (1930) 1303)."""
    if k**2 <= a:
        return 0.0
    alpha, beta = width * k, width * np.sqrt(k**2 - a)
    delta = 0.5 * np.sqrt(complex(4 * b * width**2 - 1))
    inner = np.cosh(2 * np.pi * delta).real
    return float(1 - (np.cosh(2 * np.pi * (alpha - beta)) + inner) / (np.cosh(2 * np.pi * (alpha + beta)) + inner))


def window(k: float, width: float, depth: float) -> float:
    """T of a well of U = -depth: 1 / (1 + (depth sin q width / 2 k q)^2) (Landau and Lifshitz, section 25)."""
    q = np.sqrt(k**2 + depth)
    return float(1 / (1 + (depth * np.sin(q * width) / (2 * k * q)) ** 2))


def reflectionless_advance(k: float, width: float) -> float:
    """How far the well -hbar^2 / (m width^2) / cosh^2(x / width), which never reflects, brings a wave ahead.

    t(k) = (k width + i) / (k width - i) (Landau and Lifshitz, section 25; Bargmann 1949, from memory).
    """
    return 2 * width / (1 + (k * width) ** 2)
