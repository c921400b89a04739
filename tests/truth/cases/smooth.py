"""Smooth barriers and wells: Eckart's and Poeschl and Teller's formulas, and packets in a basis of sines."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from .. import formulas as f
from ..exact_motion import Box
from .case import Case, Harsh, Outside, gaussian, inside, job

Array = np.ndarray
LANDAU = "Landau & Lifshitz, Quantum Mechanics, section 25, problem 4 (from memory)"
ECKART = "C. Eckart, Phys. Rev. 35 (1930) 1303, eq. 15 (from memory)"
BARGMANN = "V. Bargmann, Rev. Mod. Phys. 21 (1949) 488 (from memory)"
SINES = "packet in a basis of sines (exact_motion.Box)"


def both(share: Callable[[Array], Array], sigma: float, k: float) -> Callable[[], list[Outside]]:
    """Probabilities on both sides when all is over."""

    def outside() -> list[Outside]:
        passed = f.over_momenta(share, sigma=sigma, k=k)
        return [Outside("right.final", passed, 1e-8), Outside("left.final", 1 - passed, 1e-8)]

    return outside


def over(name: str, potential: str, share: Callable[[Array], Array], k: float, source: str) -> Case:
    text = job((-110, 110), gaussian(-40, 5, k), 80 / k, [inside("right", 0, 110), inside("left", -110, 0)], potential)
    return Case(name, text, source, both(share, 5, k))


def boxed(
    name: str,
    potential: str,
    box: Box,
    until: float,
    regions: dict[str, tuple[float, float]],
    *,
    moments: bool = True,
    overlap: bool = False,
    edges: str = "x: wall",
    span: tuple[float, float] | None = None,
    harsh: Harsh = "",
) -> Case:
    """What exact_motion.Box says at the end; `span` where the job's axis is another than that of the sines."""

    def outside() -> list[Outside]:
        found = [Outside(f"{n}.final", box.inside(*region, until)) for n, region in regions.items()]
        if moments:
            mean, width = box.moments(until)
            found += [Outside("position.x.final", mean), Outside("width.x.final", width)]
        return found + ([Outside("back.final", box.overlap(until))] if overlap else [])

    wanted = [inside(n, *region) for n, region in regions.items()]
    wanted += ["position", "width"] * moments + ["overlap: {name: back, with: start}"] * overlap
    text = job(
        span or (box.low, box.high), gaussian(box.at, box.sigma, box.k), until, wanted, potential, edges, box.mass
    )
    return Case(name, text, SINES, outside, harsh=harsh)


def sech2(height: float) -> Callable[[Array], Array]:
    return lambda x: height / np.cosh(x) ** 2


def bump(height: float, sigma: float) -> Callable[[Array], Array]:
    return lambda x: height * np.exp(-(x**2) / (2 * sigma**2))


def ahead() -> list[Outside]:
    """A well that lets all through brings the packet ahead by the mean of 2 / (k^2 + 1)."""
    by = f.over_momenta(lambda k: 2 / (k**2 + 1), sigma=4, k=2.0)
    return [Outside("position.x.final", -34 + 2.0 * 36 + by, 1e-8), Outside("left.final", 0.0, 1e-9)]


def in_layers() -> list[Outside]:
    passed = f.over_momenta(lambda k: f.sech2_transmission(k, 2.0, 1.0), sigma=3, k=2.0)
    return [
        Outside("passed.total", passed, 1e-8),
        Outside("absorbed.x.high", passed, 1e-8),
        Outside("absorbed.x.low", 1 - passed, 1e-8),
    ]


def layered(name: str, depth: str, harsh: Harsh = "") -> Case:
    text = job(
        (-80 if depth.startswith("auto") else -60, 60),
        gaussian(-22, 3, 2.0),
        90,
        ["norm", "crossing: {name: passed, x: 10, toward: +x}"],
        "sech2: {at: 0, width: 1, height: 2}",
        f"x: {{absorb: {depth}}}",
    )
    return Case(name, text, LANDAU, in_layers, harsh=harsh, finest=1e-4 if depth.startswith("auto") else 1e-5)


MORSE = Box(lambda x: 10 * (1 - np.exp(-x / 2)) ** 2, -2.2, 14, 1.0, 0.35, 0.0, 200)
QUARTIC = Box(lambda x: x**4 / 4, -6, 6, 1.0, 0.5, 0.0, 160)
DOUBLE = Box(lambda x: x**4 / 4 - x**2, -7, 7, -1.4, 0.5, 0.0, 180)
BOUNCER = Box(lambda x: x, 0, 30, 8.0, 0.8, 0.0, 300)
LATTICE = Box(lambda x: np.sin(np.pi * x / 2) ** 2, -60, 60, 0.0, 4.0, 0.8, 800)
CAGE = Box(bump(1.0, 0.8), -10, 10, -3, 0.8, 1.5, 240)
HILL = Box(bump(1.0, 0.8), -70, 70, -20, 2.5, 1.5, 900)
EARLY = Box(sech2(1.0), -70, 70, -20, 2.5, 1.3, 900)
SHORT = Box(bump(1.0, 0.8), -90, 90, -12, 1.5, 2.0, 900)
TRAP = Box(lambda x: x**2 / 2 + 0.1 * x**3 + 0.02 * x**4, -9, 9, 1.5, 0.6, 0.5, 200)

CASES = (
    over("sech2 barrier", "sech2: {at: 0, width: 1, height: 1}", lambda k: f.sech2_transmission(k, 1, 1), 1.3, LANDAU),
    over(
        "sech2 well",
        "sech2: {at: 0, width: 1, height: -1.875}",
        lambda k: f.sech2_transmission(k, -1.875, 1),
        1.3,
        LANDAU,
    ),
    over(
        "Eckart",
        "eckart: {at: 0, width: 0.5, A: -0.4, B: 4}",
        lambda k: f.eckart_transmission(k, -0.4, 4, 0.5),
        1.35,
        ECKART,
    ),
    Case(
        "well without reflection",
        job(
            (-100, 110),
            gaussian(-34, 4, 2.0),
            36,
            ["position", inside("left", -100, -4)],
            "sech2: {at: 0, width: 1, height: -1}",
        ),
        BARGMANN,
        ahead,
    ),
    boxed(
        "Gaussian hill, in the middle",
        "gaussian: {at: 0, sigma: 0.8, height: 1}",
        HILL,
        14,
        {"right": (0, 70), "top": (-1, 1)},
        edges="x: wrap",
        harsh="early stop",
    ),
    boxed(
        "sech2 barrier, in the middle",
        "sech2: {at: 0, width: 1, height: 1}",
        EARLY,
        17,
        {"right": (0, 70), "top": (-1, 1)},
        edges="x: wrap",
        harsh="early stop",
    ),
    boxed(
        "Gaussian hill in a cage",
        "gaussian: {at: 0, sigma: 0.8, height: 1}",
        CAGE,
        18,
        {"right": (0, 10)},
        harsh="tight box",
    ),
    boxed("Morse oscillator", "morse: {at: 0, depth: 10, range: 2}", MORSE, 12, {"out": (1, 14)}, overlap=True),
    boxed(
        "quartic oscillator",
        "polynomial: {at: 0, coefficients: [0, 0, 0, 0, 0.25]}",
        QUARTIC,
        10,
        {"right": (0, 6)},
        overlap=True,
    ),
    boxed(
        "double well",
        "polynomial: {at: 0, coefficients: [0, 0, -1, 0, 0.25]}",
        DOUBLE,
        15,
        {"right": (0, 7)},
        overlap=True,
    ),
    boxed(
        "skew oscillator",
        "polynomial: {at: 0, coefficients: [0, 0, 0.5, 0.1, 0.02]}",
        TRAP,
        20,
        {"right": (0, 9)},
        overlap=True,
        edges="x: wrap",
    ),
    boxed("bouncing packet", "linear: {at: 0, slope: 1}", BOUNCER, 10, {"low": (0, 4)}, harsh="tight box"),
    boxed("lattice", "lattice: {at: 0, period: 2, depth: 1}", LATTICE, 6, {"right": (3, 60)}, edges="x: wrap"),
    layered("sech2 barrier, absorbing ends", "auto, energies: {from: 0.6, to: 4.5}"),
    layered("sech2 barrier, short layers of 6", "6", "short layer"),
    layered("sech2 barrier, short layers of 4", "4", "short layer"),
    boxed(
        "Gaussian hill, short layers of 5",
        "gaussian: {at: 0, sigma: 0.8, height: 1}",
        SHORT,
        14,
        {"right": (0, 8), "top": (-1, 1)},
        moments=False,
        span=(-25, 25),
        edges="x: {absorb: 5}",
        harsh="short layer",
    ),
    boxed(
        "Gaussian hill, ends that leak",
        "gaussian: {at: 0, sigma: 0.8, height: 1}",
        SHORT,
        13,
        {"near": (-4, 8), "top": (-1, 1)},
        moments=False,
        span=(-22, 24),
        edges="",
        harsh="tight box",
    ),
)
