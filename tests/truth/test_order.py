"""The measured order of both schemes, through job files, on a smooth potential and at sharp edges."""

from __future__ import annotations

import numpy as np
import pytest

from tests.truth.running import run

# potential, points, fewest steps: a kinetic phase of pi for the largest wave number that the points hold. The squared
# gradient stands for a double commutator, as it does for a field that the grid resolves well: with half the points the
# order sinks to 2 below errors of 1e-8 at sharp edges.
POTENTIALS = {
    "smooth": ("sech2: {at: 0, width: 1.5, height: 1}", 200, 160),
    "square barrier": ("barrier: {from: -1, to: 1, height: 1}", 400, 625),
    "changing": (
        "gaussian: {at: 0, sigma: 1, height: 1.5}\n    in_time: {sine: {amplitude: 1, frequency: 0.3, offset: 1}}",
        200,
        160,
    ),
    "moving edge": (
        "barrier: {from: -1, to: 1, height: 1}\n    path: {x: {sine: {amplitude: 2, frequency: 0.05}}}",
        400,
        625,
    ),
}
RUN = 10


def end(potential: str, order: int, factor: int) -> np.ndarray:
    """The final state after `factor` times the fewest steps."""
    term, points, steps = POTENTIALS[potential]
    return run(f"""
units: natural
grid: {{x: {{from: -32, to: 32, points: {points}}}}}
potential:
  - {term}
edges: {{x: wrap}}
packet: {{gaussian: {{at: -8, sigma: 2, wavenumber: 1.5}}}}
evolve: {{until: {RUN}, step: {RUN / steps / factor!r}, order: {order}}}
observables: [norm]
""").psi


@pytest.mark.parametrize("potential", POTENTIALS)
@pytest.mark.parametrize("order", [2, 4])
def test_measured_order(potential, order):
    """Sources: G. Strang, SIAM J. Numer. Anal. 5 (1968) 506; S. A. Chin, Phys. Lett. A 226 (1997) 344; S. A. Chin &
    C. R. Chen, J. Chem. Phys. 117 (2002) 1409. The slope of the error of psi over halved steps. Reference: order 4 with
    half of the smallest step, a sixteenth of its error."""
    limit = end(potential, 4, 8)
    errors = [np.linalg.norm(end(potential, order, factor) - limit) for factor in (1, 2, 4)]
    slope = -np.polyfit(np.log([1, 2, 4]), np.log(errors), 1)[0]
    assert slope == pytest.approx(order, abs=0.2)
