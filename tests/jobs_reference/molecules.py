"""Outside values for the molecule jobs: lengths in angstrom, times in fs."""

from __future__ import annotations

import numpy as np
from scipy import constants as si

from .constants import EV, H2, HBAR, HC, M_P, U
from .levels import Levels, gaussian, morse, sinc_grid
from .scattering import eckart, packet_average, squared_wavenumber

WAVENUMBER = 2 * np.pi * si.c * 100 * 1e-15  # rad/fs of 1 cm^-1
HCL = 1.0078250319 * 34.96885269 / (1.0078250319 + 34.96885269) * U  # kg
UMBRELLA = 3 * 1.0078250319 * 14.00307400425 / (3 * 1.0078250319 + 14.00307400425) * U


def hcl_bond() -> dict[str, float]:
    """The Morse depth (eV) and range of HCl from its constants."""
    reach = HBAR / np.sqrt(2 * HCL * 52.8186 * HC) * 1e10
    return {"depth": 2990.9463**2 / (4 * 52.8186) * HC / EV, "range": float(reach)}


HCL_REVIVAL = 312.0  # fs


def hcl() -> dict[str, float]:
    """A bond stretched to 1.6 angstrom, 0.076 wide, when it comes together again, near 1 / (2 c w_e x_e)."""
    x = np.linspace(0.6, 6, 20001)
    levels = morse(2990.9463 * WAVENUMBER, 52.8186 * WAVENUMBER, hcl_bond()["range"], 1.27455, x)
    start = gaussian(x, 1.6, 0.076)
    late = levels.at(start, HCL_REVIVAL)
    overlap = abs(np.sum(start.conj() * late) * levels.weight) ** 2
    return {
        "revival.final": float(overlap),
        "position.x.final": float(np.abs(late) ** 2 @ x * levels.weight),
        **{f"spectrum.line[{v}]": float(levels.rates[v] * HBAR / EV * 1e15) for v in (0, 3)},
        "spectrum.weight[3]": float(abs(levels.states[:, 3] @ start * levels.weight) ** 2),
    }


AMMONIA_BARRIER = 288.929  # meV
AMMONIA_MINIMUM = 0.3816


def umbrella(barrier: float = AMMONIA_BARRIER) -> Levels:
    """All levels of V = barrier (1 - (x / x_0)^2)^2 on a grid of 160 points."""
    height = barrier * 1e-3 * EV / HBAR * 1e-15
    return sinc_grid(
        lambda x: height * (1 - (x / AMMONIA_MINIMUM) ** 2) ** 2, HBAR / (2 * UMBRELLA) * 1e5, -0.9, 0.9, 160
    )


def ammonia() -> dict[str, float]:
    """Half an inversion period of the measured 23.786 GHz after a start on the left."""
    levels = umbrella()
    late = np.abs(levels.at(gaussian(levels.x, -0.36, 0.075), 21021.0)) ** 2 * levels.weight
    return {"right.final": float(late[levels.x > 0].sum())}


def transfer(mass: float) -> dict[str, float]:
    """0.25 eV and 0.5 angstrom on the barrier A = -0.1 eV, B = 1.6 eV, width 0.12 angstrom."""
    k2 = squared_wavenumber(EV, mass, 1e-10)
    passed = packet_average(lambda k: eckart(k, 0.12, -0.1 * k2, 1.6 * k2), np.sqrt(0.25 * k2), 0.5)
    return {"product.final": passed}


def hydrogen() -> dict[str, float]:
    return transfer(M_P)


def deuterium() -> dict[str, float]:
    return transfer(H2)


def scan() -> tuple[np.ndarray, np.ndarray]:
    """The rows of molecules/transfer_scan.csv: x (angstrom) and energy (eV), closer where the barrier stands."""
    x = np.concatenate([np.arange(-16, -1.5, 0.5), np.arange(-38, 39) * 0.04, np.arange(2, 16.5, 0.5)])
    u = np.exp(x / 0.12)
    return x, -0.1 * u / (1 + u) + 1.6 * u / (1 + u) ** 2
