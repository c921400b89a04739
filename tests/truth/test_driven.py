"""Potentials that change in time, and unstable ones."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import erfc

from tests.truth import formulas as f
from tests.truth.running import column, run, value

GROUND = "gaussian: {at: 0, sigma: 0.7071067811865476}"


def test_forced_oscillator():
    """Source: K. Husimi, Prog. Theor. Phys. 9 (1953) 381: a force f(t) = exp(-t^2 / 2) leaves the ground state with a
    mean of |integral of f exp(i t)|^2 / 2 = pi / e quanta, and the ground state itself with exp(-pi / e)."""
    record = run(f"""
units: natural
grid: {{x: {{from: -12, to: 12}}}}
potential:
  - harmonic: {{at: 0, omega: 1}}
  - linear: {{at: 0, slope: -1}}
    in_time: {{pulse: {{centre: 0, fwhm: {float(np.sqrt(8 * np.log(2)))!r}}}}}
packet: {{{GROUND}}}
evolve: {{start: -8, until: 8}}
observables: [norm, energy, position, ehrenfest, {{overlap: {{name: still, with: start}}}}]
""")
    quanta = np.pi / np.e
    assert value(record, "energy.final") == pytest.approx(0.5 + quanta, abs=1e-4)
    assert value(record, "still.final") == pytest.approx(np.exp(-quanta), abs=1e-4)
    assert value(record, "energy.drift") < 1e-4
    assert value(record, "ehrenfest.momentum") < 1e-4


@pytest.mark.parametrize("how", ["terms", "formula"])
def test_oscillator_with_a_changing_spring(how):
    """Source: Ermakov 1880, Lewis & Riesenfeld 1969: omega^2 = 1 + 0.2 cos 2t; the width is rho / sqrt 2, the mean
    energy ((rho'^2 + rho^-2) / 2 + omega^2 rho^2 / 2) / 2, as long as the state is Gaussian."""
    terms = {
        "terms": """
  - harmonic: {at: 0, omega: 1}
  - harmonic: {at: 0, stiffness: 0.2}
    in_time: {sine: {amplitude: 1, frequency: 0.3183098861837907, phase: 1.5707963267948966}}""",
        "formula": """
  - formula: {value: "(1 + 0.2*cos(2*t))*x**2/2"}""",
    }
    record = run(f"""
units: natural
grid: {{x: {{from: -16, to: 16}}}}
potential:{terms[how]}
packet: {{{GROUND}}}
evolve: {{until: 20}}
observables: [norm, energy, width]
""")

    def stiffness(t: float) -> float:
        return float(1 + 0.2 * np.cos(2 * t))

    rho, rate = f.ermakov(20, stiffness)
    assert value(record, "width.x.final") == pytest.approx(rho / np.sqrt(2), abs=1e-4 * np.sqrt(0.5))
    energy = (rate**2 + rho**-2 + stiffness(20) * rho**2) / 4
    assert value(record, "energy.final") == pytest.approx(energy, abs=1e-4)
    assert value(record, "energy.drift") < 1e-4


def test_sudden_change_of_the_spring():
    """Source: Husimi 1953: after omega jumps from 1 to 3 the width swings between s and s / 3, and the new ground state
    holds 2 sqrt(3) / 4 = 0.8660254 of the probability. The ramp takes 1e-4, which changes it by as much squared."""
    record = run(f"""
units: natural
grid: {{x: {{from: -8, to: 8}}}}
potential:
  - harmonic: {{at: 0, omega: 1}}
  - harmonic: {{at: 0, stiffness: 8}}
    in_time: {{ramp: {{to: 1, start: 0, stop: 0.0001}}}}
packet: {{{GROUND}}}
evolve: {{until: 2.0944, step: 0.0001}}
observables:
  - width
  - overlap: {{name: new, with: {{gaussian: {{at: 0, sigma: {float(np.sqrt(1 / 6))!r}}}}}}}
""")
    assert np.abs(column(record, "new") - 0.866025403784).max() < 2e-4
    assert value(record, "width.x.max") == pytest.approx(np.sqrt(0.5), abs=2e-4)
    assert value(record, "width.x.min") == pytest.approx(np.sqrt(0.5) / 3, abs=2e-4)


def test_inverted_oscillator():
    """Source: G. Barton, Ann. Phys. 166 (1986) 322: <x> = x0 cosh t + k sinh t, sigma^2 = s^2 cosh^2 t +
    sinh^2 t / 4 s^2, and the probability beyond the top is (1/2) erfc(-<x> / sqrt 2 sigma)."""
    record = run("""
units: natural
grid: {x: {from: -50, to: 50}}
potential: [{polynomial: {at: 0, coefficients: [0, 0, -0.5]}}]
packet: {gaussian: {at: -1, sigma: 1, wavenumber: 1.2}}
evolve: {until: 2}
observables: [position, width, energy, {inside: {name: beyond, from: 0, to: 50}}]
""")
    x = -np.cosh(2) + 1.2 * np.sinh(2)
    sigma = np.sqrt(np.cosh(2) ** 2 + np.sinh(2) ** 2 / 4)
    assert value(record, "position.x.final") == pytest.approx(x, abs=1e-4)
    assert value(record, "width.x.final") == pytest.approx(sigma, abs=1e-4)
    assert value(record, "beyond.final") == pytest.approx(erfc(-x / np.sqrt(2) / sigma) / 2, abs=1e-4)


def test_kapitza_dirac():
    """Source: P. L. Kapitza & P. A. M. Dirac 1933, in the Raman-Nath limit (P. L. Gould et al., Phys. Rev. Lett. 56
    (1986) 827): a standing wave flashed for a short time sends J_n(theta)^2 into order n, so <p^2> / 2m grows by
    (2 theta)^2 / 4 for V = V0 cos 2x, theta = V0 tau = 1. The flash lasts 0.01: a correction of (4 tau)^2 = 1.6e-3."""
    record = run(f"""
units: natural
grid: {{x: {{from: {-16 * np.pi!r}, to: {16 * np.pi!r}, points: 1024}}}}
potential: [{{lattice: {{at: {np.pi / 2!r}, period: {np.pi!r}, depth: 200}}}}]
edges: {{x: wrap}}
packet: {{gaussian: {{at: 0, sigma: 6}}}}
evolve: {{until: 0.01}}
observables: [energy, momentum_density, {{overlap: {{name: straight, with: start}}}}]
""")
    gained = column(record, "energy.kinetic")[-1] - column(record, "energy.kinetic")[0]
    assert gained == pytest.approx(1.0, abs=2e-3)
    orders = np.abs(np.fft.fft(record.psi)) ** 2
    k = 2 * np.pi * np.fft.fftfreq(1024, 32 * np.pi / 1024)
    share = orders[np.abs(k) < 1].sum() / orders.sum()
    assert share == pytest.approx(0.585527499514, abs=2e-3)  # J_0(1)^2


def test_a_well_that_moves_carries_its_packet():
    """Source: Galilei: a well that moves by a quintic ramp, its own acceleration F = m a added, keeps its ground state
    exactly; without, a slow harmonic well carries it (A. Couvert et al., EPL 83 (2008) 13001): the packet is left with
    the amplitude |integral of x0''(t) exp(i omega t)| / omega."""
    record = run(f"""
units: natural
grid: {{x: {{from: -10, to: 20}}}}
potential:
  - harmonic: {{at: 0, omega: 1}}
    path: {{x: {{ramp: {{by: 10, start: 0, stop: 10, shape: smooth}}}}}}
packet: {{{GROUND}}}
evolve: {{until: 10}}
observables: [position, momentum, width, energy, ehrenfest]
""")
    s = np.linspace(0, 1, 20001)
    acceleration = 10 / 100 * (120 * s**3 - 180 * s**2 + 60 * s)
    t = 10 * s
    lag = np.trapezoid(acceleration * np.exp(-1j * t), t) * np.exp(10j)
    # x - x0 obeys y'' + y = -x0'': y = -integral of sin(T - t) x0'', y' = -integral of cos(T - t) x0''
    assert value(record, "position.x.final") == pytest.approx(10 - lag.imag, abs=1e-4)
    assert value(record, "momentum.x.final") == pytest.approx(-lag.real, abs=1e-4)
    assert np.abs(column(record, "width.x") - np.sqrt(0.5)).max() < 1e-4
    assert value(record, "energy.final") == pytest.approx(0.5 + np.abs(lag) ** 2 / 2, abs=2e-4)
