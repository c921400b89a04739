"""Published closed forms, each with its source, in units with hbar = 1. Nothing here comes from wavejob."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.integrate import solve_ivp

Array = np.ndarray


# --- free motion ---


def free_gaussian(x: Array, t: float, *, at: float, sigma: float, k: float, mass: float = 1.0) -> Array:
    """psi(x, t). C. G. Darwin, Proc. R. Soc. A 117 (1927) 258; Cohen-Tannoudji, complement G_I (from memory)."""
    tau = t / (2 * mass * sigma**2)
    spread, away = 1 + 1j * tau, x - at - k * t / mass
    amplitude = (2 * np.pi * sigma**2) ** -0.25 / np.sqrt(spread)
    return amplitude * np.exp(-(away**2) / (4 * sigma**2 * spread) + 1j * k * (x - at) - 0.5j * k**2 * t / mass)


def free_width(t: float, sigma: float, mass: float = 1.0) -> float:
    """Standard deviation of position (Darwin 1927); the same in a uniform field (E. H. Kennard,
    Z. Phys. 44 (1927) 326)."""
    return float(sigma * np.hypot(1, t / (2 * mass * sigma**2)))


def airy_packet(x: Array, t: float, alpha: float) -> Array:
    """Finite-energy Airy packet, not normalised, m = 1. G. A. Siviloglou & D. N. Christodoulides, Opt. Lett. 32 (2007)
    979; without decay: M. V. Berry & N. L. Balazs, Am. J. Phys. 47 (1979) 264 (both from memory)."""
    from scipy.special import airy

    phase = alpha * x - alpha * t**2 / 2 - 1j * t**3 / 12 + 0.5j * alpha**2 * t + 0.5j * x * t
    return airy(x - t**2 / 4 + 1j * alpha * t)[0] * np.exp(phase)


def shutter_density(x: Array, t: float, k: float) -> Array:
    """|psi|^2 of exp(i k x) for x < 0, let go at t = 0, m = 1. M. Moshinsky, Phys. Rev. 88 (1952) 625 (from memory)."""
    from scipy.special import fresnel

    s, c = fresnel((k * t - x) / np.sqrt(np.pi * t))
    return ((c + 0.5) ** 2 + (s + 0.5) ** 2) / 2


# --- scattering: transmitted share as a function of the incoming wave number ---


def over_momenta(share: Callable[[Array], Array], *, sigma: float, k: float) -> float:
    """Integral of |phi(k)|^2 share(k) for a Gaussian packet: exact for a packet that starts and ends outside the
    potential, because each plane wave scatters by itself (any textbook)."""
    at = np.linspace(max(k - 4 / sigma, 1e-9), k + 4 / sigma, 40001)  # 8 standard deviations 1 / 2 sigma
    weight = np.sqrt(2 * sigma**2 / np.pi) * np.exp(-2 * sigma**2 * (at - k) ** 2)
    return float(np.trapezoid(weight * share(at), at))


def step_reflection(k: Array, height: float) -> Array:
    """Abrupt step, m = 1. Landau & Lifshitz, Quantum Mechanics, section 25, problem 1 (from memory)."""
    beyond = np.sqrt(k**2 - 2 * height + 0j)
    return np.abs((k - beyond) / (k + beyond)) ** 2


def barrier_transmission(k: Array, height: float, width: float) -> Array:
    """Rectangular barrier, or well with height < 0, m = 1. Landau & Lifshitz, section 25, problem 2 (from memory)."""
    inside = np.sqrt(k**2 - 2 * height + 0j)
    return 1 / (1 + np.abs(height * np.sin(inside * width) / (inside * k)) ** 2)


def barrier_dwell(k: Array, height: float, width: float) -> Array:
    """Dwell time below the top, m = 1. M. Buettiker, Phys. Rev. B 27 (1983) 6178, eq. 3.2 (numbering from memory)."""
    kappa = np.sqrt(2 * height - k**2 + 0j)
    d, k0 = kappa * width, np.sqrt(2 * height)
    numerator = 2 * d * (kappa**2 - k**2) + k0**2 * np.sinh(2 * d)
    return ((k / kappa) * numerator / (4 * k**2 * kappa**2 + k0**4 * np.sinh(d) ** 2)).real


def barrier_phase_time(k: Array, height: float, width: float) -> Array:
    """Phase time below the top, m = 1. T. E. Hartman, J. Appl. Phys. 33 (1962) 3427; Buettiker 1983, eq. 3.3."""
    kappa = np.sqrt(2 * height - k**2 + 0j)
    d, k0 = kappa * width, np.sqrt(2 * height)
    numerator = 2 * d * k**2 * (kappa**2 - k**2) + k0**4 * np.sinh(2 * d)
    return (numerator / (k * kappa * (4 * k**2 * kappa**2 + k0**4 * np.sinh(d) ** 2))).real


def sech2_transmission(k: Array, height: float, width: float) -> Array:
    """height / cosh^2(x / width), m = 1; height < 0 for a well. Landau & Lifshitz, section 25, problem 4."""
    through = np.sinh(np.pi * k * width) ** 2
    back = np.cosh(np.pi / 2 * np.sqrt(8 * height * width**2 - 1 + 0j)).real ** 2
    return through / (through + back)


def eckart_transmission(k: Array, drop: float, hump: float, width: float) -> Array:
    """A u/(1+u) + B u/(1+u)^2, u = exp(x / width), A = `drop`, B = `hump`, m = 1. C. Eckart, Phys. Rev. 35 (1930)
    1303, eq. 15 (form from memory)."""
    alpha, beta = width * k, width * np.sqrt(k**2 - 2 * drop)
    delta = np.cosh(np.pi * np.sqrt(8 * hump * width**2 - 1 + 0j)).real
    return 1 - (np.cosh(2 * np.pi * (alpha - beta)) + delta) / (np.cosh(2 * np.pi * (alpha + beta)) + delta)


def layered_transmission(k: Array, edges: list[float], heights: list[float]) -> Array:
    """Any stack of flat layers between zero and zero, m = 1, by 2 x 2 transfer matrices. R. Tsu & L. Esaki, Appl. Phys.
    Lett. 22 (1973) 562 (from memory). `edges` has one entry more than `heights`."""
    levels = [np.sqrt(k**2 - 2 * height + 0j) for height in (0.0, *heights, 0.0)]
    total = np.broadcast_to(np.eye(2), (*k.shape, 2, 2))
    for x, here, there in zip(edges, levels, levels[1:], strict=False):
        same, other = (here + there) / (2 * here), (here - there) / (2 * here)
        sum_, difference = np.exp(1j * (here + there) * x), np.exp(1j * (there - here) * x)
        rows = [same * difference, other / sum_], [other * sum_, same / difference]
        total = total @ np.moveaxis(np.array(rows), (0, 1), (-2, -1))
    return 1 / np.abs(total[..., 0, 0]) ** 2


# --- bound motion ---


def morse_levels(count: int, frequency: float, anharmonicity: float) -> Array:
    """omega (v + 1/2) - omega x (v + 1/2)^2, exact for Morse's potential. P. M. Morse, Phys. Rev. 34 (1929) 57."""
    v = np.arange(count) + 0.5
    return frequency * v - anharmonicity * v**2


def grid_levels(potential: Callable[[Array], Array], low: float, high: float, points: int, mass: float = 1.0) -> Array:
    """Energies from the dense sinc matrix of p^2 / 2m. D. T. Colbert & W. H. Miller, J. Chem. Phys. 96 (1992) 1982."""
    x, dx = np.linspace(low, high, points, retstep=True)
    apart = np.subtract.outer(np.arange(points), np.arange(points))
    with np.errstate(divide="ignore"):
        kinetic = np.where(apart == 0, np.pi**2 / 3, 2.0 * (-1.0) ** apart / np.square(apart, dtype=float))
    return np.linalg.eigvalsh(kinetic / (2 * mass * dx**2) + np.diag(potential(x)))


def ermakov(t: float, stiffness: Callable[[float], float]) -> tuple[float, float]:
    """rho and rho' at t of rho'' + omega^2(t) rho = rho^-3 from rho = 1 at rest: the width of an oscillator's ground
    state is rho / sqrt 2. V. P. Ermakov 1880; H. R. Lewis & W. B. Riesenfeld, J. Math. Phys. 10 (1969) 1458."""
    found = solve_ivp(
        lambda s, y: [y[1], y[0] ** -3 - stiffness(s) * y[0]], (0, t), [1, 0], "DOP853", rtol=1e-12, atol=1e-12
    )
    return float(found.y[0, -1]), float(found.y[1, -1])
