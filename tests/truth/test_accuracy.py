"""What `accuracy` promises: with the step left out, every figure errs by less than the accuracy times its scale.

Each job runs on points that are enough, once as planned and once with order 4 and a third of the step.
"""

from __future__ import annotations

import numpy as np
import pytest

from tests.truth.running import run
from wavejob.simulate import Record

FIGURES = ("position.x.final", "width.x.final", "momentum.x.final", "energy.final", "part.final")
CASES = {
    # grid and potential; edges and packet; times; the region watched
    "barrier": (
        "{from: -100, to: 100, points: 1200}",
        "barrier: {from: 0, to: 2, height: 1}",
        "at: -40, sigma: 5, wavenumber: 1.3",
        "wrap",
        (0, 60),
        (2, 90),
    ),
    "smooth barrier": (
        "{from: -100, to: 100, points: 800}",
        "sech2: {at: 0, width: 1, height: 1}",
        "at: -40, sigma: 5, wavenumber: 1.3",
        "wrap",
        (0, 60),
        (2, 90),
    ),
    "coherent state, 20 periods": (
        "{from: -12, to: 12, points: 128}",
        "harmonic: {at: 0, omega: 1}",
        "at: 3, sigma: 0.7071",
        "wrap",
        (0, 125),
        (0, 10),
    ),
    "squeezed state, 20 periods": (
        "{from: -15, to: 15, points: 256}",
        "harmonic: {at: 0, omega: 1}",
        "at: 1, sigma: 0.4",
        "wrap",
        (0, 125),
        (0, 10),
    ),
    "quartic": (
        "{from: -6, to: 6, points: 128}",
        "polynomial: {at: 0, coefficients: [0, 0, 0, 0, 1]}",
        "at: 1, sigma: 0.5",
        "wrap",
        (0, 40),
        (0, 5),
    ),
    "bouncer": (
        "{from: 0, to: 24, points: 256}",
        "linear: {at: 0, slope: 1}",
        "at: 8, sigma: 1",
        "wall",
        (0, 40),
        (0, 5),
    ),
    "uniform field": (
        "{from: -60, to: 60, points: 1024}",
        "linear: {at: 0, slope: -0.5}",
        "at: -10, sigma: 1, wavenumber: 1",
        "wrap",
        (0, 6),
        (0, 50),
    ),
    "lattice and field": (
        "{from: -60, to: 60, points: 512}",
        "lattice: {at: 0, period: 3, depth: 3}\n  - linear: {at: 0, slope: -0.1}",
        "at: 0, sigma: 6, wavenumber: 0.5",
        "wrap",
        (0, 60),
        (0, 30),
    ),
    "layers": (
        "{from: -60, to: 60, points: 600}",
        "gaussian: {at: 0, sigma: 1, height: 1}",
        "at: -20, sigma: 3, wavenumber: 1.5",
        "{absorb: 20}",
        (0, 60),
        (-5, 5),
    ),
    "forced oscillator": (
        "{from: -12, to: 12, points: 128}",
        "harmonic: {at: 0, omega: 1}\n  - linear: {at: 0, slope: -2}\n    in_time: {pulse: {centre: 0, fwhm: 2.3548}}",
        "at: 0, sigma: 0.7071",
        "wrap",
        (-8, 8),
        (0, 10),
    ),
    "short pulse in a long run": (
        "{from: -60, to: 60, points: 512}",
        "sech2: {at: 0, width: 3, height: -1}\n"
        "  - gaussian: {at: 0, sigma: 1, height: 10}\n    in_time: {pulse: {centre: 23, fwhm: 0.5}}",
        "at: 0, sigma: 1.4",
        "wrap",
        (0, 40),
        (-3, 3),
    ),
    "ramp with corners": (
        "{from: -60, to: 60, points: 512}",
        "gaussian: {at: 0, sigma: 1, height: -3}\n"
        "  - gaussian: {at: 3, sigma: 1, height: 6}\n    in_time: {ramp: {by: 1, start: 10.123, stop: 11.777}}",
        "at: 0, sigma: 0.6",
        "wrap",
        (0, 30),
        (-3, 3),
    ),
    "moving well": (
        "{from: -30, to: 60, points: 512}",
        "gaussian: {at: 0, sigma: 2, height: -3}\n    path: {x: {ramp: {by: 20, start: 5, stop: 15, shape: smooth}}}",
        "at: 0, sigma: 0.9",
        "wrap",
        (0, 25),
        (15, 25),
    ),
}


def carried_out(case: str, evolve: str) -> Record:
    grid, potential, packet, edges, (start, until), (low, high) = CASES[case]
    return run(f"""
units: natural
grid: {{x: {grid}}}
potential:
  - {potential}
edges: {{x: {edges}}}
packet: {{gaussian: {{{packet}}}}}
evolve: {{start: {start}, until: {until}, {evolve}}}
observables: [position, width, momentum, energy, {{inside: {{name: part, from: {low}, to: {high}}}}}]
""")


def worst(case: str, accuracy: str) -> float:
    """The largest error of a figure in units of its scale."""
    record = carried_out(case, f"accuracy: {accuracy}")
    start, until = CASES[case][4]
    exact = carried_out(case, f"step: {float((until - start) / record.steps / 3)!r}, order: 4")
    return max(
        abs(record.result(name).value - exact.result(name).value) / record.result(name).scale for name in FIGURES
    )


@pytest.mark.parametrize("case", CASES)
def test_the_default_accuracy(case):
    assert worst(case, "1e-4") < 1e-4


@pytest.mark.slow
@pytest.mark.parametrize("accuracy", ["1e-2", "1e-3", "1e-5", "1e-6"])
@pytest.mark.parametrize("case", CASES)
def test_other_accuracies(case, accuracy):
    assert worst(case, accuracy) < float(accuracy)


@pytest.mark.parametrize("case", ["coherent state, 20 periods", "short pulse in a long run"])
def test_steps_are_not_wasted(case):
    """A wanted accuracy of 1e-4 needs no step shorter than a sixth of what the kinetic phase of pi allows here."""
    assert carried_out(case, "accuracy: 1e-4").plan.kinetic_phase > np.pi / 6
