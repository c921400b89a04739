"""Outside values for the atom, ion and neutron jobs: lengths in um, times in ms unless said."""

from __future__ import annotations

import numpy as np
from scipy import constants as si
from scipy.integrate import solve_ivp
from scipy.interpolate import CubicSpline

from .constants import CA40, EV, G_N, HBAR, M_N, RB87
from .levels import bouncer, gaussian
from .motion import breathing, coherent_overlap, envelope, newton, smooth_ramp, spread
from .scattering import packet_average, reflectionless_advance, squared_wavenumber, step

TRAP = 2 * np.pi * 100.0  # rad/s
GROUND = float(np.sqrt(HBAR / (2 * RB87 * TRAP)))  # m
PERIOD = 532e-9  # m
RECOIL = (np.pi * HBAR / PERIOD) ** 2 / (2 * RB87)  # J


def mirror() -> dict[str, float]:
    """A neutron dropped at rest from 30 um, 4 um wide, above a mirror; after 30 ms."""
    scale = (HBAR**2 / (2 * M_N**2 * G_N)) ** (1 / 3) * 1e6
    rate = M_N * G_N * scale * 1e-6 / HBAR * 1e-3
    levels = bouncer(scale, rate, 60, np.linspace(0, 300, 24001))
    start = gaussian(levels.x, 30, 4)
    density = np.abs(levels.at(start, 30.0)) ** 2 * levels.weight
    below = density[levels.x < 20.01]
    return {
        "position.x.final": float(density @ levels.x),
        "below_slit.final": float(below.sum() - below[-1] / 2),
        **{f"levels.energy[{n}]": float(levels.rates[n] * HBAR / EV * 1e15) for n in (0, 1)},
    }


def foil() -> dict[str, float]:
    """300 neV and 300 nm on the 252 neV of nickel."""
    k2 = squared_wavenumber(1e-9 * EV, M_N, 1e-9)
    return {"nickel.final": packet_average(lambda k: step(k, 252 * k2), np.sqrt(300 * k2), 300.0)}


def transport() -> dict[str, float]:
    """The trap moved by 10 um in 18 ms; the run ends 4 ms later."""

    def acceleration(t: float, x: float) -> float:
        return -(TRAP**2) * (x - 10e-6 * smooth_ramp(t / 18e-3))

    x, v = newton(acceleration, 0.0, 0.0, 22e-3, 1e-4)
    return {"delivered.final": coherent_overlap(x - 10e-6, v, RB87, TRAP)}


def disturbed(path: object, stop: float) -> dict[str, float]:
    """Mean position (um) and share of the ground state at `stop` of a trap that follows path(t), in SI."""
    x, v = newton(lambda t, x: -(TRAP**2) * (x - path(t)), 0.0, 0.0, stop, 1e-4)  # type: ignore[operator]
    return {"position.x.final": x * 1e6, "ground.final": coherent_overlap(x, v, RB87, TRAP)}


def knock() -> dict[str, float]:
    return disturbed(lambda t: 1.5e-6 * envelope(t, 12e-3, 4e-3), 40e-3)


def hum() -> dict[str, float]:
    return disturbed(lambda t: 0.6e-6 * np.sin(2 * np.pi * 50 * t), 33.6e-3)


def floor_heights() -> tuple[np.ndarray, np.ndarray]:
    """The rows of atoms/floor.csv: times (ms) and heights (um) of a floor that rings at 23 and 61 Hz."""
    t = np.arange(0.0, 62.0, 2.0)
    rise = 1 - np.exp(-((t / 12) ** 2))
    height = rise * (0.9 * np.sin(2 * np.pi * 0.023 * t) + 0.25 * np.sin(2 * np.pi * 0.061 * t + 1))
    return t, np.round(height, 4)


def floor() -> dict[str, float]:
    curve = CubicSpline(*floor_heights())
    return disturbed(lambda t: float(curve(t * 1e3)) * 1e-6, 60e-3)


def squeeze() -> dict[str, float]:
    """A second beam of 300 Hz comes on over 1 ms, on top of 100 Hz; after 6 ms."""

    def stiffness(t: float) -> float:
        return RB87 * (TRAP**2 + (2 * np.pi * 300) ** 2 * smooth_ramp((t - 1e-3) / 1e-3))

    return {"width.x.final": breathing(stiffness, RB87, 0.763e-6, 6e-3, 1e-5) * 1e6}


def paddle() -> dict[str, float]:
    """10 mm/s on a hill that runs ahead at 5 mm/s: 2 v - v_0 = 0, and only the zero-point energy is left (peV)."""
    return {
        "momentum.x.final": 0.0,
        "energy.final": HBAR**2 / (8 * RB87 * (2e-6) ** 2) / EV * 1e12,
    }


def clear_sheet() -> dict[str, float]:
    """3 / um and 3 um through the reflectionless well of 1 um, from -25 um, for 22 ms."""
    ahead = packet_average(lambda k: reflectionless_advance(k, 1.0), 3.0, 3.0)
    free = -25 + 3e6 * HBAR / RB87 * 22e-3 * 1e6
    return {"position.x.final": free + ahead, "passed.final": 1.0}


def grating() -> dict[str, float]:
    """Shares of the diffracted orders after a pulse of 4 us and 180 kHz h, by the Raman-Nath equations.

    i dc_n/dt = 4 w_r n^2 c_n - (V(t) / 4 hbar) (c_(n-1) + c_(n+1)) (Gould, Ruff and Pritchard, Phys. Rev. Lett. 56
    (1986) 827, from memory); without the first term they are Bessel functions squared.
    """
    orders = np.arange(-12, 13)
    recoil, depth = RECOIL / HBAR, 2 * np.pi * 180e3

    def rate(t: float, c: np.ndarray) -> np.ndarray:
        coupled = np.zeros_like(c)
        coupled[1:] += c[:-1]
        coupled[:-1] += c[1:]
        return np.asarray(-1j * (4 * recoil * orders**2 * c - depth / 4 * envelope(t, 10e-6, 4e-6) * coupled))

    start = (orders == 0).astype(complex)
    found = solve_ivp(rate, (0, 20e-6), start, method="DOP853", rtol=1e-10, atol=1e-12, max_step=5e-7)
    share = np.abs(found.y[:, -1]) ** 2
    return {f"order_{n}.final": float(share[12 + n]) for n in (0, 1, 2)}


def band(q: np.ndarray, depth: float) -> np.ndarray:
    """Lowest band at quasi-momenta q (units of pi / period), depth and energy in recoils (Mathieu, DLMF 28)."""
    n = np.arange(-15, 16)
    off = np.full(len(n) - 1, -depth / 4)
    return np.array(
        [np.linalg.eigvalsh(np.diag((p + 2 * n) ** 2 + depth / 2) + np.diag(off, 1) + np.diag(off, -1))[0] for p in q]
    )


SLOPE = 0.788e-12 * EV / 1e-6  # N
DEPTH = 4.0  # recoils


def tilted_lattice() -> dict[str, float]:
    """Furthest point of the Bloch oscillation, averaged over a packet of 4 um: (E(q + 1) - E(q)) / force."""
    q = np.linspace(-0.2, 0.2, 801)
    width = PERIOD / np.pi / (2 * 4e-6)
    weight = np.exp(-((q / width) ** 2) / 2)
    furthest = weight @ (band(q + 1, DEPTH) - band(q, DEPTH)) / weight.sum() * RECOIL / SLOPE
    return {"position.x.max": furthest * 1e6, "position.x.final": 0.0}


def bloch_start() -> tuple[np.ndarray, np.ndarray]:
    """The rows of atoms/lattice_start.csv: x (um) and the lowest q = 0 Bloch function under a Gaussian of 4 um."""
    n = np.arange(-15, 16)
    off = np.full(len(n) - 1, -DEPTH / 4)
    matrix = np.diag((2.0 * n) ** 2 + DEPTH / 2) + np.diag(off, 1) + np.diag(off, -1)
    share = np.linalg.eigh(matrix)[1][:, 0]
    x = np.arange(-1440, 1441) * 0.02
    wave = np.cos(2 * np.pi / (PERIOD * 1e6) * np.outer(x, n)) @ share * np.sign(share[15])
    return x, wave * np.exp(-((x / 8.0) ** 2))


def paul_trap() -> dict[str, float]:
    """x'' + (W^2 / 4) (a - 2 q cos W t) x = 0 (Paul, Rev. Mod. Phys. 62 (1990) 531), a = 0, q = 0.2, W = 2 pi 20 MHz;
    40 nm from the middle, 9.5 nm wide, after 1.97 us; lengths in nm.
    """
    rf = 2 * np.pi * 20e6

    def stiffness(t: float) -> float:
        return CA40 * rf**2 / 4 * -2 * 0.2 * float(np.cos(rf * t))

    x, _ = newton(lambda t, x: -stiffness(t) / CA40 * x, 40e-9, 0.0, 1.97e-6, 2e-9)
    return {
        "position.x.final": x * 1e9,
        "width.x.final": breathing(stiffness, CA40, 9.5e-9, 1.97e-6, 2e-9) * 1e9,
    }


def recoil_units() -> dict[str, float]:
    """For the texts: the recoil in kHz and peV, the well of no reflection in peV."""
    return {
        "kHz": RECOIL / si.h / 1e3,
        "peV": RECOIL / EV * 1e12,
        "sheet": HBAR**2 / (RB87 * 1e-12) / EV * 1e12,
        "spread": spread(1e-6, RB87, 1.5e-3) * 1e6,
    }
