"""Outside values for the electron jobs: lengths in nm, times in fs, energies in eV."""

from __future__ import annotations

import numpy as np
from scipy.optimize import brentq, minimize_scalar

from .constants import EV, HBAR, M_E
from .levels import gaussian
from .motion import envelope, newton, spread
from .scattering import graded_step, layer_dwell, layers, packet_average, squared_wavenumber, tilted_barrier, window

GAAS = 0.067 * M_E
OXIDE = 0.42 * M_E


def gaas(energy: float) -> float:
    return squared_wavenumber(energy * EV, GAAS, 1e-9)


def stack(first: float, well: float, second: float) -> dict[str, float]:
    """A 300 meV double barrier met by a packet of 88.5 meV and 20 nm."""
    thicknesses, heights = [first, well, second], [gaas(0.3), 0.0, gaas(0.3)]
    k0 = np.sqrt(gaas(0.0885))
    passed = packet_average(lambda k: layers(k, thicknesses, heights)[0], k0, 20)
    inside = packet_average(lambda k: layer_dwell(k, thicknesses, heights, 1), k0, 20) * GAAS / HBAR * 1e-3
    return {"transmitted.total": passed, "reflected.total": 1 - passed, "hold.time": inside}


def first_light() -> dict[str, float]:
    """The nominal stack, with the top and the width of its lowest level in meV."""
    thicknesses, heights = [3.0, 5.0, 3.0], [gaas(0.3), 0.0, gaas(0.3)]

    def passed(energy: float) -> float:
        return layers(np.sqrt(gaas(energy)), thicknesses, heights)[0]

    top = minimize_scalar(lambda e: -passed(e), bracket=(0.085, 0.0885, 0.092), tol=1e-12)
    half = [brentq(lambda e: passed(e) + top.fun / 2, *between) for between in ((0.07, top.x), (top.x, 0.11))]
    level = {"T.peak[0].energy": top.x * 1e3, "T.peak[0].width": (half[1] - half[0]) * 1e3}
    return {**stack(3.0, 5.0, 3.0), **level}


def thick_second() -> dict[str, float]:
    return stack(3.0, 5.0, 3.15)


def one_monolayer() -> dict[str, float]:
    """The second barrier stands 0.2827 nm further out."""
    return stack(3.0, 5.2827, 3.0)


def clear_well() -> dict[str, float]:
    """A well of 300 meV and 8.1 nm met from above by 40 meV and 25 nm."""
    k0 = np.sqrt(gaas(0.04))
    return {"passed.final": packet_average(lambda k: window(k, 8.1, gaas(0.3)), k0, 25)}


def graded() -> dict[str, float]:
    """A step of 100 meV graded over tanh(x / 2 nm), met by 140 meV and 20 nm."""
    k0 = np.sqrt(gaas(0.14))
    return {"transmitted.total": packet_average(lambda k: graded_step(k, gaas(0.1), 2.0), k0, 20, [np.sqrt(gaas(0.1))])}


def gate() -> dict[str, float]:
    """3.1 eV and 1 nm of oxide with 1.2 V across it, met by 1.5 eV and 3 nm."""
    k2 = squared_wavenumber(EV, OXIDE, 1e-9)
    passed = packet_average(lambda k: tilted_barrier(k, 1.0, 3.1 * k2, 1.2 * k2), np.sqrt(1.5 * k2), 3.0)
    return {"transmitted.total": passed}


def drift_tube() -> dict[str, float]:
    """An electron of 1 eV and 2 nm from -100 nm, 400 fs of free flight."""
    speed = np.sqrt(2 * EV / M_E)
    zero_point = HBAR**2 / (8 * M_E * (2e-9) ** 2)
    k0 = M_E * speed / HBAR * 1e-9
    late = packet_average(lambda k: 160 / k, k0, 2.0) * M_E / HBAR * 1e-3
    return {
        "at_filter.mean": late,
        "position.x.final": (-100e-9 + speed * 400e-15) * 1e9,
        "width.x.final": spread(2e-9, M_E, 400e-15) * 1e9,
        "energy.final": 1000 + zero_point / EV * 1e3,
    }


def trace(t: float) -> float:
    """The field of the measured pulse in units of its peak; t in fs. beam/pulse_trace.csv holds it every 20 fs."""
    return envelope(t, 300, 200) * float(np.cos(2 * np.pi * 1.5e-3 * (t - 300)))


def trace_rows() -> tuple[np.ndarray, np.ndarray]:
    """The rows of beam/pulse_trace.csv."""
    t = np.arange(-20, 841, 20.0)
    return t, np.array([trace(value) for value in t])


def model_atom() -> tuple[np.ndarray, np.ndarray]:
    """The rows of beam/model_atom.csv: the state of `kick`, not normalised."""
    x = np.arange(-300, 301) * 0.1
    r = np.sqrt(x**2 + 2)
    return x, (1 + r) * np.exp(-r)


def streak() -> dict[str, float]:
    """An electron of 1 eV and 5 nm from -150 nm in 2 V/um times the trace and 0.2 V/um exp(-t / 250 fs), for 800 fs."""
    force = EV / M_E

    def acceleration(t: float, x: float) -> float:
        fs = t * 1e15
        return force * (2e6 * trace(fs) + 0.2e6 * float(np.exp(-fs / 250)))

    x, v = newton(acceleration, -150e-9, float(np.sqrt(2 * EV / M_E)), 800e-15, 5e-15)
    return {
        "position.x.final": x * 1e9,
        "momentum.x.final": M_E * v / HBAR * 1e-9,
        "width.x.final": spread(5e-9, M_E, 800e-15) * 1e9,
    }


def kick() -> dict[str, float]:
    """Survival of exp(-r) (1 + r), r = sqrt(x^2 + 2), after a sudden momentum of 0.8, in atomic units.

    The state and its energy -1/2 are exact (Liu and Clark, J. Phys. B 25 (1992) L517); the sudden
    approximation is that of Landau and Lifshitz, Quantum Mechanics, section 41 (both from memory).
    """
    x = np.linspace(-40, 40, 80001)
    r = np.sqrt(x**2 + 2)
    density = ((1 + r) * np.exp(-r)) ** 2
    survives = float((density @ np.cos(0.8 * x) / density.sum()) ** 2)
    return {"survival.final": survives, "energy.final": -0.5 + 0.8**2 / 2}


def ring() -> dict[str, float]:
    """Half of L^2 / pi brings any packet on a ring of length L to the other side (Robinett, Phys. Rep. 392 (2004) 1);
    L = 10, natural units; what was below 5 is then above.
    """
    x = np.linspace(0, 10, 4001)[:-1]
    start = gaussian(x, 2.5, 0.4, 6) + 0.6 * gaussian(x, 4, 0.16, -4)
    density = np.abs(start) ** 2
    return {"across.final": 1.0, "far_half.final": float(density[x < 5].sum() / density.sum())}
