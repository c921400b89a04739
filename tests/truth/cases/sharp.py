"""Steps, barriers, wells and stacks: flat layers, whose stationary states are textbook formulas."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from .. import formulas as f
from ..exact_motion import Box, Layers
from .case import Case, Harsh, Outside, gaussian, inside, job

LANDAU = "L. D. Landau & E. M. Lifshitz, Quantum Mechanics, section 25 (from memory)"
ESAKI = "R. Tsu & L. Esaki, Appl. Phys. Lett. 22 (1973) 562 (from memory)"
BUETTIKER = "M. Buettiker, Phys. Rev. B 27 (1983) 6178, eq. 3.2 (from memory)"
STATIONARY = "stationary states of flat layers added up (exact_motion.Layers); each: " + LANDAU


def scattered(
    name: str,
    potential: str | tuple[str, ...],
    layers: Layers,
    until: float,
    span: tuple[float, float],
    regions: dict[str, tuple[float, float]],
    harsh: Harsh = "",
    source: str = STATIONARY,
    finest: float = 1e-5,
) -> Case:
    """Probabilities of regions at the end, exact for that time."""

    def outside() -> list[Outside]:
        return [Outside(f"{n}.final", layers.inside(*region, until), 1e-9) for n, region in regions.items()]

    text = job(
        span,
        gaussian(layers.at, layers.sigma, layers.k),
        until,
        [inside(n, *region) for n, region in regions.items()],
        potential,
    )
    return Case(name, text, source, outside, harsh=harsh, finest=finest)


STEP = Layers((0.1,), (0.0, 1.0), -34, 4, 2.0)
LOW_STEP = Layers((0.0,), (0.0, 1.0), -34, 4, 1.2)
DOWN = Layers((0.0,), (0.0, -1.5), -34, 4, 1.5)
BARRIER = Layers((0.0, 2.0), (0.0, 1.0, 0.0), -42, 5, 1.2)
ABOVE = Layers((-1.03, 1.0), (0.0, 1.0, 0.0), -34, 4, 1.9)
WELL = Layers((-1.0, 1.0), (0.0, -1.0, 0.0), -34, 4, 1.5)
TWO = Layers((0.0, 1.0, 3.0, 4.0), (0.0, 1.0, 0.0, 1.0, 0.0), -42, 5, 1.3)
THIN = Layers((0.0, 0.1), (0.0, 10.0, 0.0), -34, 4, 2.0)
STAIRS = Layers((0.0, 1.5, 3.1), (0.0, 0.5, 1.2, 0.4), -34, 4, 2.0)

ONE_BARRIER = "barrier: {from: 0, to: 2, height: 1}"
TWO_BARRIERS = (
    "stack: {at: 0, layers: [{thickness: 1, height: 1}, {thickness: 2, height: 0}, {thickness: 1, height: 1}]}"
)


def peak_in_barrier() -> list[Outside]:
    """Largest probability in the barrier, and when."""
    times = 35.3 + np.linspace(-0.6, 0.6, 11)
    curve = np.polynomial.Polynomial.fit(times, [BARRIER.inside(0, 2, t) for t in times], 8)
    roots = curve.deriv().roots()
    top = float(min(roots, key=lambda root: abs(root - 35.3)).real)
    return [
        Outside("within.peak", float(curve(top)), 1e-9),
        Outside("within.peak_time", top, 1e-7),
        Outside("within.final", BARRIER.inside(0, 2, 48), 1e-9),
        Outside("right.final", BARRIER.inside(2, 110, 48), 1e-9),
    ]


def dwelling() -> list[Outside]:
    """Integral over time of the probability in the barrier."""
    wanted = f.over_momenta(lambda k: f.barrier_dwell(k, 1.0, 2.0), sigma=5, k=1.4)
    return [Outside("within.time", wanted, 1e-6), Outside("mean.mean", wanted / 110, 1e-8)]


def through(share: Callable[[np.ndarray], np.ndarray], sigma: float, k: float) -> Callable[[], list[Outside]]:
    """What layers at both ends take, and a detector counts, when all is over."""

    def outside() -> list[Outside]:
        passed = f.over_momenta(share, sigma=sigma, k=k)
        return [
            Outside("passed.total", passed, 1e-9),
            Outside("absorbed.x.high", passed, 1e-9),
            Outside("absorbed.x.low", 1 - passed, 1e-9),
        ]

    return outside


def absorbing(
    name: str,
    depth: str,
    harsh: Harsh = "",
    potential: str = "",
    share: Callable[[np.ndarray], np.ndarray] | None = None,
) -> Case:
    """A packet of wave number 2 on a barrier of 2, until all is in the layers."""
    text = job(
        (-65 if depth.startswith("auto") else -45, 45),
        gaussian(-18, 3, 2.0),
        65,
        ["norm", "crossing: {name: passed, x: 8, toward: +x}"],
        potential or "barrier: {from: 0, to: 1, height: 2}",
        edges=f"x: {{absorb: {depth}}}",
    )
    return Case(
        name,
        text,
        LANDAU,
        through(share or (lambda k: f.barrier_transmission(k, 2.0, 1.0)), 3, 2.0),
        harsh=harsh,
        finest=1e-4,
    )


WALLED = Box(lambda x: np.where((x > 0) & (x < 1), 1.5, 0.0), -12, 12, -6, 1.0, 1.5, 1200, (0.0, 1.0))


def walled() -> list[Outside]:
    mean, width = WALLED.moments(15)
    return [
        Outside("right.final", WALLED.inside(0.5, 12, 15), 1e-7),
        Outside("left.final", WALLED.inside(-12, -1, 15), 1e-7),
        Outside("position.x.final", mean, 1.5e-6),
        Outside("width.x.final", width, 4e-7),
    ]


def well_levels() -> list[Outside]:
    """Even k tan ka/2 = kappa, odd -k cot ka/2 = kappa, solved to 12 digits."""
    return [Outside("levels.energy[0]", -3.33702286916, 1e-11), Outside("levels.energy[1]", -1.50880543887, 1e-11)]


CASES = (
    scattered(
        "step above its top",
        "step: {at: 0.1, height: 1}",
        STEP,
        36,
        (-90, 90),
        {"right": (0.1, 90), "left": (-90, 0.1)},
    ),
    scattered(
        "step, in the middle",
        "step: {at: 0.1, height: 1}",
        STEP,
        17,
        (-75, 60),
        {"right": (0.1, 60), "skin": (0.1, 3)},
        "early stop",
    ),
    scattered(
        "step below its top, in the middle",
        "step: {at: 0, height: 1}",
        LOW_STEP,
        28,
        (-80, 50),
        {"skin": (0, 4), "near": (-6, 0)},
        "early stop",
    ),
    scattered(
        "step down", "step: {at: 0, height: -1.5}", DOWN, 40, (-100, 110), {"right": (0, 110), "left": (-100, 0)}
    ),
    scattered("barrier, tunnelling", ONE_BARRIER, BARRIER, 80, (-140, 140), {"right": (2, 140), "left": (-140, 0)}),
    Case(
        "barrier, tunnelling, in the middle",
        job((-110, 110), gaussian(-42, 5, 1.2), 48, [inside("within", 0, 2), inside("right", 2, 110)], ONE_BARRIER),
        STATIONARY,
        peak_in_barrier,
        harsh="early stop",
    ),
    scattered(
        "barrier, above",
        "barrier: {from: -1.03, to: 1, height: 1}",
        ABOVE,
        42,
        (-90, 90),
        {"right": (1, 90), "left": (-90, -1)},
    ),
    scattered("well", "well: {from: -1, to: 1, depth: 1}", WELL, 45, (-90, 90), {"right": (1, 90), "within": (-1, 1)}),
    scattered("two barriers", TWO_BARRIERS, TWO, 80, (-140, 140), {"right": (4, 140), "between": (1, 3)}, source=ESAKI),
    scattered(
        "two barriers, in the middle",
        TWO_BARRIERS,
        TWO,
        36,
        (-110, 90),
        {"right": (4, 90), "between": (1, 3)},
        "early stop",
    ),
    scattered(
        "thin barrier",
        "barrier: {from: 0, to: 0.1, height: 10}",
        THIN,
        36,
        (-90, 90),
        {"right": (0.1, 90), "left": (-90, 0)},
        finest=1e-3,
    ),
    scattered(
        "stairs",
        (
            "stack: {at: 0, layers: [{thickness: 1.5, height: 0.5}, {thickness: 1.6, height: 1.2}]}",
            "step: {at: 3.1, height: 0.4}",
        ),
        STAIRS,
        38,
        (-90, 90),
        {"right": (3.1, 90), "upper": (1.5, 3.1)},
        source=ESAKI,
    ),
    Case(
        "barrier, dwell time",
        job(
            (-160, 200),
            gaussian(-42, 5, 1.4),
            110,
            ["dwell: {name: within, from: 0, to: 2}", inside("mean", 0, 2)],
            ONE_BARRIER,
        ),
        BUETTIKER,
        dwelling,
        finest=1e-4,
    ),
    absorbing("barrier, absorbing ends", "auto, energies: {from: 0.6, to: 4.5}"),
    absorbing("barrier, short layers of 6", "6", "short layer"),
    absorbing("barrier, short layers of 3", "3", "short layer"),
    absorbing(
        "thin barrier, short layers of 4",
        "4",
        "short layer",
        "barrier: {from: 0, to: 0.3, height: 4}",
        lambda k: f.barrier_transmission(k, 4.0, 0.3),
    ),
    Case(
        "barrier between walls",
        job(
            (-12, 12),
            gaussian(-6, 1.0, 1.5),
            15,
            [inside("right", 0.5, 12), inside("left", -12, -1), "position", "width"],
            "barrier: {from: 0, to: 1, height: 1.5}",
            "x: wall",
        ),
        "sines between walls (exact_motion.Box)",
        walled,
        harsh="tight box",
    ),
    Case(
        "levels of a rectangular well",
        job((-25, 25), gaussian(0, 1), 1, ["levels: {count: 2}"], "well: {from: -1, to: 1, depth: 4}"),
        "Landau & Lifshitz, section 22 (from memory)",
        well_levels,
    ),
)
