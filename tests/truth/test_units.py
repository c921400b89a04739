"""Real units the whole way: numbers that anyone can check with a pocket calculator and CODATA."""

from __future__ import annotations

import numpy as np
import pytest

from tests.truth import formulas as f
from tests.truth.running import level, resolution, run, value

# CODATA 2022 (P. J. Mohr et al., Rev. Mod. Phys. 97 (2025) 025002)
HBAR, ELECTRON, DALTON, NEUTRON, CHARGE = (
    1.054571817e-34,
    9.1093837139e-31,
    1.66053906892e-27,
    1.67492750056e-27,
    1.602176634e-19,
)


@pytest.mark.parametrize(("sigma", "width", "box"), [("1 angstrom", 0.5874127, 6), ("1 nm", 1.001674, 12)])
def test_an_electron_spreads_within_a_femtosecond(sigma, width, box):
    """Source: Darwin 1927 with CODATA 2022: 0.5874127 nm and 1.001674 nm after 1 fs."""
    record = run(f"""
units: {{length: nm, time: fs, energy: eV}}
particle: electron
grid: {{x: {{from: {-box}, to: {box}}}}}
packet: {{gaussian: {{at: 0, sigma: {sigma}}}}}
evolve: {{until: 1}}
observables: [width]
""")
    assert value(record, "width.x.final") == pytest.approx(width, rel=1e-6)


def test_a_fullerene_spreads_within_a_millisecond():
    """Source: Darwin 1927 with CODATA 2022: C60, 720 u, 1 nm, becomes 44.1026 um wide in 1 ms."""
    record = run("""
units: {length: um, time: ms, energy: peV}
particle: {mass: 720 u}
grid: {x: {from: -280, to: 280, points: 1048576}}
packet: {gaussian: {at: 0, sigma: 1 nm}}
evolve: {until: 1, step: 1}
observables: [norm, width]
""")
    assert value(record, "width.x.final") == pytest.approx(44.1026, rel=2e-6)


def test_wave_number_of_an_electron_volt():
    """Source: lambda = h / sqrt(2 m E): 1.2264 nm at 1 eV, so k = 5.1232 / nm. hbar^2 / 2 m_e = 0.0380998211 eV
    nm^2."""
    record = run("""
units: {length: nm, time: fs, energy: eV}
particle: electron
grid: {x: {from: -30, to: 30}}
packet: {gaussian: {at: 0, sigma: 3, energy: 1, toward: -x}}
evolve: {until: 1}
observables: [momentum, energy]
""")
    assert value(record, "momentum.x.final") == pytest.approx(-np.sqrt(1 / 0.0380998211), rel=1e-8)
    assert value(record, "energy.final") == pytest.approx(1 + 0.0380998211 / (4 * 3**2), rel=1e-8)


def test_an_electron_in_a_field_of_a_volt_per_micrometre():
    """Source: F = q E with CODATA 2022; the charge is negative, so the electron goes against the field."""
    record = run("""
units: {length: nm, time: ps, energy: meV}
particle: {mass: 0.067 electron_mass, charge: -1 e}
grid: {x: {from: -500, to: 300}}
potential: [{field: {strength: 1 V/um, toward: +x}}]
packet: {gaussian: {at: 0, sigma: 20}}
evolve: {until: 0.4}
observables: [position, momentum]
""")
    force, t = -CHARGE * 1e6, 0.4e-12
    assert value(record, "momentum.x.final") == pytest.approx(force * t / HBAR * 1e-9, rel=1e-6)
    assert value(record, "position.x.final") == pytest.approx(force * t**2 / (2 * 0.067 * ELECTRON) * 1e9, rel=1e-6)


def test_neutron_falls():
    """Source: x = -g t^2 / 2 (Galilei), g = 9.80665 m/s^2: Ehrenfest's theorem in a straight potential."""
    record = run("""
units: {length: um, time: ms, energy: peV}
particle: neutron
grid: {x: {from: -150, to: 90}}
potential: [{gravity: {strength: 9.80665 m/s^2, toward: -x}}]
packet: {gaussian: {at: 0, sigma: 10}}
evolve: {until: 3, accuracy: 1e-6}
observables: [position, width]
""")
    assert value(record, "position.x.final") == pytest.approx(-9.80665 * 3e-3**2 / 2 * 1e6, rel=1e-6)
    wanted = f.free_width(3e-3, 1e-5, NEUTRON / HBAR) * 1e6
    assert value(record, "width.x.final") == pytest.approx(wanted, rel=1e-6)


# Zeros of Ai, NIST Digital Library of Mathematical Functions, table 9.9.1
AIRY = (2.338107410459767, 4.087949444130971, 5.520559828095551, 6.786708090071759)


def test_neutron_above_a_mirror():
    """Source: E_n = m g l0 |a_n|, l0 = (hbar^2 / 2 m^2 g)^(1/3) = 5.868627 um: 1.40672, 2.45951, 3.32144, 4.08321 peV.

    Seen by V. V. Nesvizhevsky et al., Nature 415 (2002) 297. The mirror is the wall at the low end."""
    record = run("""
units: {length: um, time: ms, energy: peV}
particle: neutron
grid: {x: {from: 0, to: 90}}
potential: [{gravity: {strength: 9.80665 m/s^2, toward: -x}}]
edges: {x: {low: wall, high: wall}}
packet: {gaussian: {at: 20, sigma: 3.2}}
evolve: {until: 60}
observables: [norm, autocorrelation]
""")
    units = record.plan.job.units
    scale = (NEUTRON * 9.80665**2 * HBAR**2 / 2) ** (1 / 3) / CHARGE * 1e12
    assert scale == pytest.approx(0.6016485, abs=1e-7)
    for zero, printed in zip(AIRY, (1.40672, 2.45951, 3.32144, 4.08321), strict=True):
        found = units.to_file(level(record, units.read(zero * scale, "energy")), "energy")
        assert found == pytest.approx(printed, abs=0.02 * units.to_file(resolution(record), "energy"))


MORSE = {
    # K. P. Huber & G. Herzberg 1979, through the NIST Chemistry WebBook: omega_e, omega_e x_e in 1/cm;
    # reduced mass in u; equilibrium distance in angstrom
    "HCl": (2990.9463, 52.8186, 0.979593, 1.27455),
    "H2": (4401.213, 121.336, 0.50391252, 0.74144),
}


@pytest.mark.parametrize("molecule", MORSE)
def test_vibration_of_a_molecule(molecule):
    """Source: P. M. Morse, Phys. Rev. 34 (1929) 57: E_v = omega (v + 1/2) - omega x (v + 1/2)^2 exactly, with depth
    omega^2 / 4 omega x and range sqrt(hbar^2 / 2 mu omega x); hbar^2 / 2 u = 16.85762921 A^2 / cm."""
    omega, anharmonic, mass, place = MORSE[molecule]
    depth, reach = omega**2 / (4 * anharmonic), np.sqrt(16.85762921 / mass / anharmonic)
    record = run(f"""
units: {{length: angstrom, time: fs, energy: cm^-1}}
particle: {{mass: {mass} u}}
grid: {{x: {{from: {place - 0.75}, to: {place + 2.2}}}}}
potential: [{{morse: {{at: {place}, depth: {depth}, range: {reach}}}}}]
packet: {{gaussian: {{at: {place + 0.12}, sigma: 0.09}}}}
evolve: {{until: 500}}
observables: [norm, autocorrelation]
""")
    units = record.plan.job.units
    width = units.to_file(resolution(record), "energy")
    for wanted in f.morse_levels(4, omega, anharmonic):
        found = units.to_file(level(record, units.read(wanted, "energy")), "energy")
        assert found == pytest.approx(wanted, abs=0.02 * width)


def test_ammonia_like_double_well():
    """Source: levels of the dense sinc matrix (Colbert & Miller 1992) for V_b (1 - (x / x0)^2)^2 with 2.486584 u,
    0.3816 A, 2020 / cm: splittings 1.35163 and 68.4115 / cm. Measured in NH3 (Swalen & Ibers 1962): 0.79 and 35.7.

    A packet in one well, a little to one side, beats between the wells with both splittings; here the upper one, whose
    period is 488 fs, from the lines of the autocorrelation."""
    top, place, mass = 2020.0, 0.3816, 2.486584
    coefficients = [top, 0.0, -2 * top / place**2, 0.0, top / place**4]
    levels = f.grid_levels(np.polynomial.Polynomial(coefficients), -1, 1, 200, mass=mass / (2 * 16.85762921))
    np.testing.assert_allclose(levels[1:4] - levels[0], [1.35163289, 1007.02465, 1075.43618], rtol=3e-6)
    record = run(f"""
units: {{length: angstrom, time: fs, energy: cm^-1}}
particle: {{mass: {mass} u}}
grid: {{x: {{from: -1, to: 1}}}}
potential: [{{polynomial: {{at: 0, coefficients: {coefficients}}}}}]
packet: {{gaussian: {{at: 0.3, sigma: 0.06}}}}
evolve: {{until: 6000}}
observables: [norm, autocorrelation]
""")
    units = record.plan.job.units
    for wanted in levels[2:4]:
        found = units.to_file(level(record, units.read(wanted, "energy")), "energy")
        assert found == pytest.approx(wanted, abs=0.02 * units.to_file(resolution(record), "energy"))
