"""The formulas against digits published with them or computed independently, so that a slip in one is seen."""

from __future__ import annotations

import numpy as np
import pytest

from tests.truth import formulas as f

# High-precision values: transfer matrices, shooting and adaptive integration, done apart from this package.
VALUES = [
    (f.step_reflection(np.array(2.0), 1.0), 0.0294372515229),  # E = 2
    (f.step_reflection(np.array(1.0), 1.0), 1.0),  # E = 0.5: all comes back
    (f.barrier_transmission(np.array(1.0), 1.0, 2.0), 0.0706508248532),
    (f.barrier_transmission(np.array(2.0), 1.0, 2.0), 0.988275568281),
    (f.barrier_transmission(np.sqrt(0.2), -4.0, 2.0), 0.268946715361),
    (f.barrier_transmission(np.array(2.0), -4.0, 2.0), 0.892470197608),
    (f.eckart_transmission(np.sqrt(0.8), -0.4, 4.0, 0.5), 0.177561039349),
    (f.eckart_transmission(np.sqrt(2.4), -0.4, 4.0, 0.5), 0.897908984279),
    (f.sech2_transmission(np.array(0.3), -1.5 * 2.5 / 2, 1.0), 0.542223987082),
    (f.sech2_transmission(np.array(0.3), -1.0, 1.0), 1.0),  # without reflection: I. Kay & H. Moses 1956
    (f.barrier_dwell(np.array(1.0), 1.0, 2.0), 0.964027580076),
    (f.barrier_dwell(np.sqrt(0.6), 1.0, 3.0), 0.656984980413),
    (f.barrier_phase_time(np.array(1.0), 1.0, 8.0), 1.99999955),  # Hartman: 2 m / hbar k kappa = 2
    (f.barrier_phase_time(np.sqrt(0.6), 1.0, 3.0), 2.182794748),
    (f.layered_transmission(np.array(1.0), [0.0, 2.0], [1.0]), 0.0706508248532),
    (f.free_width(5.0, 1.0), 2.69258240357),
    (f.shutter_density(np.array(20.0), 4.0, 5.0), 0.25),  # at the classical front
    (f.ermakov(20.0, lambda t: 1 + 0.2 * np.cos(2 * t))[0], 1.0797215409),
]


@pytest.mark.parametrize(("found", "wanted"), VALUES)
def test_values(found, wanted):
    assert float(found) == pytest.approx(wanted, rel=2e-10, abs=5e-10)


def test_transmission_at_the_resonance_of_a_double_barrier():
    """Source: L. Esaki's symmetric structure lets everything through at resonance (Ricco & Azbel, Phys. Rev. B 29
    (1984) 1970): 0.067 electron masses, 0.30 eV, 3 - 5 - 3 nm, maximum at 0.0885987115799 eV by a transfer matrix of
    30 digits."""
    unit = 0.0380998211 / 0.067  # hbar^2 / 2m in eV nm^2, CODATA 2022
    k = np.sqrt(0.0885987115799 / unit)
    barrier = 0.30 / unit / 2  # with m = 1, V = k^2 / 2
    assert f.layered_transmission(k, [0, 3, 8, 11], [barrier, 0, barrier]) == pytest.approx(1, abs=1e-7)


def test_levels_of_the_dense_matrix():
    """Source: H = p^2 + x^4, E_0 = 1.06036209048418 (Hioe & Montroll, J. Math. Phys. 16 (1975) 1945)."""
    assert f.grid_levels(lambda x: x**4, -6, 6, 121, mass=0.5)[0] == pytest.approx(1.06036209048418, abs=1e-11)
