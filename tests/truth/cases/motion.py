"""Packets that stay Gaussian, and free ones between walls and on rings: closed forms at every time."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from scipy.integrate import quad, solve_ivp
from scipy.optimize import minimize_scalar

from .. import formulas as f
from ..exact_motion import Box
from .case import Case, Outside, gaussian, inside, job

DARWIN = "C. G. Darwin, Proc. R. Soc. A 117 (1927) 258 (from memory)"
KENNARD = "E. H. Kennard, Z. Phys. 44 (1927) 326 (from memory)"
HUSIMI = "K. Husimi, Prog. Theor. Phys. 9 (1953) 381 (from memory)"
SCHROEDINGER = "E. Schroedinger, Naturwissenschaften 14 (1926) 664 (from memory)"
IMAGES = "sum of images of Darwin's packet (textbook)"

MOMENTS = ["position", "momentum", "width", "energy"]
START = "overlap: {name: back, with: start}"


def between(low: float, high: float, mean: float, width: float) -> float:
    """Share of a Gaussian distribution."""
    return 0.5 * (math.erf((high - mean) / (width * math.sqrt(2))) - math.erf((low - mean) / (width * math.sqrt(2))))


def free() -> list[Outside]:
    def held(t: float) -> float:
        return between(-2, 1, -10 + 2 * t, f.free_width(t, 1.0))

    top = minimize_scalar(lambda t: -held(t), bounds=(2, 7), method="bounded", options={"xatol": 1e-9})
    mean = quad(held, 0, 8, epsabs=1e-13)[0] / 8
    return [
        Outside("position.x.final", 6.0),
        Outside("width.x.final", f.free_width(8, 1.0)),
        Outside("energy.final", 2.125),
        Outside("window.final", held(8)),
        Outside("window.peak", -top.fun),
        Outside("window.peak_time", top.x, 1e-7),
        Outside("window.mean", mean),
        Outside("passed.total", between(0, 999, 6, f.free_width(8, 1.0)) - between(0, 999, -10, 1)),
    ]


def field() -> list[Outside]:
    width = f.free_width(6, 1.0)
    return [
        Outside("position.x.final", 5.0),
        Outside("momentum.x.final", 4.0),
        Outside("width.x.final", width),
        Outside("energy.final", 5.625),
        Outside("window.final", between(4, 9, 5, width)),
    ]


def coherent() -> list[Outside]:
    t = 7.7
    mean, apart = 2 * math.cos(t), 4 * (1 - math.cos(t))
    return [
        Outside("position.x.final", mean),
        Outside("momentum.x.final", -2 * math.sin(t)),
        Outside("width.x.final", math.sqrt(0.5)),
        Outside("energy.final", 2.5),
        Outside("position.x.min", -2.0),
        Outside("position.x.mean", 2 * math.sin(t) / t),
        Outside("back.final", math.exp(-apart)),
        Outside("right.final", between(0, 99, mean, math.sqrt(0.5))),
    ]


def breathing(sigma: float, t: float) -> float:
    return math.hypot(sigma * math.cos(t), math.sin(t) / (2 * sigma))


def squeezed() -> list[Outside]:
    t, sigma = 9.0, 0.4
    mean, width = 1.5 * math.cos(t), breathing(sigma, t)
    return [
        Outside("position.x.final", mean),
        Outside("width.x.final", width),
        Outside("width.x.max", 1 / (2 * sigma)),
        Outside("energy.final", 1.5**2 / 2 + sigma**2 / 2 + 1 / (8 * sigma**2)),
        Outside("right.final", between(0, 99, mean, width)),
    ]


def classical(
    force: Callable[[float, float], float], until: float, x: float = 0.0, v: float = 0.0
) -> tuple[float, float]:
    found = solve_ivp(
        lambda t, y: [y[1], force(t, y[0])], (0, until), [x, v], "DOP853", rtol=1e-12, atol=1e-12, max_step=until / 200
    )
    return float(found.y[0, -1]), float(found.y[1, -1])


def ground(x: float, v: float) -> float:
    """Share of the ground state at 0, omega 1, in a coherent state."""
    return math.exp(-(x**2 + v**2) / 2)


def forced() -> list[Outside]:
    x, v = classical(lambda t, x: -x + 0.3 * math.sin(1.3 * t), 14.0)
    return [
        Outside("position.x.final", x),
        Outside("momentum.x.final", v),
        Outside("width.x.final", math.sqrt(0.5)),
        Outside("back.final", ground(x, v)),
    ]


def moved() -> list[Outside]:
    def place(t: float) -> float:
        s = min(max((t - 1) / 6, 0.0), 1.0)
        return 5 * s**3 * (6 * s * s - 15 * s + 10)

    x, v = classical(lambda t, x: place(t) - x, 10.0)
    return [Outside("position.x.final", x), Outside("momentum.x.final", v), Outside("there.final", ground(x - 5, v))]


def pumped() -> list[Outside]:
    rho, rate = f.ermakov(12.0, lambda t: 1 + 0.2 * math.sin(2 * t))
    return [
        Outside("width.x.final", rho / math.sqrt(2), 1e-9),
        Outside("energy.final", (rate**2 + rho**-2 + (1 + 0.2 * math.sin(24.0)) * rho**2) / 4, 1e-9),
        Outside("back.final", 2 / math.hypot(rho + 1 / rho, rate), 1e-9),
    ]


def pulsed() -> list[Outside]:
    x, v = classical(
        lambda t, x: 0.8 * math.exp(-4 * math.log(2) * ((t - 4) / 2) ** 2) * math.cos(2 * math.pi * 0.4 * (t - 4)),
        9.0,
        -3.0,
        0.7,
    )
    return [
        Outside("position.x.final", x),
        Outside("momentum.x.final", v),
        Outside("width.x.final", f.free_width(9, 1.2)),
        Outside("right.final", between(0, 99, x, f.free_width(9, 1.2))),
    ]


def inverted() -> list[Outside]:
    t, sigma = 2.5, 0.7
    width = math.hypot(sigma * math.cosh(t), math.sinh(t) / (2 * sigma))
    mean = -1.0 * math.cosh(t) + 0.8 * math.sinh(t)
    return [
        Outside("position.x.final", mean),
        Outside("width.x.final", width),
        Outside("over.final", between(0, 999, mean, width)),
    ]


def ring() -> list[Outside]:
    x = -10 + (np.arange(4000) + 0.5) * 20 / 4000
    psi = sum(f.free_gaussian(x + 20 * n, 15.0, at=-1, sigma=1, k=2) for n in range(-14, 15))
    start = sum(f.free_gaussian(x + 20 * n, 0.0, at=-1, sigma=1, k=2) for n in range(-2, 3))
    density = np.abs(psi) ** 2 * 0.005
    here = float(density[(x > 2) & (x < 6)].sum())
    ends = [
        abs(sum(complex(f.free_gaussian(np.array(e + 20 * n), 15.0, at=-1, sigma=1, k=2)) for n in range(-14, 15))) ** 2
        for e in (2 - 1e-6, 2 + 1e-6, 6 - 1e-6, 6 + 1e-6)
    ]
    slope = ((ends[3] - ends[2]) - (ends[1] - ends[0])) / 2e-6
    here += 0.005**2 / 24 * slope  # end correction of the midpoint rule: the cells end at 2 and 6
    return [Outside("part.final", here, 1e-9), Outside("back.final", float(abs(np.vdot(start, psi) * 0.005) ** 2))]


def cage() -> list[Outside]:
    box = Box(np.zeros_like, -6, 6, -0.3, 0.7, 2.0, 200)
    mean, width = box.moments(7.0)
    return [
        Outside("right.final", box.inside(1, 6, 7.0)),
        Outside("position.x.final", mean),
        Outside("width.x.final", width),
    ]


def revived() -> list[Outside]:
    """After 4 m L^2 / pi hbar all of an infinite well's states are in phase again; half-way the mirror image."""
    return [Outside("mirror.final", 1.0), Outside("position.x.final", 2.5)]


def arrived() -> list[Outside]:
    def flux(t: float) -> float:
        psi = complex(f.free_gaussian(np.array(4.0), t, at=-12, sigma=1.5, k=2))
        spread = 1 + 1j * t / (2 * 1.5**2)
        return (psi.conjugate() * psi * (2j - (16 - 2 * t) / (2 * 1.5**2 * spread))).imag

    total, first, second = (quad(lambda t, n=n: t**n * flux(t), 0, 30, epsabs=1e-13, limit=400)[0] for n in range(3))
    mean = first / total
    return [Outside("gate.mean", mean, 1e-8), Outside("gate.sigma", math.sqrt(second / total - mean**2), 1e-8)]


def leaving() -> list[Outside]:
    width = f.free_width(9, 1.5)
    return [
        Outside("passed.total", between(5, 999, 10, width)),
        Outside("near.final", between(-10, 5, 10, width)),
    ]


GROUND = math.sqrt(0.5)
DRIVE = 1.3 / (2 * math.pi)  # cycles per time
TRAP = "harmonic: {at: 0, omega: 1}"

CASES = (
    Case(
        "free packet",
        job(
            (-40, 40),
            gaussian(-10, 1, 2),
            8,
            [*MOMENTS, inside("window", -2, 1), "crossing: {name: passed, x: 0, toward: +x}"],
        ),
        DARWIN,
        free,
        "spectral",
    ),
    Case(
        "uniform field",
        job((-50, 60), gaussian(-10, 1, 1), 6, [*MOMENTS, inside("window", 4, 9)], "linear: {at: 0, slope: -0.5}"),
        KENNARD,
        field,
        "spectral",
    ),
    Case(
        "coherent state",
        job((-10, 10), gaussian(2, GROUND), 7.7, [*MOMENTS, START, inside("right", 0, 10)], TRAP),
        SCHROEDINGER,
        coherent,
    ),
    Case(
        "squeezed state",
        job((-12, 12), gaussian(1.5, 0.4), 9, [*MOMENTS, inside("right", 0, 12)], TRAP),
        HUSIMI,
        squeezed,
    ),
    Case(
        "forced oscillator",
        job(
            (-10, 10),
            gaussian(0, GROUND),
            14,
            [*MOMENTS, START],
            (
                TRAP,
                f"linear: {{at: 0, slope: -0.3}}, in_time: {{sine: {{amplitude: 1, frequency: {DRIVE!r}}}}}",
            ),
        ),
        HUSIMI,
        forced,
    ),
    Case(
        "moved trap",
        job(
            (-8, 13),
            gaussian(0, GROUND),
            10,
            [
                "position",
                "momentum",
                f"overlap: {{name: there, with: {{gaussian: {{at: 5, sigma: {GROUND}, wavenumber: 0}}}}}}",
            ],
            f"{TRAP}, path: {{x: {{ramp: {{by: 5, start: 1, stop: 7, shape: smooth}}}}}}",
        ),
        HUSIMI,
        moved,
    ),
    Case(
        "pumped oscillator",
        job(
            (-10, 10),
            gaussian(0, GROUND),
            12,
            ["width", "energy", START],
            f"{TRAP}, in_time: {{sine: {{amplitude: 0.2, frequency: {1 / math.pi!r}, offset: 1}}}}",
        ),
        "V. P. Ermakov 1880; H. R. Lewis & W. B. Riesenfeld, J. Math. Phys. 10 (1969) 1458 (from memory)",
        pumped,
    ),
    Case(
        "light pulse",
        job(
            (-40, 40),
            gaussian(-3, 1.2, 0.7),
            9,
            ["position", "momentum", "width", inside("right", 0, 40)],
            "linear: {at: 0, slope: -0.8}, in_time: {pulse: {centre: 4, fwhm: 2, frequency: 0.4}}",
        ),
        KENNARD,
        pulsed,
    ),
    Case(
        "inverted oscillator",
        job(
            (-50, 50),
            gaussian(-1, 0.7, 0.8),
            2.5,
            ["position", "width", inside("over", 0, 50)],
            "polynomial: {at: 0, coefficients: [0, 0, -0.5]}",
        ),
        HUSIMI,
        inverted,
    ),
    Case(
        "ring",
        job((-10, 10), gaussian(-1, 1, 2), 15, [inside("part", 2, 6), START]),
        IMAGES,
        ring,
        "spectral",
        "tight box",
    ),
    Case(
        "cage",
        job((-6, 6), gaussian(-0.3, 0.7, 2), 7, [inside("right", 1, 6), "position", "width"], edges="x: wall"),
        IMAGES,
        cage,
        "spectral",
        "tight box",
    ),
    Case(
        "revival between walls",
        job(
            (-6, 6),
            gaussian(-2.5, 0.5),
            2 * 144 / math.pi,
            ["position", "overlap: {name: mirror, with: {gaussian: {at: 2.5, sigma: 0.5, wavenumber: 0}}}"],
            edges="x: wall",
        ),
        "R. Bluhm, V. A. Kostelecky & J. A. Porter, Am. J. Phys. 64 (1996) 944 (from memory)",
        revived,
        "spectral",
        "tight box",
    ),
    Case(
        "arrival",
        job((-60, 90), gaussian(-12, 1.5, 2), 30, ["arrival: {name: gate, x: 4, toward: +x}"]),
        DARWIN + ", its flux",
        arrived,
        "spectral",
    ),
    Case(
        "free packet, short layers of 4",
        job(
            (-25, 25),
            gaussian(-8, 1.5, 2),
            9,
            ["crossing: {name: passed, x: 5, toward: +x}", inside("near", -10, 5)],
            edges="x: {absorb: 4}",
        ),
        DARWIN,
        leaving,
        "spectral",
        "short layer",
    ),
    Case(
        "free packet, short layers of 8",
        job(
            (-25, 25),
            gaussian(-8, 1.5, 2),
            9,
            ["crossing: {name: passed, x: 5, toward: +x}", inside("near", -10, 5)],
            edges="x: {absorb: 8}",
        ),
        DARWIN,
        leaving,
        "spectral",
        "short layer",
    ),
)
