"""The same job solved a second time, by methods that share nothing with the package but the potential's values.

The Hamiltonian is a dense matrix, kinetic energy from plane waves written out, advanced by scipy's matrix exponential
(no splitting, no FFT) or, where it depends on time, by scipy's DOP853.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.linalg import expm

from tests.evolve.dense import matrix
from tests.truth.running import column, run, value

JOB = """
units: natural
grid: {{x: {{from: -20, to: 20, points: 128}}}}
potential:
  - {potential}
edges: {{x: {edges}}}
packet: {{gaussian: {{at: -8, sigma: 1.2, wavenumber: 2}}}}
evolve: {{until: 5, accuracy: 1e-7}}
observables:
  - norm
  - position
  - momentum
  - inside: {{name: beyond, from: 1, to: 20}}
  - crossing: {{name: crossed, x: 1, toward: +x}}
"""
STILL = {
    "sharp barrier": ("barrier: {from: -0.6, to: 1.1, height: 2}", "wrap"),
    "smooth": ("gaussian: {at: 0, sigma: 0.7, height: 2}", "wrap"),
    "layers at both ends": ("gaussian: {at: 0, sigma: 0.7, height: 2}", "{absorb: 8}"),
    "walls": ("sech2: {at: 2, width: 1, height: 3}", "wall"),
    "layer and wall": ("sech2: {at: 2, width: 1, height: 3}", "{low: {absorb: 8}, high: wall}"),
}
CHANGING = {
    "pulsing barrier": (
        "barrier: {from: -0.6, to: 1.1, height: 2}\n    in_time: {sine: {amplitude: 0.5, frequency: 0.4, offset: 1}}",
        "wrap",
    ),
    "shaken": (
        "gaussian: {at: 0, sigma: 1, height: 2}\n    path: {x: {sine: {amplitude: 1, frequency: 0.3}}}",
        "{absorb: 8}",
    ),
    "pulse and layers": (
        "gaussian: {at: 1, sigma: 1, height: 2}\n    in_time: {pulse: {centre: 4, fwhm: 2, frequency: 0.3}}",
        "{absorb: 8}",
    ),
}


def compare(record, exact: np.ndarray) -> None:
    """The whole state, and figures taken from it by plain sums."""
    axis = record.plan.axis
    assert np.abs(record.psi - exact).max() < 1e-6
    density = np.abs(exact) ** 2 * axis.spacing
    norm = density.sum()
    assert value(record, "norm.final") == pytest.approx(norm, abs=1e-6)
    assert value(record, "position.x.final") == pytest.approx(density @ axis.x / norm, abs=1e-5)


@pytest.mark.parametrize("case", STILL)
def test_matrix_exponential(case):
    """Source: scipy.linalg.expm (Al-Mohy & Higham 2009). Tolerance: accuracy 1e-7 with room for the largest point."""
    potential, edges = STILL[case]
    record = run(JOB.format(potential=potential, edges=edges))
    dense = matrix(record.plan.hamiltonian, 0.0, runs=1, channels=1)[0]
    compare(record, expm(-5j * dense) @ record.plan.psi)


@pytest.mark.parametrize("case", CHANGING)
def test_dop853(case):
    """Source: scipy's DOP853 (Hairer, Norsett & Wanner) on the dense matrix with tolerances of 1e-9."""
    potential, edges = CHANGING[case]
    record = run(JOB.format(potential=potential, edges=edges))
    hamiltonian = record.plan.hamiltonian
    fixed = matrix(hamiltonian, 0.0, runs=1, channels=1)[0] - np.diag(hamiltonian.potential(0.0)[0, 0])

    def slope(t: float, psi: np.ndarray) -> np.ndarray:
        return -1j * (fixed @ psi + hamiltonian.potential(t)[0, 0] * psi)

    solved = solve_ivp(slope, (0, 5), record.plan.psi + 0j, "DOP853", rtol=1e-9, atol=1e-10)
    compare(record, solved.y[:, -1])


@pytest.mark.parametrize("edges", ["wrap", "wall"])
@pytest.mark.parametrize(
    "potential", ["barrier: {from: -0.6, to: 0.7, height: 2}", "gaussian: {at: 3, sigma: 1, height: 1}"]
)
def test_what_crosses_is_what_arrives(edges, potential):
    """Source: the continuity equation: the integral of the flux is the change of the probability beyond. Points and
    step left out, accuracy 1e-5; the detector stands inside the smooth potential, or near the sharp one."""
    record = run(f"""
units: natural
grid: {{x: {{from: -24, to: 24}}}}
potential:
  - {potential}
edges: {{x: {edges}}}
packet: {{gaussian: {{at: -7, sigma: 1.5, wavenumber: 2}}}}
evolve: {{until: 5, accuracy: 1e-5}}
observables:
  - inside: {{name: beyond, from: 2, to: 24}}
  - crossing: {{name: crossed, x: 2, toward: +x}}
""")
    beyond = column(record, "beyond")
    assert beyond[-1] > 0.2
    assert value(record, "crossed.total") == pytest.approx(beyond[-1] - beyond[0], abs=1e-5)
    assert value(record, "crossed.undecided") == pytest.approx(1 - beyond[-1], abs=1e-9)


@pytest.mark.parametrize("depth", [4.0, 10.0])
def test_a_layer_sends_back_what_it_predicts(depth):
    """Source: D. E. Manolopoulos, J. Chem. Phys. 117 (2002) 9552: nothing passes such a layer and what it reflects is
    computed beforehand. Of a packet that runs into it, what is left on the grid is that; measured runs sent back
    between a quarter of what was predicted and 1.1 times as much."""
    record = run(f"""
units: natural
grid: {{x: {{from: -60, to: 40}}}}
edges: {{x: {{absorb: {depth}}}}}
packet: {{gaussian: {{at: 0, sigma: 3, wavenumber: 1.5}}}}
evolve: {{until: 55, accuracy: 1e-6}}
observables: [norm, {{inside: {{name: back, from: -55, to: 34}}}}]
""")
    (predicted,) = (ending.shape.reflected for ending in record.plan.endings if ending.side == "high")
    back = value(record, "back.final")
    assert 0.25 * predicted < back < 1.2 * predicted
    taken = value(record, "absorbed.x.high") + value(record, "absorbed.x.low")
    assert taken + value(record, "norm.final") == pytest.approx(1, abs=1e-12)


NORM = {
    "ring": ("lattice: {at: 0, period: 4, depth: 2}", "wrap"),
    "walls": ("step: {at: 0, height: 1}", "wall"),
    "driven": ("linear: {at: 0, slope: 0.2}\n    in_time: {sine: {amplitude: 1, frequency: 0.2}}", "wall"),
    "moving": ("well: {from: -2, to: 2, depth: 2}\n    path: {x: {ramp: {by: 5, start: 0, stop: 5}}}", "wrap"),
    "layers": ("gaussian: {at: 0, sigma: 0.7, height: 2}", "{absorb: 6}"),
}


@pytest.mark.parametrize("case", NORM)
@pytest.mark.parametrize("order", [2, 4])
def test_norm_is_kept(case, order):
    """Every factor is unitary or booked: norm + absorbed stays 1 to rounding, about 1e-16 a step."""
    potential, edges = NORM[case]
    text = JOB.format(potential=potential, edges=edges).replace("accuracy: 1e-7", f"step: 0.01, order: {order}")
    assert value(run(text), "norm.drift") < 500 * 4 * 2.3e-16
