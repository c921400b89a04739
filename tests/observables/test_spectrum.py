"""Spectra against exact levels, within their error bars; close lines resolved or said not to be."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tests.observables import exact
from wavejob.loading import parse
from wavejob.observables.lines import LEAKAGE, Signal, hidden_splitting, line_shape, resolution
from wavejob.plan import make_plan
from wavejob.problems import JobFileError
from wavejob.simulate import Record

HARMONIC = """
units: natural
grid: {x: {from: -9, to: 9, points: 96}}
potential: [{harmonic: {at: 0, omega: 1}}]
packet: {gaussian: {at: 1.5, sigma: 0.7071067811865476}}
evolve: {until: 100, step: 0.02}
film: none
observables: [{spectrum: {lines: 7}}]
"""
DOUBLE_WELL = """
units: natural
grid: {x: {from: -7, to: 13, points: 128}}
potential: [{polynomial: {at: 0, coefficients: [0, 0, 0.5, -0.17320508075688773, 0.015]}}]
packet: {gaussian: {at: 0, sigma: 0.72}}
evolve: {until: 1600, step: 0.04}
film: none
observables: [{spectrum: {lines: 2}}]
"""
HCL = """
units: {length: angstrom, time: fs, energy: cm^-1}
particle: {mass: 0.9795925 u}
grid: {x: {from: 0.7, to: 3, points: 128}}
potential: [{morse: {at: 1.27455, depth: 42341.9012 cm^-1, range: 0.570797508 angstrom}}]
packet: {gaussian: {at: 1.4, sigma: 0.075}}
evolve: {until: 2000, step: 0.05}
film: none
observables: [{spectrum: {lines: 3}}]
"""
WELL = """
units: natural
grid: {x: {from: -50, to: 50, points: 400}}
potential: [{sech2: {at: 0, width: 1, height: -6}}]
edges: {x: {absorb: 20}}
packet: {gaussian: {at: 0.3, sigma: 0.5}}
evolve: {until: 300, step: 0.01}
film: none
observables: [{spectrum: {lines: 3}}]
"""


def near(run: Record, name: str, wanted: float, tight: float) -> None:
    """Within its bar of what is wanted (in the file's units), and the bar narrower than `tight`."""
    result = run.result(name)
    assert result.value is not None
    assert result.error is not None
    value, error = (run.plan.job.units.to_file(x, result.dimension) for x in (result.value, result.error))
    assert abs(value - wanted) <= error < tight, name


def test_an_oscillator() -> None:
    """E_n = n + 1/2 with Poisson weights of mean x0^2 / 2 (coherent state, textbook)."""
    run = exact.record(HARMONIC)
    for n in range(6):
        near(run, f"spectrum.line[{n}]", n + 0.5, 1e-3)
        near(run, f"spectrum.weight[{n}]", math.exp(-1.125) * 1.125**n / math.factorial(n), 1e-3)
    assert run.result("spectrum.line[6]").value is None
    assert "holds only 6 lines" in run.result("spectrum.line[6]").note


def test_a_tunnelling_doublet_is_resolved_by_a_long_run() -> None:
    """E_0 = 0.45404995853, splitting 0.0198353011 at g = 0.03 (Zinn-Justin and Jentschura 2004)."""
    run = exact.record(DOUBLE_WELL)
    near(run, "spectrum.line[0]", 0.45404995853, 1e-4)
    near(run, "spectrum.line[1]", 0.45404995853 + 0.0198353011, 1e-4)
    assert next(c for c in run.checks if c.name == "spectrum: lines resolved").passed


@pytest.mark.parametrize("until", ["200", "48"])
def test_and_said_to_be_unresolved_by_a_short_one(until: str) -> None:
    """The same doublet: the bar of the one line seen holds both levels."""
    run = exact.record(DOUBLE_WELL.replace("until: 1600", f"until: {until}").replace("lines: 2", "lines: 1"))
    check = next(c for c in run.checks if c.name == "spectrum: lines resolved")
    assert not check.passed
    assert "not resolved: line[0]" in check.advice
    assert run.verdict == "doubtful"
    line = run.result("spectrum.line[0]")
    assert line.value is not None
    assert line.error is not None
    assert line.value - line.error < 0.4541
    assert line.value + line.error > 0.4738


def test_hydrogen_chloride() -> None:
    """Morse levels of H35Cl in 1 / cm with the constants of Huber and Herzberg 1979 (NIST WebBook)."""
    run = exact.record(HCL)
    for n, wanted in enumerate((1482.2685, 4367.5776, 7147.2495)):
        near(run, f"spectrum.line[{n}]", wanted, 1.0)


def test_bound_states_beside_a_continuum_that_leaves() -> None:
    """E_n = -(3 - n)^2 / 2 (Poeschl and Teller 1933); the unbound part is absorbed."""
    run = exact.record(WELL)
    for n, wanted in enumerate((-4.5, -2.0, -0.5)):
        near(run, f"spectrum.line[{n}]", wanted, 1e-2)


def test_a_resolution_that_the_run_is_too_short_for_is_refused() -> None:
    text = HARMONIC.replace("lines: 7", "lines: 7, resolution: 0.1")
    with pytest.raises(JobFileError, match=r"tells lines apart only from 0\.1435 on") as caught:
        make_plan(parse(text))
    assert "`evolve.until: 143.6`" in caught.value.problems[0].fix
    make_plan(parse(text.replace("until: 100", "until: 144")))


def test_a_potential_that_changes_in_time_has_no_levels() -> None:
    text = HARMONIC.replace("omega: 1}", "omega: 1}, in_time: {sine: {offset: 1, amplitude: 0.1, frequency: 1}}")
    with pytest.raises(JobFileError, match="changes in time"):
        make_plan(parse(text))


def made(energies: list[float], weights: list[float], duration: float = 100.0) -> Signal:
    t = np.linspace(0, duration, 2001)
    return Signal(t[1], np.exp(-1j * np.outer(t, energies)) @ np.array(weights))


def test_a_line_leaks_no_more_than_is_stated() -> None:
    """The transform of the Kaiser window beyond its first zero (Kaiser 1966)."""
    signal = made([0.0], [1.0])
    energies = np.linspace(resolution(100.0), 5.0, 4000)
    assert np.abs(signal.intensity_at(energies)[0]).max() < LEAKAGE
    inside = np.linspace(-0.14, 0.14, 29)
    np.testing.assert_allclose(signal.intensity_at(inside)[0], line_shape(inside * 100)[0], atol=LEAKAGE)


def test_the_slopes_of_the_line_shape() -> None:
    """By differences."""
    x = np.linspace(-20, 20, 81)
    value, first, second = line_shape(x)
    above, below = line_shape(x + 1e-4)[0], line_shape(x - 1e-4)[0]
    np.testing.assert_allclose((above - below) / 2e-4, first, atol=1e-8)
    np.testing.assert_allclose((above - 2 * value + below) / 1e-8, second, atol=1e-6)


def test_a_weak_line_beside_a_strong_one() -> None:
    """Ten thousand to one, two resolutions apart: leakage is taken off, so both are right to rounding."""
    lines = made([1.0, 1.3], [1.0, 1e-4]).lines(0.0, 2.0, 2e-5)
    np.testing.assert_allclose(lines.energies, [1.0, 1.3], atol=1e-8)
    np.testing.assert_allclose(lines.weights, [1.0, 1e-4], rtol=1e-6)


def test_overlapping_lines_are_fitted_together() -> None:
    lines = made([1.0, 1.0 + 0.8 * resolution(100.0)], [0.6, 0.4]).lines(0.0, 2.0, 1e-3)
    np.testing.assert_allclose(lines.energies, [1.0, 1.0 + 0.8 * resolution(100.0)], atol=1e-8)


@pytest.mark.parametrize("apart", [0.05, 0.2, 0.6])
def test_lines_too_close_have_not_the_shape_of_one(apart: float) -> None:
    """What is hidden in the deviation covers the distance of either line from the one seen."""
    width = apart * resolution(100.0)
    lines = made([1.0, 1.0 + width], [0.6, 0.4]).lines(0.0, 2.0, 1e-3)
    assert lines.deviations[0] / lines.weights[0] > 1e-3
    hidden = hidden_splitting(lines.deviations / lines.weights, 100.0)[0]
    assert max(abs(lines.energies[0] - 1), abs(lines.energies[0] - 1 - width)) < hidden < 2 * width
