"""Gaussian packets in potentials at most quadratic in x, however these change in time.

Their mean follows Newton's equation, their width Ermakov's (Husimi, Prog. Theor. Phys. 9 (1953) 381; Lewis and
Riesenfeld, J. Math. Phys. 10 (1969) 1458; both from memory). SI units.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.integrate import solve_ivp

from .constants import HBAR

Function = Callable[[float], float]


def spread(sigma: float, mass: float, t: float) -> float:
    """Width of a free packet (Darwin 1927; also in any uniform field)."""
    return float(sigma * np.sqrt(1 + (HBAR * t / (2 * mass * sigma**2)) ** 2))


def newton(
    acceleration: Callable[[float, float], float], x: float, v: float, stop: float, longest: float
) -> tuple[float, float]:
    """Mean position and velocity at `stop` from x, v at 0."""
    found = solve_ivp(
        lambda t, y: [y[1], acceleration(t, y[0])],
        (0, stop),
        [x, v],
        method="DOP853",
        rtol=1e-11,
        atol=1e-30,
        max_step=longest,
    )
    return float(found.y[0, -1]), float(found.y[1, -1])


def breathing(stiffness: Function, mass: float, sigma: float, stop: float, longest: float) -> float:
    """Width at `stop` of a packet of width `sigma` at rest in m w(t)^2 = stiffness(t).

    Two classical solutions with u = 1, u' = 0 and v = 0, v' = 1 at 0 give
    sigma^2 = sigma_0^2 u^2 + (hbar / 2 m sigma_0)^2 v^2.
    """
    found = solve_ivp(
        lambda t, y: [y[1], -stiffness(t) / mass * y[0], y[3], -stiffness(t) / mass * y[2]],
        (0, stop),
        [1.0, 0.0, 0.0, 1.0],
        method="DOP853",
        rtol=1e-11,
        atol=1e-30,
        max_step=longest,
    )
    u, v = found.y[0, -1], found.y[2, -1]
    return float(np.hypot(sigma * u, HBAR / (2 * mass * sigma) * v))


def coherent_overlap(x: float, v: float, mass: float, omega: float) -> float:
    """abs(<0|alpha>)^2 = exp(-abs(alpha)^2) of a packet of ground-state width displaced by x and v."""
    return float(np.exp(-(mass * omega * x**2 + mass * v**2 / omega) / (2 * HBAR)))


def smooth_ramp(s: float) -> float:
    """6 s^5 - 15 s^4 + 10 s^3 from 0 to 1, flat outside."""
    s = min(max(s, 0.0), 1.0)
    return s**3 * (6 * s * s - 15 * s + 10)


def envelope(t: float, centre: float, fwhm: float) -> float:
    """A Gaussian of the given full width at half maximum, 1 at its centre."""
    return float(np.exp(-4 * np.log(2) * ((t - centre) / fwhm) ** 2))
