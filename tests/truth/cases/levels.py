"""Levels as they are on the grid, and lines of spectra: closed forms and published digits."""

from __future__ import annotations

import math

import numpy as np
from scipy.special import ai_zeros

from .case import Case, Outside, gaussian, job

MORSE = "P. M. Morse, Phys. Rev. 34 (1929) 57"
HIOE = "F. T. Hioe & E. W. Montroll, J. Math. Phys. 16 (1975) 1945 (from memory)"
POESCHL = "G. Poeschl & E. Teller, Z. Phys. 83 (1933) 143 (from memory)"
AIRY = "zeros of Ai, DLMF 9.9"


def energies(*values: float) -> list[Outside]:
    return [Outside(f"levels.energy[{n}]", value) for n, value in enumerate(values)]


def morse(count: int) -> list[float]:
    """depth 10, range 2: omega (v + 1/2) - (v + 1/2)^2 / 8, omega = sqrt 20 / 2."""
    v = np.arange(count) + 0.5
    return list(math.sqrt(20) / 2 * v - v**2 / 8)


def lines(values: list[float], weights: list[float] | None = None) -> list[Outside]:
    found = [Outside(f"spectrum.line[{n}]", value) for n, value in enumerate(values)]
    return found + [Outside(f"spectrum.weight[{n}]", value) for n, value in enumerate(weights or [])]


CASES = (
    Case(
        "levels, Morse",
        job((-3.6, 20), gaussian(0, 0.4), 0.5, ["levels: {count: 5}"], "morse: {at: 0, depth: 10, range: 2}"),
        MORSE,
        lambda: energies(*morse(5)),
        "spectral",
    ),
    Case(
        "levels, quartic",
        job(
            (-7, 7),
            gaussian(0, 0.6),
            0.5,
            ["levels: {count: 3}"],
            "polynomial: {at: 0, coefficients: [0, 0, 0, 0, 1]}",
            mass=0.5,
        ),
        HIOE,
        lambda: energies(1.06036209048418, 3.79967302980140, 7.45569793798673),
        "spectral",
    ),
    Case(
        "levels, sech2",
        job((-30, 30), gaussian(0, 0.6), 0.5, ["levels: {count: 3}"], "sech2: {at: 0, width: 1, height: -6}"),
        POESCHL,
        lambda: energies(-4.5, -2.0, -0.5),
        "spectral",
    ),
    Case(
        "levels, bouncer",
        job((0, 25), gaussian(4, 0.6), 0.5, ["levels: {count: 4}"], "linear: {at: 0, slope: 1}", "x: wall"),
        AIRY,
        lambda: energies(*(-ai_zeros(4)[0] / 2 ** (1 / 3))),
        "spectral",
    ),
    Case(
        "eigenstate, Morse",
        job(
            (-3.6, 20),
            "eigenstate: {level: 3}",
            5,
            ["energy", "overlap: {name: back, with: start}"],
            "morse: {at: 0, depth: 10, range: 2}",
        ),
        MORSE,
        lambda: [
            Outside("eigenstate.energy", morse(4)[3]),
            Outside("energy.final", morse(4)[3]),
            Outside("back.final", 1.0),
        ],
        "spectral",
    ),
    Case(
        "spectrum, oscillator",
        job((-9, 9), gaussian(1.5, math.sqrt(0.5)), 60, ["spectrum: {lines: 3}"], "harmonic: {at: 0, omega: 1}"),
        "textbook: Poisson weights of a coherent state",
        lambda: lines([0.5, 1.5, 2.5], [math.exp(-1.125) * 1.125**n / math.factorial(n) for n in range(3)]),
    ),
    Case(
        "spectrum, Morse",
        job((-3.6, 20), gaussian(0.4, 0.4), 150, ["spectrum: {lines: 3}"], "morse: {at: 0, depth: 10, range: 2}"),
        MORSE,
        lambda: lines(morse(3)),
    ),
    Case(
        "spectrum, bouncer",
        job((0, 25), gaussian(3.7, 0.6), 120, ["spectrum: {lines: 3}"], "linear: {at: 0, slope: 1}", "x: wall"),
        AIRY,
        lambda: lines(list(-ai_zeros(3)[0] / 2 ** (1 / 3))),
    ),
)
