"""What published formulas say about transmission, and jobs run once for all tests. hbar = m = 1."""

from __future__ import annotations

from functools import cache

import numpy as np

from wavejob.evidence.assess import assess
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.simulate import Record

Array = np.ndarray


@cache
def record(text: str) -> Record:
    """The job in `text` carried out, with error bars."""
    return assess(make_plan(parse(text))).record


def curve(run: Record, name: str, column: str) -> tuple[Array, Array]:
    """One column of a curve in scaled units, and its error bars."""
    found = next(c for c in run.curves if c.name == name)
    index = [c.name for c in found.columns].index(column)
    assert run.curve_errors is not None
    return found.rows[:, index], (run.curve_errors[name][column] if index else np.zeros(len(found.rows)))


def layered(k: Array, heights: list[float], edges: list[float]) -> tuple[Array, Array, Array]:
    """Amplitudes t and r, and v_after / v_before, for 1 coming in from the left over constant potentials.

    `heights` are 2 m V of the stretches between and beyond `edges`, the first one 0: psi = A e^(iqx) +
    B e^(-iqx) in each, matched in value and slope (textbook, Tsu and Esaki 1973).
    """
    k = np.asarray(k, dtype=complex)
    waves = [np.sqrt(k**2 - height) for height in heights]
    forth, back = np.ones_like(k), np.zeros_like(k)
    for edge, before, after in zip(edges[::-1], waves[-2::-1], waves[:0:-1], strict=True):
        psi = forth * np.exp(1j * after * edge) + back * np.exp(-1j * after * edge)
        slope = after * (forth * np.exp(1j * after * edge) - back * np.exp(-1j * after * edge)) / before
        forth = 0.5 * (psi + slope) * np.exp(-1j * before * edge)
        back = 0.5 * (psi - slope) * np.exp(1j * before * edge)
    return 1 / forth, back / forth, (waves[-1] / waves[0]).real


def rectangular(energies: Array, height: float = 1.0, width: float = 2.0) -> Array:
    """T of a rectangular barrier (Landau and Lifshitz, Quantum Mechanics, section 25, problem 2)."""
    e = np.asarray(energies, dtype=complex)
    q = np.sqrt(2 * (e - height))
    return np.asarray((1 / (1 + height**2 * np.sin(q * width) ** 2 / (4 * e * (e - height)))).real)


def dwell_time(k: Array, height: float = 1.0, width: float = 2.0) -> Array:
    """Dwell time of a rectangular barrier, E < V (Buettiker, Phys. Rev. B 27 (1983) 6178, eq. 3.2)."""
    return _buettiker(k, height, width)[0]


def phase_time(k: Array, height: float = 1.0, width: float = 2.0) -> Array:
    """Phase time of a rectangular barrier, E < V: d arg(t e^(ikd)) / dE (the same, eq. 3.3)."""
    return _buettiker(k, height, width)[1]


def _buettiker(k: Array, height: float, width: float) -> tuple[Array, Array]:
    k = np.asarray(k, dtype=complex)
    top = 2 * height
    q = np.sqrt(top - k**2)
    below = 4 * k**2 * q**2 + top**2 * np.sinh(q * width) ** 2
    turn, sinh = 2 * q * width * (q**2 - k**2), np.sinh(2 * q * width)
    dwell = k / q * (turn + top * sinh) / below
    phase = (k**2 * turn + top**2 * sinh) / (k * q * below)
    return dwell.real, phase.real


def sech2(energies: Array, height: float = 1.0) -> Array:
    """T of height / cosh^2 x (Eckart 1930; Landau and Lifshitz, section 25, problem 4)."""
    k = np.sqrt(2 * np.asarray(energies))
    lifted = np.cosh(np.pi / 2 * np.sqrt(complex(8 * height - 1))).real ** 2
    return np.asarray(np.sinh(np.pi * k) ** 2 / (np.sinh(np.pi * k) ** 2 + lifted))


def eckart(energies: Array, width: float, a: float, b: float) -> Array:
    """T of A u / (1 + u) + B u / (1 + u)^2, u = exp(x / width) (Eckart, Phys. Rev. 35 (1930) 1303)."""
    alpha, beta = width * np.sqrt(2 * np.asarray(energies)), width * np.sqrt(2 * (np.asarray(energies) - a))
    inner = np.cosh(np.pi * np.sqrt(complex(8 * b * width**2 - 1))).real
    difference, total = np.cosh(2 * np.pi * (alpha - beta)), np.cosh(2 * np.pi * (alpha + beta))
    return np.asarray(1 - (difference + inner) / (total + inner))
