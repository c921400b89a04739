"""Transmission curves: T at given energies from one packet, against the formulas."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.optimize import brentq, minimize_scalar

from .. import formulas as f
from .case import Case, Harsh, Outside, gaussian, job

Array = np.ndarray
LANDAU = "Landau & Lifshitz, Quantum Mechanics, section 25 (from memory)"
ECKART = "C. Eckart, Phys. Rev. 35 (1930) 1303, eq. 15 (from memory)"
ESAKI = "R. Tsu & L. Esaki, Appl. Phys. Lett. 22 (1973) 562 (from memory)"


def curve(
    name: str, potential: str, share: Callable[[Array], Array], source: str, depth: str = "auto", harsh: Harsh = ""
) -> Case:
    """T and R at three energies that a packet of wave number 1.7 holds."""
    at = (0.9, 1.5, 2.4)

    def outside() -> list[Outside]:
        passed = [float(share(np.array(np.sqrt(2 * e)))) for e in at]
        return [
            *(Outside(f"T T {e}", t) for e, t in zip(at, passed, strict=True)),
            *(Outside(f"T R {e}", 1 - t) for e, t in zip(at, passed, strict=True)),
        ]

    text = job(
        (-70, 60),
        gaussian(-20, 2, 1.8),
        90,
        ["transmission: {name: T, x: 10, energies: {from: 0.9, to: 2.4, points: 6}}"],
        potential,
        f"x: {{absorb: {depth}{', energies: {from: 0.3, to: 6}' if depth == 'auto' else ''}}}",
    )
    return Case(name, text, source, outside, harsh=harsh, finest=1e-4)


def resonance() -> list[Outside]:
    """Top and full width at half of it of the lowest resonance of two barriers."""

    def passed(energy: float) -> float:
        return float(f.layered_transmission(np.array(np.sqrt(2 * energy)), [0, 1, 3, 4], [1.5, 0, 1.5]))

    top = minimize_scalar(lambda e: -passed(e), bounds=(0.45, 0.8), method="bounded", options={"xatol": 1e-10})
    half = -top.fun / 2
    low, high = (brentq(lambda e: passed(e) - half, *ends) for ends in ((0.2, top.x), (top.x, 1.15)))
    return [Outside("T.peak[0].energy", top.x, 1e-8), Outside("T.peak[0].width", high - low)]


TWO = "stack: {at: 0, layers: [{thickness: 1, height: 1.5}, {thickness: 2, height: 0}, {thickness: 1, height: 1.5}]}"

CASES = (
    curve(
        "curve, barrier", "barrier: {from: 0, to: 1, height: 2}", lambda k: f.barrier_transmission(k, 2.0, 1.0), LANDAU
    ),
    curve(
        "curve, sech2", "sech2: {at: 0, width: 0.8, height: 1.5}", lambda k: f.sech2_transmission(k, 1.5, 0.8), LANDAU
    ),
    curve(
        "curve, Eckart",
        "eckart: {at: 0, width: 0.5, A: -0.4, B: 4}",
        lambda k: f.eckart_transmission(k, -0.4, 4, 0.5),
        ECKART,
    ),
    curve(
        "curve, barrier, short layers of 6",
        "barrier: {from: 0, to: 1, height: 2}",
        lambda k: f.barrier_transmission(k, 2.0, 1.0),
        LANDAU,
        "6",
        "short layer",
    ),
    curve(
        "curve, sech2, short layers of 6",
        "sech2: {at: 0, width: 0.8, height: 1.5}",
        lambda k: f.sech2_transmission(k, 1.5, 0.8),
        LANDAU,
        "6",
        "short layer",
    ),
    Case(
        "curve, resonance",
        job(
            (-90, 80),
            gaussian(-24, 2.4, 1.4),
            150,
            ["transmission: {name: T, x: 10, energies: {from: 0.3, to: 1.1, points: 81}}"],
            TWO,
            "x: {absorb: 24, energies: {from: 0.1, to: 6}}",
        ),
        ESAKI,
        resonance,
        finest=1e-4,
    ),
)
